package survey_test

import (
	"math"
	"testing"

	"lacuna/budget"
	"lacuna/survey"
	"lacuna/voigt/clouds"
)

// A fit gives its totals as columns; where χ² is too large by chance (1000 for 700: 8σ)
// with errors scaled by √(1000/700) = 1.195, beyond χ²/ν = 2, without convergence and
// for a total that is hardly constrained none.
func TestColumnsOfAFit(t *testing.T) {
	total := func(x, e float64) clouds.Total {
		n := budget.Number{X: x, Shifts: []budget.Shift{{Cause: budget.Photon, D: e}}}
		return clouds.Total{Carrier: "Na I", LogN: n, N: budget.Pow10(n)}
	}
	for _, tc := range []struct {
		name  string
		chi2  float64
		ok    bool
		total clouds.Total
		want  float64 // error; 0: no column
	}{
		{"good", 700, true, total(12.5, 0.04), 0.04},
		{"poor", 1000, true, total(12.5, 0.04), 0.0478},
		{"bad", 1500, true, total(12.5, 0.04), 0},
		{"not converged", 700, false, total(12.5, 0.04), 0},
		{"vague", 700, true, total(14, 2), 0},
	} {
		f := survey.Fit{Result: clouds.Result{Chi2: tc.chi2, DOF: 700, Converged: tc.ok, Totals: []clouds.Total{tc.total}}}
		cols := f.Columns()
		switch {
		case tc.want == 0 && len(cols) != 0:
			t.Errorf("%s: log N = %.2f ± %.2f", tc.name, cols[0].LogN.X, cols[0].LogN.Err())
		case tc.want > 0 && (len(cols) != 1 || cols[0].Method != "fit" || cols[0].Element != "Na" || !(math.Abs(cols[0].LogN.Err()-tc.want) < 1e-4)):
			t.Errorf("%s: %+v, want an error of %.4f", tc.name, cols, tc.want)
		}
	}
}
