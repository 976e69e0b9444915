package abundance

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/atomic"
	"lacuna/budget"
)

// disagree is the difference, in σ of the difference, from which two columns are
// said to disagree.
const disagree = 2

// Adopt returns the one column of a species (in one level) that everything later
// uses, by this rule:
//
//  1. unsaturated lines, each by the weak-line relation or its apparent optical
//     depth, whichever has the smaller total error; several lines are averaged
//     with weights 1/σ², and what they share (f-value, continuum) stays shared.
//     Lines that are blended, in a telluric or stellar line, partly filled or
//     only marginally detected count only where no clean line is left, and no fit;
//  2. a fit through the instrument's profile;
//  3. a doublet-corrected optical depth;
//  4. a growth curve;
//  5. a given column;
//  6. limits: lower limits give the highest, upper limits the lowest; our own
//     non-detections are averaged as N ± σ first; both together an interval.
//
// A growth curve or a doublet correction that lies more than 2σ below a lower limit
// is refused: one cloud was not enough. So is a growth curve with every line on its
// flat part.
//
// Every other column is compared with the adopted one. Where one differs by more
// than 2σ of the difference, half the difference joins the error (cause
// Disagreement), so that neither lies more than 2σ away, and Rule says so. Where
// the strongest of several unsaturated lines gives less than the weakest by more
// than 2σ there is saturation that does not show, and the weakest line alone is
// adopted.
//
// Only the choice of the user may differ from the rule: it is flagged
// Overridden, and Rule gives the reason and what the rule had given. An override
// without a reason, or for a method that has no column here, is an input error.
//
// cols are of one species; their order does not matter. Where none has a number,
// X is NaN and Rule says why. Adopt panics on columns of different species.
//
// Source: the order is common practice; half the difference as the error of two
// methods is common practice too (no source).
func Adopt(cols []Column, o *Override) (Column, error) {
	var used []Column
	for _, c := range cols {
		if c.Species != cols[0].Species {
			panic(fmt.Sprintf("abundance: Adopt: columns of %s and %s", cols[0].Species, c.Species))
		}
		if !math.IsNaN(c.LogN.Plain().X) {
			used = append(used, c)
		}
	}
	slices.SortStableFunc(used, compareColumns)
	out := byRule(used)
	if len(cols) > 0 {
		out.Species, out.Element = cols[0].Species, cols[0].Element
	}
	if o != nil {
		return override(out, used, *o)
	}
	return out, nil
}

func byRule(cols []Column) Column {
	if len(cols) == 0 {
		return Column{LogN: budget.Number{X: math.NaN()}, Rule: "no column by any method"}
	}
	if c, ok := byLines(cols); ok {
		return c
	}
	var refusals []string
	for _, m := range []struct{ method, why string }{
		{MethodFit, "no clean unsaturated line: fit with the instrument's profile"},
		{MethodDoublet, "no unsaturated line and no fit: optical depths of a doublet, corrected for saturation"},
		{MethodGrowth, "no unsaturated line and no fit: growth curve"},
		{MethodSum, "sum over levels"},
		{MethodGiven, "nothing measured gives a value: the given column"},
	} {
		var of []Column
		for _, c := range cols {
			if c.Method != m.method || !isValue(c.LogN) {
				continue
			}
			if why := refuted(c, cols); why != "" {
				refusals = append(refusals, why)
				continue
			}
			of = append(of, c)
		}
		if len(of) == 0 {
			continue
		}
		slices.SortStableFunc(of, func(a, b Column) int { return compareFloat(sigma(a.LogN), sigma(b.LogN)) })
		best := of[0]
		best.Rule = m.why
		if len(of) > 1 {
			best.Rule += ", the one with the smallest error"
		}
		best.Rule += strings.Join(refusals, "")
		return widen(best, others(cols, of[:1]))
	}
	out := byLimits(slices.DeleteFunc(slices.Clone(cols), func(c Column) bool { return refuted(c, cols) != "" }))
	out.Rule += strings.Join(refusals, "")
	return out
}

// refuted says why a growth curve or a doublet correction cannot stand: a lower
// limit lies above it by more than 2σ, as where several clouds are taken for one.
func refuted(c Column, cols []Column) string {
	if c.Method != MethodGrowth && c.Method != MethodDoublet {
		return ""
	}
	if c.Method == MethodGrowth && c.LogN.Is(budget.Saturated) {
		return fmt.Sprintf("; %s, %s, is refused: every line is on its flat part, where N rests on one cloud being enough", named(c), show(c.LogN))
	}
	for _, l := range cols {
		if l.Method == c.Method || !l.LogN.Is(budget.Lower) {
			continue
		}
		if n, d := conflict(c.LogN, l.LogN); d < 0 && n > disagree {
			return fmt.Sprintf("; %s, %s, is refused: %s gives %s", named(c), show(c.LogN), named(l), show(l.LogN))
		}
	}
	return ""
}

