package budget_test

import (
	"math"
	"testing"

	"lacuna/budget"
)

var (
	value    = budget.Number{X: 10, Shifts: []budget.Shift{{Cause: budget.Photon, D: 1}}}
	other    = budget.Number{X: 4, Shifts: []budget.Shift{{Cause: budget.Photon, D: 0.5}}}
	upper    = budget.Number{X: 3, Flag: budget.Upper, Conf: 3}
	upper2   = budget.Number{X: 5, Flag: budget.Upper, Conf: 2}
	lower    = budget.Number{X: 7, Flag: budget.Lower, Conf: 3}
	interval = budget.Number{X: 6, Up: 2, Lo: 1, Flag: budget.Interval}
	none     = budget.Number{X: math.NaN()}
)

func own(x, sigma, conf float64) budget.Number {
	n := budget.Number{X: x, Shifts: []budget.Shift{{Cause: budget.Photon, D: sigma}}}
	return budget.Limit(n, math.Max(x, 0)+conf*sigma, conf)
}

type limitCase struct {
	name string
	got  budget.Number
	kind string
	a, b float64 // value, σ; limit, Conf; ends of an interval
}

func (tc limitCase) check(t *testing.T) {
	t.Helper()
	if k := tc.got.Kind(); k != tc.kind {
		t.Errorf("%s: kind %q, want %q (X %g)", tc.name, k, tc.kind, tc.got.X)
		return
	}
	switch tc.kind {
	case "value", "marginal":
		within(t, tc.name+": X", tc.got.X, tc.a, ulps)
		within(t, tc.name+": σ", tc.got.Err(), tc.b, ulps)
	case "upper", "lower":
		within(t, tc.name+": limit", tc.got.X, tc.a, ulps)
		within(t, tc.name+": Conf", tc.got.Conf, tc.b, ulps)
	case "interval":
		lo, hi := tc.got.Range()
		within(t, tc.name+": lower end", lo, tc.a, ulps)
		within(t, tc.name+": upper end", hi, tc.b, ulps)
	}
}

// The algebra of limits: value and upper give an interval, value and lower a
// lower limit, upper and lower a lower limit; upper and upper the sum of the best
// values where they are known, else of the limits (common practice, no source).
func TestSumColumns(t *testing.T) {
	sum := budget.SumColumns
	for _, tc := range []limitCase{
		{"value+value", sum(value, other), "value", 14, math.Sqrt(1.25)},
		{"value+upper", sum(value, upper), "interval", 10, 13},
		{"upper+value", sum(upper, value), "interval", 10, 13},
		{"value+lower", sum(value, lower), "lower", 17, 3},
		{"upper+upper", sum(upper, upper2), "upper", 8, 2},
		{"upper+lower", sum(upper, lower), "lower", 7, 3},
		{"lower+lower", sum(lower, lower), "lower", 14, 3},
		{"value+upper+lower", sum(value, upper, lower), "lower", 17, 3},
		{"value+upper+upper", sum(value, upper, upper2), "interval", 10, 18},
		{"interval+value", sum(interval, value), "interval", 15, 18},
		{"interval+upper", sum(interval, upper), "interval", 5, 11},
		{"interval+lower", sum(interval, lower), "lower", 12, 3},
		{"interval+interval", sum(interval, interval), "interval", 10, 16},
		{"value+none", sum(value, none), "none", 0, 0},
		{"of one", sum(upper), "upper", 3, 3},
		{"of nothing", sum(), "none", 0, 0},
		{"a mixture reads as its limit", sum(budget.Number{X: 6, Up: 2, Lo: 1, Flag: budget.Interval | budget.Lower}), "lower", 5, 0},

		{"own+own, together detected", sum(own(25, 10, 3), own(35, 10, 3)), "value", 60, math.Sqrt(200)},
		{"own+own, one negative", sum(own(-3, 1, 3), own(2, 1, 3)), "upper", 3 * math.Sqrt2, 3},
		{"own+value", sum(own(-1, 2, 3), value), "value", 9, math.Sqrt(5)},
		{"own+someone else's", sum(own(1, 1, 3), upper), "upper", 7, 3},
		{"own+lower", sum(own(-1, 2, 3), lower), "lower", 7, 3},
		{"own+value+upper", sum(own(-1, 2, 3), value, upper), "interval", 9, 12},
	} {
		tc.check(t)
	}
	behind := sum(own(-3, 1, 3), own(2, 1, 3)).Behind
	if behind == nil {
		t.Fatal("a sum of our own non-detections has lost its N ± σ")
	}
	within(t, "best value behind the sum", behind.X, -1, ulps)
	within(t, "σ behind the sum", behind.Err(), math.Sqrt2, ulps)
	// Errors that two summands share add before they are squared.
	s := budget.Shift{Cause: budget.FValue, Key: "f", D: 1}
	within(t, "shared f", sum(budget.Number{X: 1, Shifts: []budget.Shift{s}}, budget.Number{X: 1, Shifts: []budget.Shift{s}}).Err(), 2, ulps)
	// Two marginal columns that together are a detection.
	m := budget.Number{X: 2.5, Shifts: []budget.Shift{{Cause: budget.Photon, D: 1}}, Flag: budget.Marginal}
	if k := sum(m, m).Kind(); k != "value" {
		t.Errorf("5 ± √2 is %q", k)
	}
}

