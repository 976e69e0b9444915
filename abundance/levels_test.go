package abundance_test

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"lacuna/abundance"
	"lacuna/budget"
	"lacuna/internal/check"
)

func sum(t *testing.T, species string, cols ...abundance.Column) abundance.Column {
	t.Helper()
	out := abundance.SumLevels(cols)
	if again := abundance.SumLevels(out); len(again) != len(out) {
		t.Errorf("summed twice: %d columns, then %d", len(out), len(again))
	}
	for _, c := range out {
		if c.Species == species && c.Method == abundance.MethodSum {
			return c
		}
	}
	t.Fatalf("no total of %s among %d columns", species, len(out))
	return abundance.Column{}
}

func near(a, b, tol float64) bool { return math.Abs(a-b) <= tol }

// CN at the temperature of the microwave background: N(N=1)/N(N=0) = 0.4074 at
// 2.7255 K (checks/cn_boltzmann.csv and reference/abundances.md §6).
func TestSumCN(t *testing.T) {
	c := sum(t, "CN", col(t, "CN N=0", 12.5, 0.02, "value"), col(t, "CN N=1", 12.5+math.Log10(0.4074), 0.03, "value"))
	if !near(c.LogN.X, 12.5+math.Log10(1.4074), 1e-12) || c.LogN.Kind() != "value" {
		t.Errorf("log N(CN) = %.4f (%s)", c.LogN.X, c.LogN.Kind())
	}
	// N = 2: 5 e^(−6hcB/kT) of N = 0, with hcB/k from ln(3/0.4074) = 2hcB/kT: 5 (0.4074/3)³ = 0.0125
	part := 5 * math.Pow(0.4074/3, 3) / 1.4074
	if e := c.LogN.ErrBy(budget.Excitation); !near(e, math.Log10(1+part), 2e-4) {
		t.Errorf("error of the unseen levels %.5f dex, want %.5f", e, math.Log10(1+part))
	}
	for _, want := range []string{"sum of N=0, N=1", "not included: N=2, N=3", "at T = 2.7 K"} {
		if !strings.Contains(c.Rule, want) {
			t.Errorf("%q lacks %q", c.Rule, want)
		}
	}
	// N = 0 alone leaves out 0.42 of it: a lower limit
	c = sum(t, "CN", col(t, "CN N=0", 12.5, 0.02, "value"))
	if c.LogN.Kind() != "lower" || c.LogN.X != 12.5 || !strings.Contains(c.Rule, "42 % of what is seen") {
		t.Errorf("N=0 alone: %s %.3f, %q", c.LogN.Kind(), c.LogN.X, c.Rule)
	}
	// N = 1 alone leaves out more than it is
	c = sum(t, "CN", col(t, "CN N=1", 12.5, 0.02, "value"))
	if c.LogN.Kind() != "lower" || !strings.Contains(c.Rule, "N=0") {
		t.Errorf("N=1 alone: %s, %q", c.LogN.Kind(), c.Rule)
	}
	// not detected: the limit covers the unseen levels as well
	c = sum(t, "CN", col(t, "CN N=0", 11, 0, "upper"))
	if c.LogN.Kind() != "upper" || !near(c.LogN.X, 11+math.Log10(1.42), 2e-3) {
		t.Errorf("limit on N=0: %s %.4f, %q", c.LogN.Kind(), c.LogN.X, c.Rule)
	}
}

// The temperature that two levels give, against checks/cn_boltzmann.csv (ratio
// N(N=1)/N(N=0), computed there to 12 digits; Rule prints it to 0.1 K).
func TestTemperatureOfLevels(t *testing.T) {
	n := 0
	for _, r := range check.CSV(t, check.Shared(t, "checks/cn_boltzmann.csv")) {
		if r["relation"] != "T01" {
			continue
		}
		n++
		c := sum(t, "CN", col(t, "CN N=0", 12.5, 0.02, "value"), col(t, "CN N=1", 12.5+math.Log10(check.F(t, r, "ratio")), 0.03, "value"))
		_, after, _ := strings.Cut(c.Rule, "at T = ")
		var temp float64
		if _, err := fmt.Sscanf(after, "%f K", &temp); err != nil {
			t.Fatalf("%q: %v", c.Rule, err)
		}
		if !near(temp, check.F(t, r, "T_K"), 0.0501) {
			t.Errorf("ratio %s: %.1f K, want %s", r["ratio"], temp, r["T_K"])
		}
	}
	if n < 5 {
		t.Errorf("only %d rows", n)
	}
}