// byLines is step 1: unsaturated lines.
func byLines(cols []Column) (Column, bool) {
	var lines []Column // the better method of each line
	for _, c := range cols {
		if !(c.Method == MethodWeak || c.Method == MethodAOD) || !isValue(c.LogN) || c.LogN.Is(budget.Saturated) {
			continue
		}
		i := slices.IndexFunc(lines, func(l Column) bool { return l.Line == c.Line && c.Line != "" })
		switch {
		case i < 0:
			lines = append(lines, c)
		case rank(c) < rank(lines[i]):
			lines[i] = c
		}
	}
	if len(lines) == 0 {
		return Column{}, false
	}
	clean := slices.DeleteFunc(slices.Clone(lines), func(c Column) bool { return suspect(c.LogN) != 0 })
	doubt := ""
	if len(clean) == 0 {
		if slices.ContainsFunc(cols, func(c Column) bool { return c.Method == MethodFit && isValue(c.LogN) }) {
			return Column{}, false
		}
		clean = lines
		var all budget.Flag
		for _, c := range lines {
			all |= suspect(c.LogN)
		}
		doubt = " (" + strings.Join(all.Words(), ", ") + ": no clean line is left)"
	}
	if len(clean) == 1 {
		best := clean[0]
		best.Rule = "unsaturated line " + named(best) + doubt
		return widen(best, others(cols, clean)), true
	}
	best := mean(clean)
	names := make([]string, len(clean))
	for i, c := range clean {
		names[i] = named(c)
	}
	best.Rule = fmt.Sprintf("mean of %d unsaturated lines, weighted by their errors: %s%s", len(clean), strings.Join(names, ", "), doubt)
	if weakest, why := hidden(clean); why != "" {
		weakest.Rule = "weakest line " + named(weakest) + " alone: " + why + doubt
		weakest.LogN = weakest.LogN.With(budget.Saturated)
		return widen(weakest, others(cols, []Column{weakest})), true
	}
	return widen(best, others(cols, clean), scatter(clean)...), true
}

// mean averages unsaturated lines with weights 1/σ².
func mean(cols []Column) Column {
	w := weights(cols)
	n := make([]budget.Number, len(cols))
	top := 0
	for i, c := range cols {
		n[i] = c.LogN
		if w[i] > w[top] {
			top = i
		}
	}
	return Column{Method: cols[top].Method, LogN: budget.Combine(w, n...)}
}

// weights returns 1/σ² for each column, in sum 1; equal ones if an error is 0.
func weights(cols []Column) []float64 {
	w := make([]float64, len(cols))
	sum := 0.
	for i, c := range cols {
		s := sigma(c.LogN)
		w[i] = 1 / (s * s)
		sum += w[i]
	}
	for i := range w {
		if math.IsInf(sum, 0) || !(sum > 0) {
			w[i] = 1 / float64(len(w))
		} else {
			w[i] /= sum
		}
	}
	return w
}

// hidden looks for saturation that does not show in the lines themselves: the
// strongest (in fλ) gives less than the weakest by more than 2σ.
func hidden(cols []Column) (weakest Column, why string) {
	var strong, weak Column
	lo, hi := math.Inf(1), 0.
	for _, c := range cols {
		l, err := atomic.Default().Find(c.Line)
		if err != nil || !(l.F > 0) {
			return Column{}, ""
		}
		fl := l.F * l.Wave
		if fl < lo {
			lo, weak = fl, c
		}
		if fl > hi {
			hi, strong = fl, c
		}
	}
	if lo == hi {
		return Column{}, ""
	}
	if d := budget.Combine([]float64{1, -1}, weak.LogN, strong.LogN); d.X > disagree*d.ErrLo() {
		return weak, fmt.Sprintf("the strongest, %s, gives less by %.1fσ, so it hides saturation", strong.Line, d.X/d.ErrLo())
	}
	return Column{}, ""
}

func isValue(n budget.Number) bool {
	k := n.Kind()
	return k == "value" || k == "marginal"
}

// suspect are the flags that make a line the second choice.
func suspect(n budget.Number) budget.Flag {
	return n.Flag & (budget.Blended | budget.InTelluric | budget.InStellar | budget.Filled | budget.Marginal | budget.AtBound)
}

// sigma is the mean of the two errors, or the finite one.
func sigma(n budget.Number) float64 {
	up, lo := n.ErrUp(), n.ErrLo()
	switch {
	case math.IsInf(lo, 0):
		return up
	case math.IsInf(up, 0):
		return lo
	}
	return (up + lo) / 2
}

// rank orders the two columns of one line: clean before suspect, then by error.
func rank(c Column) float64 {
	if suspect(c.LogN) != 0 {
		return 1e6 + sigma(c.LogN)
	}
	return sigma(c.LogN)
}

// others returns the columns that are not among those used.
func others(cols, used []Column) []Column {
	var out []Column
	for _, c := range cols {
		if !slices.ContainsFunc(used, func(u Column) bool { return u.Line == c.Line && u.Method == c.Method }) {
			out = append(out, c)
		}
	}
	return out
}

func named(c Column) string {
	if c.Line == "" {
		return c.Method
	}
	return c.Line + " (" + c.Method + ")"
}

func compareColumns(a, b Column) int {
	if c := strings.Compare(a.Line, b.Line); c != 0 {
		return c
	}
	if c := strings.Compare(a.Method, b.Method); c != 0 {
		return c
	}
	return compareFloat(a.LogN.X, b.LogN.X)
}

func compareFloat(a, b float64) int {
	switch {
	case a < b:
		return -1
	case a > b:
		return 1
	}
	return 0
}
