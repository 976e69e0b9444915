package budget_test

import (
	"fmt"
	"math"
	"reflect"
	"testing"

	"lacuna/budget"
)

// within fails unless got is want to the relative tolerance tol; two infinities
// of one sign agree.
func within(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if got == want {
		return
	}
	if !(math.Abs(got-want) <= tol*math.Max(math.Abs(want), math.SmallestNonzeroFloat64)) {
		t.Errorf("%s = %.17g, want %.17g", what, got, want)
	}
}

const ulps = 1e-14 // a few roundings

// lantern returns D(Ca) and D(Fe) of one sightline: private photon and f-value
// errors, one hydrogen column for both.
func lantern() (ca, fe budget.Number) {
	ca = budget.Number{X: -3.71, Shifts: []budget.Shift{
		{Cause: budget.Photon, D: 0.02},
		{Cause: budget.FValue, Key: "f:Ca II 3933.66", D: -0.03},
		{Cause: budget.Hydrogen, Key: "NH:Lantern 1", D: -0.10},
	}}
	fe = budget.Number{X: -2.24, Shifts: []budget.Shift{
		{Cause: budget.Photon, D: 0.02},
		{Cause: budget.FValue, Key: "f:Fe II 2260.78", D: -0.035},
		{Cause: budget.Hydrogen, Key: "NH:Lantern 1", D: -0.10},
	}}
	return ca, fe
}

// The three figures of the project's design notes: D(Ca) ± 0.106, its ratio to
// D(Fe) ± 0.054, of which hydrogen exactly 0. By hand: √(0.02² + 0.03² + 0.10²)
// = 0.10630 and √(2·0.02² + 0.03² + 0.035²) = 0.05408.
func ExampleCombine() {
	ca, fe := lantern()
	diff := budget.Combine([]float64{1, -1}, ca, fe)
	fmt.Printf("D(Ca) = %.2f ± %.3f, of which hydrogen %.2f\n", ca.X, ca.Err(), ca.ErrBy(budget.Hydrogen))
	fmt.Printf("D(Ca) − D(Fe) = %.2f ± %.3f, of which hydrogen %g\n", diff.X, diff.Err(), diff.ErrBy(budget.Hydrogen))
	// Output:
	// D(Ca) = -3.71 ± 0.106, of which hydrogen 0.10
	// D(Ca) − D(Fe) = -1.47 ± 0.054, of which hydrogen 0
}

func ExampleLog10() {
	n := budget.Number{X: 2e12, Shifts: []budget.Shift{{Cause: budget.Photon, D: 1e12}}}
	l := budget.Log10(n)
	fmt.Printf("%.3f +%.3f −%.3f\n", l.X, l.ErrUp(), l.ErrLo())
	// Output: 12.301 +0.176 −0.301
}

func ExampleRatio() {
	zn := budget.Number{X: 13.1, Flag: budget.Lower}
	h := budget.Number{X: 20.5, Flag: budget.Lower}
	fmt.Println(budget.Ratio(zn, h).Kind()) // both only bounded from below
	h.Flag = budget.Upper
	fmt.Println(budget.Ratio(zn, h).Kind())
	// Output:
	// none
	// lower
}

func TestErrAddsEqualKeysBeforeSquaring(t *testing.T) {
	n := budget.Number{Shifts: []budget.Shift{
		{Cause: budget.Photon, D: 3},
		{Cause: budget.Photon, D: 4},               // private: another unknown
		{Cause: budget.Continuum, Key: "c", D: 7},  // one unknown with two effects,
		{Cause: budget.Placement, Key: "c", D: -7}, // which cancel
		{Cause: budget.Solar, Key: "s", D: 12},
	}}
	within(t, "Err", n.Err(), 13, ulps) // √(3² + 4² + 0 + 12²)
	within(t, "ErrBy(Photon)", n.ErrBy(budget.Photon), 5, ulps)
	within(t, "ErrBy(Continuum)", n.ErrBy(budget.Continuum), 7, ulps)
	within(t, "Without(Solar)", n.Without(budget.Solar), 5, ulps)
	within(t, "Without(Solar, Placement)", n.Without(budget.Solar, budget.Placement), math.Sqrt(25+49), ulps)
}

func TestCombineCancelsSharedPartsExactly(t *testing.T) {
	ca, fe := lantern()
	d := budget.Combine([]float64{1, -1}, ca, fe)
	if h := d.ErrBy(budget.Hydrogen); h != 0 {
		t.Errorf("hydrogen part %g, want 0", h)
	}
	// The same with errors large enough to be asymmetric, as Log10 makes them.
	h := budget.Log10(budget.Number{X: 1e21, Shifts: []budget.Shift{{Cause: budget.Hydrogen, Key: "NH", D: 5e20}}})
	x, y := budget.Ratio(budget.Number{X: 15}, h), budget.Ratio(budget.Number{X: 16}, h)
	within(t, "Up of a ratio to H", x.ErrUp(), math.Log10(2), 1e-12)
	within(t, "Lo of a ratio to H", x.ErrLo(), math.Log10(1.5), 1e-12)
	d = budget.Combine([]float64{1, -1}, x, y)
	if d.ErrUp() != 0 || d.ErrLo() != 0 {
		t.Errorf("errors %g, %g of a difference that has no hydrogen in it", d.ErrUp(), d.ErrLo())
	}
}

