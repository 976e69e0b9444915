package abundance_test

import (
	"math"
	"strings"
	"testing"

	"lacuna/abundance"
	"lacuna/budget"
	"lacuna/internal/oops"
)

// by makes a column of Fe II (invented numbers) with private noise and a shared
// f-value error.
func by(method, line string, x, noise, f float64, flag budget.Flag) abundance.Column {
	n := budget.Number{X: x, Flag: flag, Shifts: []budget.Shift{{Cause: budget.Photon, D: noise}}}
	if f > 0 {
		n.Shifts = append(n.Shifts, budget.Shift{Cause: budget.FValue, Key: "f:Fe II", D: f})
	}
	if flag&(budget.Upper|budget.Lower) != 0 {
		n.Shifts = nil
	}
	return abundance.Column{Species: "Fe II", Element: "Fe", Method: method, Line: line, LogN: n}
}

// Lines of Fe II in order of strength.
const strong, weak = "Fe II 2382.04", "Fe II 2249.88"

func adopt(t *testing.T, cols []abundance.Column, o *abundance.Override) abundance.Column {
	t.Helper()
	a, err := abundance.Adopt(cols, o)
	if err != nil {
		t.Fatal(err)
	}
	back := make([]abundance.Column, len(cols))
	for i := range cols {
		back[len(cols)-1-i] = cols[i]
	}
	if b, _ := abundance.Adopt(back, o); b.Rule != a.Rule || b.LogN.X != a.LogN.X && !(math.IsNaN(a.LogN.X) && math.IsNaN(b.LogN.X)) {
		t.Errorf("the order of the columns matters: %v %q, %v %q", a.LogN.X, a.Rule, b.LogN.X, b.Rule)
	}
	return a
}

// The order of methods: practice, row 8 of the list of needs.
func TestAdoptOrder(t *testing.T) {
	sat := by(abundance.MethodAOD, strong, 13.9, 0.02, 0, budget.Lower|budget.Saturated)
	given := by(abundance.MethodGiven, "", 14.21, 0.05, 0, 0)
	growth := by(abundance.MethodGrowth, "", 14.22, 0.05, 0, 0)
	doublet := by(abundance.MethodDoublet, weak, 14.21, 0.05, 0, 0)
	fit := by(abundance.MethodFit, "", 14.2, 0.05, 0, 0)
	aod := by(abundance.MethodAOD, weak, 14.19, 0.03, 0, 0)
	linear := by(abundance.MethodWeak, weak, 14.18, 0.04, 0, 0)
	cols := []abundance.Column{sat}
	for _, tc := range []struct {
		add    abundance.Column
		method string
		rule   string
	}{
		{sat, abundance.MethodAOD, "no method gives a value: the lower limit"},
		{given, abundance.MethodGiven, "nothing measured gives a value"},
		{growth, abundance.MethodGrowth, "growth curve"},
		{doublet, abundance.MethodDoublet, "doublet"},
		{fit, abundance.MethodFit, "instrument's profile"},
		{linear, abundance.MethodWeak, "unsaturated line " + weak + " (weak line)"},
		{aod, abundance.MethodAOD, "unsaturated line " + weak + " (apparent optical depth)"}, // smaller error
	} {
		if tc.add.Method != sat.Method || len(cols) > 1 {
			cols = append(cols, tc.add)
		}
		a := adopt(t, cols, nil)
		if a.Method != tc.method || !strings.Contains(a.Rule, tc.rule) {
			t.Errorf("with %s: adopted %s by %q, want %q", tc.add.Method, a.Method, a.Rule, tc.rule)
		}
		if strings.Contains(a.Rule, "at odds") || a.LogN.ErrBy(budget.Disagreement) != 0 {
			t.Errorf("columns that agree are said not to: %q", a.Rule)
		}
	}
}