// N(X)> with N(H)> gives nothing, N(X)< with N(H)> an upper limit, N(X)> with
// N(H)< a lower one (common practice, no source); the rest of the table follows
// from the same arithmetic of ends.
func TestRatio(t *testing.T) {
	r := budget.Ratio
	for _, tc := range []limitCase{
		{"value/value", r(value, other), "value", 6, math.Sqrt(1.25)},
		{"value/upper", r(value, upper), "lower", 7, 3},
		{"value/lower", r(value, lower), "upper", 3, 3},
		{"value/interval", r(value, interval), "interval", 2, 5},
		{"upper/value", r(upper, value), "upper", -7, 3},
		{"upper/upper", r(upper, upper2), "none", 0, 0},
		{"upper/lower", r(upper2, lower), "upper", -2, 2},
		{"upper/interval", r(upper, interval), "upper", -2, 3},
		{"lower/value", r(lower, value), "lower", -3, 3},
		{"lower/upper", r(lower, upper2), "lower", 2, 2},
		{"lower/lower", r(lower, lower), "none", 0, 0},
		{"lower/interval", r(lower, interval), "lower", -1, 3},
		{"interval/value", r(interval, value), "interval", -5, -2},
		{"interval/upper", r(interval, upper), "lower", 2, 3},
		{"interval/lower", r(interval, lower), "upper", 1, 3},
		{"interval/interval", r(interval, interval), "interval", -3, 3},
		{"none/value", r(none, value), "none", 0, 0},
		{"value/none", r(value, none), "none", 0, 0},
	} {
		tc.check(t)
	}
}

func TestLog10(t *testing.T) {
	rel := func(s float64) budget.Number {
		return budget.Number{X: 1e13, Shifts: []budget.Shift{{Cause: budget.Photon, Key: "k", D: -s * 1e13}}}
	}
	for _, tc := range []struct{ s, up, lo float64 }{
		{0.1, 0.1 / math.Ln10, 0.1 / math.Ln10},
		{0.199, 0.199 / math.Ln10, 0.199 / math.Ln10},
		{0.2, math.Log10(1.2), -math.Log10(0.8)},
		{0.5, math.Log10(1.5), math.Log10(2)},
		{1, math.Log10(2), math.Inf(1)},
		{3, math.Log10(4), math.Inf(1)},
	} {
		l := budget.Log10(rel(tc.s))
		within(t, "log X", l.X, 13, ulps)
		within(t, "Up", l.ErrUp(), tc.up, 1e-13)
		within(t, "Lo", l.ErrLo(), tc.lo, 1e-13)
		within(t, "shift", l.Shifts[0].D, -tc.s/math.Ln10, 1e-13)
		back := budget.Pow10(l)
		within(t, "Pow10 X", back.X, 1e13, 1e-13)
		within(t, "Pow10 Up", back.ErrUp(), tc.s*1e13, 1e-12)
		within(t, "Pow10 Lo", back.ErrLo(), tc.s*1e13, 1e-12)
		if back.Up != 0 {
			t.Errorf("s = %g: a symmetric error came back as Up %g, Lo %g", tc.s, back.Up, back.Lo)
		}
	}
	for _, x := range []float64{0, -1e12, math.NaN(), math.Inf(1)} {
		if k := budget.Log10(budget.Number{X: x}).Kind(); k != "none" {
			t.Errorf("log of %g is %q", x, k)
		}
	}
	limitCase{"log of a limit", budget.Log10(upper2), "upper", math.Log10(5), 2}.check(t)
	limitCase{"log of an interval", budget.Log10(interval), "interval", math.Log10(5), math.Log10(8)}.check(t)
	limitCase{"and back", budget.Pow10(budget.Log10(interval)), "interval", 5, 8}.check(t)
	zero := budget.Number{X: 1, Up: 3, Lo: 1, Flag: budget.Interval}
	limitCase{"log of an interval from 0", budget.Log10(zero), "upper", math.Log10(4), 0}.check(t)
	if b := budget.Pow10(budget.Log10(own(-1, 2, 3))).Behind; b == nil || b.X != -1 {
		t.Error("what is behind a limit was lost in the logarithm")
	}
	// An error given in dex, 20 % or more, is asymmetric in the column.
	p := budget.Pow10(budget.Number{X: 2, Shifts: []budget.Shift{{Cause: budget.FValue, D: math.Log10(2)}}})
	within(t, "Up of 100 × 2^±1", p.Up, 100, 1e-12)
	within(t, "Lo of 100 × 2^±1", p.Lo, 50, 1e-12)
	if k := budget.Pow10(budget.Number{X: 400}).Kind(); k != "none" {
		t.Errorf("10⁴⁰⁰ is %q", k)
	}
}