func TestCombineLeavesItsArgumentsAlone(t *testing.T) {
	ca, fe := lantern()
	ca0, fe0 := lantern()
	budget.Combine([]float64{2, -1}, ca, fe)
	ca.Scale(3)
	ca.Add(budget.Shift{Cause: budget.Solar, D: 1})
	budget.Pow10(ca)
	if !reflect.DeepEqual(ca, ca0) || !reflect.DeepEqual(fe, fe0) {
		t.Error("an argument changed")
	}
}

func TestCombineAsymmetric(t *testing.T) {
	a := budget.Number{X: 1, Shifts: []budget.Shift{{Cause: budget.Photon, D: 0.25}}, Up: 0.2, Lo: 0.3}
	b := budget.Number{X: 5, Up: 0.6, Lo: 0.8} // errors without a history
	c := budget.Combine([]float64{1, -2}, a, b)
	within(t, "X", c.X, -9, ulps)
	within(t, "Up", c.Up, math.Hypot(0.2, 1.6), ulps) // b enters with a minus: its Lo
	within(t, "Lo", c.Lo, math.Hypot(0.3, 1.2), ulps)
	s := a.Scale(-3)
	within(t, "Scale Up", s.Up, 0.9, ulps)
	within(t, "Scale Lo", s.Lo, 0.6, ulps)
	d := a.Add(budget.Shift{Cause: budget.FValue, D: 0.4})
	within(t, "Add Up", d.Up, math.Sqrt(0.04+0.16), ulps)
	within(t, "Add Lo", d.Lo, 0.5, ulps)
	open := budget.Combine([]float64{1, 0}, a, budget.Number{Lo: math.Inf(1), Up: 1})
	within(t, "Lo with an open error of weight 0", open.Lo, 0.3, ulps)
}

func TestCombinePanicsOnLimits(t *testing.T) {
	for _, f := range []budget.Flag{budget.Upper, budget.Lower, budget.Interval} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("no panic on %v", f)
				}
			}()
			budget.Combine([]float64{1}, budget.Number{X: 1, Flag: f})
		}()
	}
}

func TestKindAndPlain(t *testing.T) {
	nan := math.NaN()
	for _, tc := range []struct {
		n      budget.Number
		kind   string
		lo, hi float64
	}{
		{budget.Number{X: 1, Shifts: []budget.Shift{{D: 0.5}}}, "value", 0.5, 1.5},
		{budget.Number{X: 1, Flag: budget.Marginal | budget.Saturated}, "marginal", 1, 1},
		{budget.Number{X: 1, Flag: budget.Upper | budget.Marginal}, "upper", math.Inf(-1), 1},
		{budget.Number{X: 1, Flag: budget.Lower}, "lower", 1, math.Inf(1)},
		{budget.Number{X: 1, Up: 2, Lo: 0.5, Flag: budget.Interval}, "interval", 0.5, 3},
		{budget.Number{X: 1, Up: 2, Lo: 0.5, Flag: budget.Interval | budget.Upper}, "upper", math.Inf(-1), 3},
		{budget.Number{X: 1, Up: 2, Lo: 0.5, Flag: budget.Interval | budget.Lower}, "lower", 0.5, math.Inf(1)},
		{budget.Number{X: 1, Flag: budget.Lower | budget.Upper}, "none", nan, nan},
		{budget.Number{X: nan, Flag: budget.Upper}, "none", nan, nan},
	} {
		if got := tc.n.Kind(); got != tc.kind {
			t.Errorf("%v of %v: kind %q, want %q", tc.n.X, tc.n.Flag, got, tc.kind)
		}
		lo, hi := tc.n.Range()
		if math.IsNaN(tc.lo) {
			if !math.IsNaN(lo) || !math.IsNaN(hi) {
				t.Errorf("range of none: %g, %g", lo, hi)
			}
			continue
		}
		within(t, "lower end of "+tc.kind, lo, tc.lo, ulps)
		within(t, "upper end of "+tc.kind, hi, tc.hi, ulps)
	}
}

func TestCausesHaveWords(t *testing.T) {
	for _, c := range budget.Causes() {
		b, err := c.MarshalText()
		var back budget.Cause
		if err != nil || back.UnmarshalText(b) != nil || back != c || c.String() != string(b) {
			t.Errorf("%v: %q does not read back", c, b)
		}
	}
	var c budget.Cause
	if err := c.UnmarshalText([]byte("foton")); err == nil {
		t.Error("an unknown cause was read")
	}
	if _, err := budget.Cause(0).MarshalText(); err == nil {
		t.Error("cause 0 was written")
	}
}
