package abundance

import (
	"fmt"
	"math"

	"lacuna/budget"
)

// Ratio returns the gas-phase abundance ratio of two elements of one sightline
// relative to the Sun,
//
//	[X/Y] = log N(X) − log N(Y) − (ε(X) − ε(Y)) = D(X) − D(Y),
//
// in dex. It is made from the columns, so hydrogen does not enter at all: neither
// its error nor the fact that it is a limit or an interval. Limits by
// budget.Ratio. X is NaN where either element is refused for its ions or its
// solar value. Depletions on two scales are an error: they are never mixed.
func Ratio(x, y Depletion) (budget.Number, error) {
	none := budget.Number{X: math.NaN()}
	if x.Scale != y.Scale {
		return none, fmt.Errorf("[%s/%s]: two solar scales, %s and %s", x.Element, y.Element, x.Scale, y.Scale)
	}
	if x.Solar == 0 || y.Solar == 0 || x.LogN.Kind() == "none" || y.LogN.Kind() == "none" {
		return none, nil
	}
	n := budget.Ratio(x.LogN, y.LogN)
	n.X -= x.Solar - y.Solar
	if x.Element == y.Element {
		return n, nil
	}
	if x.SolarErr > 0 {
		n = n.Add(budget.Shift{Cause: budget.Solar, Key: solarKey(x.Scale, x.Element), D: -x.SolarErr})
	}
	if y.SolarErr > 0 {
		n = n.Add(budget.Shift{Cause: budget.Solar, Key: solarKey(y.Scale, y.Element), D: y.SolarErr})
	}
	return n, nil
}