func TestSumCH(t *testing.T) {
	e, f := col(t, "CH e", 12.8, 0.02, "value"), col(t, "CH f", 12.82, 0.03, "value")
	c := sum(t, "CH", e, f)
	if want := math.Log10(math.Pow(10, 12.8) + math.Pow(10, 12.82)); !near(c.LogN.X, want, 1e-12) || c.LogN.ErrBy(budget.Excitation) != 0 {
		t.Errorf("e + f: %.4f, want %.4f", c.LogN.X, want)
	}
	c = sum(t, "CH", f)
	if !near(c.LogN.X, 12.82+math.Log10(2), 1e-12) || !near(c.LogN.ErrBy(budget.Excitation), 0.03/math.Ln10, 1e-12) || !strings.Contains(c.Rule, "twice level f") {
		t.Errorf("f alone: %.4f, %q", c.LogN.X, c.Rule)
	}
	c = sum(t, "CH", col(t, "CH e", 12.8, 0, "upper"))
	if c.LogN.Kind() != "upper" || !near(c.LogN.X, 12.8+math.Log10(2), 1e-12) {
		t.Errorf("limit on e: %s %.4f", c.LogN.Kind(), c.LogN.X)
	}
	// 4300 Å counts both levels: it is not added to the others
	c = sum(t, "CH", col(t, "CH", 13.1, 0.01, "value"), e, f)
	if c.LogN.X != 13.1 || !strings.Contains(c.Rule, "takes both levels") {
		t.Errorf("4300 with e and f: %.4f, %q", c.LogN.X, c.Rule)
	}
	c = sum(t, "CH", col(t, "CH", 13.4, 0.02, "value"), e, f)
	if c.LogN.ErrBy(budget.Disagreement) == 0 || !strings.Contains(c.Rule, "at odds") {
		t.Errorf("4300 against e and f, 0.3 dex apart: %q", c.Rule)
	}
}

func TestSumFineStructure(t *testing.T) {
	cols := []abundance.Column{col(t, "Na I", 12, 0.1, "value"), col(t, "C II", 17.5, 0.05, "value"), col(t, "C II*", 15.5, 0.05, "value"), col(t, "K I", 11, 0.1, "value")}
	out := abundance.SumLevels(cols)
	if len(out) != 5 || out[3].Species != "C II" || out[3].Method != abundance.MethodSum || out[4].Species != "K I" {
		t.Fatalf("the total does not stand behind its levels: %+v", out)
	}
	if c := out[3]; !near(c.LogN.X, 17.5+math.Log10(1.01), 1e-12) || c.Rule != "sum of the ground level, *" {
		t.Errorf("C II: %.4f, %q", c.LogN.X, c.Rule)
	}
	// the total, not the ground level, gives the depletion
	d := deplete(t, cols, total(t, 21, 0.05, "value"), "asplund2021")["C"]
	if !near(d.LogN.X, 17.5+math.Log10(1.01), 1e-12) {
		t.Errorf("D(C) from log N = %.4f", d.LogN.X)
	}
	// the ground level unseen: the excited one is the lesser part
	if c := sum(t, "C II", col(t, "C II*", 15.5, 0.05, "value")); c.LogN.Kind() != "lower" {
		t.Errorf("C II* alone: %s, %q", c.LogN.Kind(), c.Rule)
	}
	// value + upper limit: an interval (practice 1.7)
	if c := sum(t, "C II", col(t, "C II", 17, 0.05, "value"), col(t, "C II*", 16, 0, "upper")); c.LogN.Kind() != "interval" {
		t.Errorf("C II with a limit on C II*: %s", c.LogN.Kind())
	}
	// C I and C I* without C I**: named, and estimated at their temperature
	c := sum(t, "C I", col(t, "C I", 14.5, 0.05, "value"), col(t, "C I*", 13.8, 0.05, "value"))
	if c.LogN.Kind() != "value" || !strings.Contains(c.Rule, "not included: **") {
		t.Errorf("C I: %s, %q", c.LogN.Kind(), c.Rule)
	}
}
