package abundance

import (
	"fmt"
	"math"
	"slices"

	"lacuna/budget"
	"lacuna/internal/table"
)

// A clash is a column that speaks against the adopted one.
type clash struct {
	with   Column
	nsigma float64
	widen  float64 // dex
}

// widen compares an adopted column with every other one and lets the largest
// disagreement into its error.
func widen(best Column, rest []Column, found ...clash) Column {
	for _, c := range rest {
		n, d := conflict(best.LogN, c.LogN)
		if suspect(c.LogN)&^suspect(best.LogN) != 0 && d < 0 && isValue(c.LogN) {
			continue // what else absorbs in a blended line can only add
		}
		found = append(found, clash{c, n, math.Abs(d) / 2})
	}
	worst := 0.
	for _, c := range found {
		if c.nsigma > disagree {
			worst = math.Max(worst, c.widen)
			best.Rule += fmt.Sprintf("; at odds with %s, %s, by %.1fσ", named(c.with), show(c.with.LogN), c.nsigma)
		}
	}
	if worst > 0 {
		best.LogN = best.LogN.Add(budget.Shift{Cause: budget.Disagreement, D: worst})
		best.Rule += ": " + table.FormatFixed(worst, 2) + " dex added to the error"
	}
	return best
}

// scatter compares each line of a mean with the mean. The error of the difference
// is exact: what a line gives to the mean is the same unknown in both.
func scatter(cols []Column) []clash {
	w := weights(cols)
	n := make([]budget.Number, len(cols))
	for i, c := range cols {
		n[i] = c.LogN
	}
	var out []clash
	for i, c := range cols {
		d := slices.Clone(w)
		d[i]--
		diff := budget.Combine(d, n...) // mean − line
		s := diff.ErrUp()
		if diff.X > 0 {
			s = diff.ErrLo()
		}
		out = append(out, clash{c, math.Abs(diff.X) / s, math.Abs(diff.X)}) // of two equal lines, half their difference
	}
	return out
}

// conflict returns by how many σ another column speaks against the best one, and
// the difference best − other in dex.
func conflict(best, other budget.Number) (nsigma, d float64) {
	if isValue(other) && !other.Is(budget.Saturated) {
		diff := budget.Combine([]float64{1, -1}, best, other)
		s := diff.ErrUp()
		if diff.X > 0 {
			s = diff.ErrLo()
		}
		return math.Abs(diff.X) / s, diff.X
	}
	if other.Is(budget.Upper) && other.Behind != nil {
		b := budget.Pow10(best)
		s := math.Hypot(b.ErrLo(), other.Behind.Err())
		if d := best.X - other.X; d > 0 { // below its own limit it cannot be at odds
			return (b.X - other.Behind.X) / s, d
		}
		return 0, 0
	}
	lo, hi := ends(other)
	switch {
	case best.X < lo:
		return (lo - best.X) / math.Hypot(best.ErrUp(), other.Err()), best.X - lo
	case best.X > hi:
		return (best.X - hi) / math.Hypot(best.ErrLo(), other.Err()), best.X - hi
	}
	return 0, 0
}
