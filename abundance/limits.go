package abundance

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/budget"
)

// byLimits is the last step: nothing gives a value.
func byLimits(cols []Column) Column {
	var own []Column // our own non-detections
	var rest []Column
	for _, c := range cols {
		if c.LogN.Is(budget.Upper) && c.LogN.Behind != nil {
			own = append(own, c)
		} else {
			rest = append(rest, c)
		}
	}
	own = onePerLine(own)
	if len(own) > 1 {
		rest = append(rest, stack(own))
	} else {
		rest = append(rest, own...)
	}
	var top, bottom *Column // the limits that bind
	lo, hi := math.Inf(-1), math.Inf(1)
	for i := range rest {
		l, h := ends(rest[i].LogN)
		if l > lo {
			lo, bottom = l, &rest[i]
		}
		if h < hi {
			hi, top = h, &rest[i]
		}
	}
	switch {
	case bottom == nil && top == nil:
		return Column{LogN: budget.Number{X: math.NaN()}, Rule: "no method gives a value or a limit"}
	case top == nil:
		return bound(*bottom, budget.Lower, lo, len(rest))
	case bottom == nil:
		return bound(*top, budget.Upper, hi, len(rest))
	case lo > hi:
		return Column{LogN: budget.Number{X: math.NaN()}, Rule: fmt.Sprintf("nothing adopted: the limits contradict each other, %s gives %s and %s gives %s",
			named(*bottom), show(bottom.LogN), named(*top), show(top.LogN))}
	case top == bottom && top.LogN.Flag&budget.Interval == 0: // a stack that became a value
		out := *top
		if out.Rule == "" {
			out.Rule = "the only column, " + named(out)
		}
		return out
	}
	out := Column{Method: bottom.Method, LogN: budget.Number{X: lo + (hi-lo)/2, Up: (hi - lo) / 2, Lo: (hi - lo) / 2, Flag: budget.Interval, Conf: top.LogN.Conf},
		Rule: fmt.Sprintf("no method gives a value: between %s and %s", named(*bottom), named(*top))}
	out.LogN.From = append(slices.Clone(bottom.LogN.From), top.LogN.From...)
	out.LogN.Flag |= (bottom.LogN.Flag | top.LogN.Flag) &^ (budget.Upper | budget.Lower)
	return out
}

// bound adopts one limit.
func bound(c Column, side budget.Flag, x float64, of int) Column {
	kind := "upper"
	if side == budget.Lower {
		kind = "lower"
	}
	out := c
	if out.LogN = c.LogN.Plain(); !out.LogN.Is(side) { // one end of an interval, or N_a of a saturated line
		out.LogN.Flag = out.LogN.Flag&^(budget.Upper|budget.Lower|budget.Interval) | side
		out.LogN.X, out.LogN.Up, out.LogN.Lo = x, 0, 0
	}
	if c.Rule != "" { // a stack says for itself what it is
		return out
	}
	which := "the " + kind + " limit"
	if of > 1 {
		which = "the strongest " + kind + " limit"
	}
	out.Rule = fmt.Sprintf("no method gives a value: %s, %s", which, named(c))
	return out
}

func onePerLine(cols []Column) []Column {
	var out []Column
	for _, c := range cols {
		i := slices.IndexFunc(out, func(d Column) bool { return d.Line == c.Line && c.Line != "" })
		switch {
		case i < 0:
			out = append(out, c)
		case c.LogN.X < out[i].LogN.X:
			out[i] = c
		}
	}
	return out
}

// stack averages non-detections as what they are, linear N ± σ, with weights
// 1/σ²: the limit falls as more lines join, but not below what they share. It is
// never above the strongest limit of one line.
func stack(own []Column) Column {
	w := make([]float64, len(own))
	n := make([]budget.Number, len(own))
	names := make([]string, len(own))
	sum, conf := 0., 0.
	for i, c := range own {
		n[i] = *c.LogN.Behind
		w[i] = 1 / (n[i].Err() * n[i].Err())
		sum += w[i]
		conf = math.Max(conf, c.LogN.Conf)
		names[i] = named(c)
	}
	for i := range w {
		w[i] /= sum
	}
	if !(sum > 0) || math.IsInf(sum, 0) {
		return own[0]
	}
	if !(conf > 0) {
		conf = budget.DetectionSigma
	}
	out := Column{Method: own[0].Method}
	flags := budget.Flag(0)
	for _, c := range own {
		flags |= c.LogN.Flag &^ budget.Upper
	}
	total := budget.Combine(w, n...)
	total.Flag |= flags
	if total.X >= conf*total.Err() {
		out.LogN = budget.Log10(total)
		out.Rule = fmt.Sprintf("no line alone gives a value, together they do at %.1fσ: mean of %s", total.X/total.Err(), strings.Join(names, ", "))
		return out
	}
	out.LogN = budget.Log10(budget.Limit(total, math.Max(total.X, 0)+conf*total.Err(), conf))
	out.Rule = fmt.Sprintf("no method gives a value: upper limit from the mean of %d non-detections: %s", len(own), strings.Join(names, ", "))
	// One line's limit holds over a narrower range than its N ± σ, and may say more.
	best := slices.MinFunc(own, func(a, b Column) int { return compareFloat(a.LogN.X, b.LogN.X) })
	if best.LogN.X < out.LogN.X {
		out.LogN.X, out.LogN.Conf, out.Line = best.LogN.X, best.LogN.Conf, best.Line
		out.Rule = fmt.Sprintf("no method gives a value: the strongest upper limit, %s; N ± σ from the mean of %d non-detections: %s", named(best), len(own), strings.Join(names, ", "))
	}
	return out
}

// ends are the limits that a column sets: of an unsaturated value it is both, and
// N_a of a saturated line is a lower one.
func ends(n budget.Number) (lo, hi float64) {
	n = n.Plain()
	switch n.Kind() {
	case "upper":
		return math.Inf(-1), n.X
	case "lower":
		return n.X, math.Inf(1)
	case "interval":
		return n.X - n.Lo, n.X + n.Up
	}
	if n.Is(budget.Saturated) {
		return n.X, math.Inf(1)
	}
	return n.X, n.X
}
