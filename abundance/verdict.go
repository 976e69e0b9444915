package abundance

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/budget"
)

// A Verdict says whether the columns of a species by different methods agree.
type Verdict struct {
	Species string `json:"species"`
	// Against is the method that the others are compared with: a fit where there is one,
	// else what was adopted.
	Against  string  `json:"against"`
	Compared int     `json:"compared"` // others that say something
	Agree    bool    `json:"agree"`    // none is further away than 2σ
	With     string  `json:"with"`     // the one that is furthest away
	Sigma    float64 `json:"sigma"`    // by how many σ of the difference
	Dex      float64 `json:"dex"`      // log N of Against less that of With, or of its end
}

// Text is the verdict in words.
func (v Verdict) Text() string {
	if v.Agree {
		others := fmt.Sprintf("all %d others agree", v.Compared)
		if v.Compared == 1 {
			others = "the one other agrees"
		}
		return fmt.Sprintf("%s: %s with %s within %.1fσ", v.Species, others, v.Against, math.Max(v.Sigma, 0.1))
	}
	return fmt.Sprintf("%s: %s differs from %s by %.1fσ (%s dex)", v.Species, v.With, v.Against, v.Sigma, strings.Replace(fmt.Sprintf("%+.2f", -v.Dex), "-", "−", 1))
}

// Compare compares the columns of one species by all methods, limits included, with the
// fitted one, or with the adopted one (less what disagreement has added to its error).
// It returns false where there is nothing to compare.
//
// Methods that use the same pixels share their noise, which the errors here count twice:
// the σ given are too small rather than too large. Columns of blended lines lie above
// others without speaking against them.
func Compare(cols []Column, adopted Column) (Verdict, bool) {
	ref := adopted
	ref.LogN.Shifts = slices.DeleteFunc(slices.Clone(ref.LogN.Shifts), func(s budget.Shift) bool { return s.Cause == budget.Disagreement })
	name := adopted.Method
	if adopted.Line != "" {
		name = named(adopted)
	}
	for _, c := range cols {
		if c.Method == MethodFit && isValue(c.LogN) && (ref.Method != MethodFit || sigma(c.LogN) < sigma(ref.LogN)) {
			ref, name = c, named(c)
		}
	}
	if len(cols) == 0 || !isValue(ref.LogN) {
		return Verdict{}, false
	}
	v := Verdict{Species: cols[0].Species, Against: name, Sigma: -1}
	for _, c := range cols {
		if math.IsNaN(c.LogN.Plain().X) || c.Method == ref.Method && c.Line == ref.Line && c.LogN.X == ref.LogN.X {
			continue
		}
		n, d := conflict(ref.LogN, c.LogN)
		if math.IsNaN(n) || suspect(c.LogN)&^suspect(ref.LogN) != 0 && d < 0 && isValue(c.LogN) {
			continue
		}
		v.Compared++
		if n > v.Sigma {
			v.Sigma, v.Dex, v.With = n, d, named(c)
		}
	}
	v.Agree = v.Sigma <= disagree
	return v, v.Compared > 0
}
