package abundance_test

import (
	"math"
	"testing"

	"lacuna/abundance"
	"lacuna/budget"
)

// Differences and errors of the cases are worked out by hand: 0.30 dex with errors of
// 0.06 and 0.08 is 3σ, and a lower limit 0.12 above a value with an error of 0.04 is 3σ.
func TestCompare(t *testing.T) {
	col := func(method string, x, e float64, f budget.Flag) abundance.Column {
		n := budget.Number{X: x, Flag: f}
		if e > 0 {
			n.Shifts = []budget.Shift{{Cause: budget.Photon, D: e}}
		}
		return abundance.Column{Species: "Na I", Method: method, LogN: n}
	}
	fit := col(abundance.MethodFit, 12.50, 0.06, 0)
	for _, tc := range []struct {
		name  string
		cols  []abundance.Column
		agree bool
		sigma float64
		with  string
	}{
		{"agree", []abundance.Column{fit, col(abundance.MethodGrowth, 12.55, 0.08, 0)}, true, 0.5, abundance.MethodGrowth},
		{"differ", []abundance.Column{fit, col(abundance.MethodGrowth, 12.20, 0.08, 0)}, false, 3, abundance.MethodGrowth},
		{"lower limit below", []abundance.Column{fit, col(abundance.MethodAOD, 12.2, 0, budget.Lower)}, true, 0, abundance.MethodAOD},
		{"lower limit above", []abundance.Column{col(abundance.MethodFit, 12.5, 0.04, 0), col(abundance.MethodAOD, 12.62, 0, budget.Lower)}, false, 3, abundance.MethodAOD},
		{"blend above", []abundance.Column{fit, col(abundance.MethodWeak, 13.5, 0.05, budget.Blended), col(abundance.MethodGrowth, 12.5, 0.08, 0)}, true, 0, abundance.MethodGrowth},
	} {
		v, ok := abundance.Compare(tc.cols, tc.cols[0])
		if !ok || v.Agree != tc.agree || !(math.Abs(v.Sigma-tc.sigma) < 1e-9) || v.With != tc.with {
			t.Errorf("%s: %+v", tc.name, v)
		}
		if v.Text() == "" {
			t.Error("no words")
		}
	}
	// The adopted column stands in where nothing was fitted, without what the comparison itself put into its error.
	adopted := col(abundance.MethodAOD, 12.5, 0.06, 0)
	adopted.LogN.Shifts = append(adopted.LogN.Shifts, budget.Shift{Cause: budget.Disagreement, D: 1})
	v, ok := abundance.Compare([]abundance.Column{col(abundance.MethodAOD, 12.5, 0.06, 0), col(abundance.MethodGrowth, 12.2, 0.08, 0)}, adopted)
	if !ok || v.Agree || !(math.Abs(v.Sigma-3) < 1e-9) {
		t.Errorf("%+v", v)
	}
	if _, ok := abundance.Compare([]abundance.Column{fit}, fit); ok {
		t.Error("one column agrees with itself")
	}
	if _, ok := abundance.Compare([]abundance.Column{col(abundance.MethodAOD, 12.5, 0, budget.Lower)}, col(abundance.MethodAOD, 12.5, 0, budget.Lower)); ok {
		t.Error("a limit is nothing to compare with")
	}
}
