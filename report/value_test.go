package report

import (
	"math"
	"testing"

	"lacuna/budget"
)

// The examples of rounding that the project's table rules give (the 355/950 rule
// of the Particle Data Group), and the signs of limits and asymmetric errors.
func TestNumbersInPrint(t *testing.T) {
	err := func(x, e float64) budget.Number {
		return budget.Number{X: x, Shifts: []budget.Shift{{Cause: budget.Photon, D: e}}}
	}
	for _, tc := range []struct {
		n            budget.Number
		text, marked string
	}{
		{err(11.8423, 0.0147), "11.842 ± 0.015", "= 11.842 ± 0.015"},
		{err(11.8423, 0.0371), "11.84 ± 0.04", "= 11.84 ± 0.04"},
		{err(11.8423, 0.0962), "11.84 ± 0.10", "= 11.84 ± 0.10"},
		{err(2.104, 0.118), "2.10 ± 0.12", "= 2.10 ± 0.12"},
		{err(131.2, 14.4), "131 ± 14", "= 131 ± 14"},
		{err(-0.41, 0.03), "−0.410 ± 0.030", "= −0.410 ± 0.030"},
		{budget.Number{X: 11.8423, Up: 0.0371, Lo: 0.0962}, "11.84 +0.04 −0.10", "= 11.84^{+0.04}_{−0.10}"},
		{budget.Number{X: 11.8423, Up: 0.3, Lo: math.Inf(1)}, "11.84 +0.30 −∞", "= 11.84^{+0.30}_{−∞}"},
		{budget.Number{X: 10.1701, Flag: budget.Upper}, "< 10.18", "< 10.18"},                                   // outward
		{budget.Number{X: 12.6189, Flag: budget.Lower}, "> 12.61", "> 12.61"},                                   // outward
		{budget.Number{X: -1.2, Flag: budget.Lower}, "> −1.20", "> −1.20"},                                      //
		{budget.Number{X: 21, Up: 0.103, Lo: 0.103, Flag: budget.Interval}, "20.89 … 21.11", "= 20.89 … 21.11"}, // outward at both ends
		{budget.Number{X: 3}, "3.00", "= 3.00"},                                                                 // fixed: no error
		{budget.Number{X: math.NaN()}, "–", "not known"},
	} {
		p := printLog(tc.n)
		if p.text() != tc.text || p.marked() != tc.marked {
			t.Errorf("%+v: %q, %q; want %q, %q", tc.n, p.text(), p.marked(), tc.text, tc.marked)
		}
	}
}

// The tables keep two digits more than the print, and limits still hold.
func TestNumbersInTables(t *testing.T) {
	for _, tc := range []struct {
		n               budget.Number
		kind, x, up, lo string
	}{
		{budget.Number{X: 11.84231234, Shifts: []budget.Shift{{Cause: budget.Photon, D: 0.0147123}}}, "value", "11.84231", "0.01471", "0.01471"},
		{budget.Number{X: 131.2345678, Shifts: []budget.Shift{{Cause: budget.Photon, D: 14.4}}}, "value", "131.23", "14.40", "14.40"},
		{budget.Number{X: 10.17012, Flag: budget.Upper}, "upper", "10.1702", "", ""},
		{budget.Number{X: 12.61899, Flag: budget.Lower}, "lower", "12.6189", "", ""},
		{budget.Number{X: 12, Up: 0.3, Lo: math.Inf(1)}, "value", "12.0000", "0.3000", ""},
		{budget.Number{X: math.NaN()}, "", "", "", ""},
	} {
		kind, x, up, lo := numberCells(tc.n, 1, 2)
		if kind.Text != tc.kind || x.Text != tc.x || up.Text != tc.up || lo.Text != tc.lo {
			t.Errorf("%+v: %q %q %q %q, want %q %q %q %q", tc.n, kind.Text, x.Text, up.Text, lo.Text, tc.kind, tc.x, tc.up, tc.lo)
		}
	}
}
