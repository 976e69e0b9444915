package atomic

import (
	"fmt"
	"math"
	"strings"
)

// defaultFErr is the relative 1σ error of an f-value whose source gives none, and
// no grade: 10 %, the middle class (B) of the NIST letters.
const defaultFErr = 0.10

// nistGrades are the relative accuracies behind the letters of the NIST Atomic
// Spectra Database ("accuracy within"), taken here as 1σ, which is cautious for
// most lines. From memory of the NIST ASD help pages.
var nistGrades = map[string]float64{
	"AAA": 0.003, "AA": 0.01, "A+": 0.02, "A": 0.03, "B+": 0.07, "B": 0.10,
	"C+": 0.18, "C": 0.25, "D+": 0.40, "D": 0.50, "E": 1.0,
}

// fErr returns the 1σ error of f: f_err where the source prints one; else by
// f_grade, a NIST letter, a percentage, or "exact" (no error); else 10 %.
func fErr(r record, f float64) (float64, error) {
	e, err := r.num("f_err", 0, f)
	if err != nil {
		return 0, err
	}
	g := r.get("f_grade")
	if !math.IsNaN(e) {
		if g != "" {
			return 0, r.bad("f_grade", "both f_err and f_grade are given", "keep one of them")
		}
		return e, nil
	}
	switch {
	case g == "":
		return defaultFErr * f, nil
	case g == "exact":
		return 0, nil
	case strings.HasSuffix(g, "%"):
		p, err := parseNumber(strings.TrimSpace(strings.TrimSuffix(g, "%")))
		if err == nil && p > 0 && p <= 100 {
			return p / 100 * f, nil
		}
	default:
		if p, ok := nistGrades[g]; ok {
			return p * f, nil
		}
	}
	return 0, r.bad("f_grade", fmt.Sprintf("%q is not a grade", g), "write a NIST letter (AAA, AA, A+, A, B+, B, C+, C, D+, D, E), a percentage from above 0 to 100 such as 10%, or exact")
}