func TestAdoptMean(t *testing.T) {
	// weights 1/σ² with σ² = noise² + f²: by hand
	s1, s2 := 0.02*0.02+0.01*0.01, 0.04*0.04+0.01*0.01
	w := (1 / s1) / (1/s1 + 1/s2)
	a := adopt(t, []abundance.Column{by(abundance.MethodWeak, weak, 14.20, 0.02, 0.01, 0), by(abundance.MethodWeak, "Fe II 2260.78", 14.23, 0.04, 0.01, 0)}, nil)
	if x := w*14.20 + (1-w)*14.23; !(math.Abs(a.LogN.X-x) <= 1e-12) {
		t.Errorf("mean %.5f, want %.5f", a.LogN.X, x)
	}
	// the noise averages, the shared f-value does not
	if e := math.Hypot(w*0.02, (1-w)*0.04); !(math.Abs(a.LogN.ErrBy(budget.Photon)-e) <= 1e-12 && math.Abs(a.LogN.ErrBy(budget.FValue)-0.01) <= 1e-12) {
		t.Errorf("errors %.5f and %.5f, want %.5f and 0.01", a.LogN.ErrBy(budget.Photon), a.LogN.ErrBy(budget.FValue), e)
	}
	// a blended line steps back behind a clean one, and what it has too much is no disagreement
	a = adopt(t, []abundance.Column{by(abundance.MethodWeak, weak, 14.20, 0.03, 0, 0), by(abundance.MethodWeak, "Fe II 2260.78", 14.5, 0.01, 0, budget.Blended)}, nil)
	if a.LogN.X != 14.20 || a.LogN.ErrBy(budget.Disagreement) != 0 {
		t.Errorf("adopted %.2f by %q", a.LogN.X, a.Rule)
	}
	a = adopt(t, []abundance.Column{by(abundance.MethodWeak, "Fe II 2260.78", 14.5, 0.01, 0, budget.Blended)}, nil)
	if !a.LogN.Is(budget.Blended) || !strings.Contains(a.Rule, "blended: no clean line is left") {
		t.Errorf("a blended line alone: %q", a.Rule)
	}
}

// Half the difference joins the error, so that neither lies more than 2σ away.
func TestAdoptDisagreement(t *testing.T) {
	line := by(abundance.MethodWeak, weak, 14.0, 0.02, 0, 0)
	a := adopt(t, []abundance.Column{line, by(abundance.MethodGrowth, "", 14.3, 0.03, 0, 0)}, nil)
	if !(math.Abs(a.LogN.ErrBy(budget.Disagreement)-0.15) <= 1e-12) || !strings.Contains(a.Rule, "at odds with growth curve, 14.300 ± 0.030, by 8.3σ: 0.15 dex added") {
		t.Errorf("%.3f, %q", a.LogN.ErrBy(budget.Disagreement), a.Rule)
	}
	if !(math.Abs(14.3-a.LogN.X)/a.LogN.Err() < 2) {
		t.Errorf("the other method still lies %.1fσ away", math.Abs(14.3-a.LogN.X)/a.LogN.Err())
	}
	// a saturated line that gives more than an unsaturated one
	a = adopt(t, []abundance.Column{line, by(abundance.MethodAOD, strong, 14.2, 0, 0, budget.Lower)}, nil)
	if a.LogN.X != 14.0 || !(math.Abs(a.LogN.ErrBy(budget.Disagreement)-0.1) <= 1e-12) {
		t.Errorf("lower limit above: %.3f, %q", a.LogN.ErrBy(budget.Disagreement), a.Rule)
	}
	// below, it says nothing against it
	a = adopt(t, []abundance.Column{line, by(abundance.MethodAOD, strong, 13.2, 0, 0, budget.Lower)}, nil)
	if a.LogN.ErrBy(budget.Disagreement) != 0 {
		t.Errorf("lower limit below: %q", a.Rule)
	}
	// a stronger line that gives less: hidden saturation, the weak line alone counts
	a = adopt(t, []abundance.Column{line, by(abundance.MethodAOD, strong, 13.8, 0.02, 0, 0)}, nil)
	if a.LogN.X != 14.0 || !a.LogN.Is(budget.Saturated) || !strings.Contains(a.Rule, "hides saturation") {
		t.Errorf("hidden saturation: %.2f, %q", a.LogN.X, a.Rule)
	}
	// a stronger line that gives more is no saturation: the mean, with its scatter
	a = adopt(t, []abundance.Column{line, by(abundance.MethodAOD, strong, 14.2, 0.02, 0, 0)}, nil)
	if !(math.Abs(a.LogN.X-14.1) <= 1e-12 && math.Abs(a.LogN.ErrBy(budget.Disagreement)-0.1) <= 1e-12) {
		t.Errorf("two lines apart: %.2f, %q", a.LogN.X, a.Rule)
	}
}

func TestAdoptLimits(t *testing.T) {
	lower := func(line string, x float64) abundance.Column {
		return by(abundance.MethodAOD, line, x, 0, 0, budget.Lower|budget.Saturated)
	}
	upper := func(line string, x float64) abundance.Column {
		return by(abundance.MethodGiven, line, x, 0, 0, budget.Upper)
	}
	if a := adopt(t, []abundance.Column{lower(strong, 13.9), lower(weak, 14.1)}, nil); a.LogN.Kind() != "lower" || a.LogN.X != 14.1 || !strings.Contains(a.Rule, "strongest lower limit, "+weak) {
		t.Errorf("two lower limits: %s %.2f, %q", a.LogN.Kind(), a.LogN.X, a.Rule)
	}
	if a := adopt(t, []abundance.Column{upper("a", 13.9), upper("b", 14.1)}, nil); a.LogN.Kind() != "upper" || a.LogN.X != 13.9 {
		t.Errorf("two upper limits: %s %.2f", a.LogN.Kind(), a.LogN.X)
	}
	if a := adopt(t, []abundance.Column{lower(strong, 13.9), upper("", 14.3)}, nil); a.LogN.Kind() != "interval" || !(math.Abs(a.LogN.X-14.1) <= 1e-12 && math.Abs(a.LogN.Up-0.2) <= 1e-12) {
		t.Errorf("both: %s %.2f ± %.2f, %q", a.LogN.Kind(), a.LogN.X, a.LogN.Up, a.Rule)
	}
	if a := adopt(t, []abundance.Column{lower(strong, 14.3), upper("", 13.9)}, nil); a.LogN.Kind() != "none" || !strings.Contains(a.Rule, "contradict") {
		t.Errorf("contradiction: %s, %q", a.LogN.Kind(), a.Rule)
	}
	if a := adopt(t, nil, nil); a.LogN.Kind() != "none" || a.Rule == "" {
		t.Errorf("nothing: %s %q", a.LogN.Kind(), a.Rule)
	}
	// two of our own non-detections of equal σ: N ± σ averages, the 3σ limit falls by √2 (both N = 0)
	own := func(line string) abundance.Column {
		n := budget.Number{X: 0, Shifts: []budget.Shift{{Cause: budget.Photon, D: 1e12}}}
		return abundance.Column{Species: "Fe II", Element: "Fe", Method: abundance.MethodWeak, Line: line, LogN: budget.Log10(budget.Limit(n, 3e12, 3))}
	}
	a := adopt(t, []abundance.Column{own(strong), own(weak)}, nil)
	if a.LogN.Kind() != "upper" || !(math.Abs(a.LogN.X-math.Log10(3e12/math.Sqrt2)) <= 1e-9) || a.LogN.Behind == nil {
		t.Errorf("stacked non-detections: %s %.4f, %q", a.LogN.Kind(), a.LogN.X, a.Rule)
	}
	// A second line that says little (100 times the error, N = 2σ) cannot raise the
	// limit of the first; N ± σ stays that of both.
	poor := budget.Number{X: 2e14, Shifts: []budget.Shift{{Cause: budget.Photon, D: 1e14}}}
	good := budget.Number{X: 2e12, Shifts: []budget.Shift{{Cause: budget.Photon, D: 1e12}}}
	limit := func(line string, n budget.Number, x float64) abundance.Column {
		return abundance.Column{Species: "Fe II", Element: "Fe", Method: abundance.MethodWeak, Line: line, LogN: budget.Log10(budget.Limit(n, x, 3))}
	}
	a = adopt(t, []abundance.Column{limit(strong, good, 4e12), limit(weak, poor, 4e14)}, nil)
	if a.LogN.Kind() != "upper" || !(math.Abs(a.LogN.X-math.Log10(4e12)) <= 1e-12) || a.LogN.Behind == nil || !(a.LogN.Behind.Err() < 1e12) || !strings.Contains(a.Rule, strong) {
		t.Errorf("a good and a poor non-detection: %s %.4f, %q", a.LogN.Kind(), a.LogN.X, a.Rule)
	}
}

func TestOverride(t *testing.T) {
	cols := []abundance.Column{by(abundance.MethodWeak, weak, 14.0, 0.02, 0, 0), by(abundance.MethodGrowth, "", 14.02, 0.03, 0, 0)}
	a := adopt(t, cols, &abundance.Override{Method: abundance.MethodGrowth, Reason: "ripple under the weak line"})
	if a.LogN.X != 14.02 || !a.LogN.Is(budget.Overridden) || a.Method != abundance.MethodGrowth {
		t.Errorf("method: %.2f %s", a.LogN.X, a.Method)
	}
	for _, want := range []string{"14.020 ± 0.030", "ripple under the weak line", "the rule gives 14.000 ± 0.020"} {
		if !strings.Contains(a.Rule, want) {
			t.Errorf("%q lacks %q", a.Rule, want)
		}
	}
	a = adopt(t, cols, &abundance.Override{LogN: stated(t, 13.5, 0.1, "value"), Reason: "profile by eye"})
	if a.LogN.X != 13.5 || !a.LogN.Is(budget.Overridden) || a.Method != abundance.MethodGiven {
		t.Errorf("number: %.2f %s", a.LogN.X, a.Method)
	}
	for _, o := range []abundance.Override{{Method: abundance.MethodFit, Reason: "why not"}, {Method: abundance.MethodGrowth}, {Method: abundance.MethodWeak, Line: strong, Reason: "x"}} {
		if _, err := abundance.Adopt(cols, &o); !oops.IsInput(err) {
			t.Errorf("%+v: %v", o, err)
		}
	}
}
