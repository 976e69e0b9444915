package abundance

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/internal/table"
)

const (
	tCMB       = 2.7255      // K, temperature of the microwave background: Fixsen 2009, ApJ 707, 916
	kelvinPerK = 1.438776877 // K per cm⁻¹, hc/k: CODATA 2022

	// What unseen levels may hold of what the seen ones do before the sum is only
	// a lower limit.
	unseenMax = 0.05

	// Relative error of twice one Λ-doublet level. The CH levels lie hν/k = 0.16 K
	// apart (3.335 GHz), so e^(−0.16/T) puts their ratio between 0.94 (T = 2.7 K)
	// and a little above 1 (weak inversion, as observed): half of that is the error
	// of the sum. The inversion is from memory (Rydbeck et al. 1976, ApJS 31, 333).
	lambdaErr = 0.03
)

// SumLevels returns cols with the total of every species that has levels, right
// behind the last of them: "CN N=0" and "CN N=1" give CN, "C II" and "C II*" give
// C II, "CH e" and "CH f" give CH. The method of a total is MethodSum (which tells
// it from a column of the ground level); Rule names the levels in it and those
// that are not. Totals that are there already stay as they are.
//
//	N = Σ N(level), in linear columns, with what they share added first
//
// The levels that exist are those of the transition table. Unseen ones are
// estimated by Boltzmann's formula at the temperature of the two lowest levels
// seen, or of the microwave background where only one is: if they would hold up
// to 5 % of what is seen, that joins the error (cause Excitation); if more, the
// sum is a lower limit. Upper limits are raised by the same estimate. Without a
// temperature (limits, inverted levels) Rule only names what is missing.
//
// CH has two Λ-doublet levels, e and f, of almost equal population. One of them
// alone counts twice, with 3 % of error by Excitation. A column of CH without a
// level (4300 Å) is the total already; where both are there the one with the
// smaller error is taken and compared with the other as in Adopt.
//
// Columns of one level by several methods are first brought to one by Adopt.
func SumLevels(cols []Column) []Column {
	var out []Column
	for i, c := range cols {
		out = append(out, c)
		species, _ := splitCarrier(c.Species)
		same := func(d Column) bool { s, _ := splitCarrier(d.Species); return s == species }
		if slices.ContainsFunc(cols[i+1:], same) {
			continue // not its last
		}
		if slices.ContainsFunc(cols, func(d Column) bool { return same(d) && d.Method == MethodSum }) {
			continue
		}
		if total, ok := sumSpecies(species, cols); ok {
			out = append(out, total)
		}
	}
	return out
}

// sumSpecies makes the total of one species; ok is false where there is nothing
// to sum.
func sumSpecies(species string, cols []Column) (Column, bool) {
	var names []string
	var seen []Column
	for _, c := range cols {
		s, level := splitCarrier(c.Species)
		if s != species || slices.Contains(names, level) {
			continue
		}
		var same []Column
		for _, d := range cols {
			if s, l := splitCarrier(d.Species); s == species && l == level {
				same = append(same, d)
			}
		}
		one := same[0]
		if len(same) > 1 {
			one, _ = Adopt(same, nil) // fails only for an override
		}
		names = append(names, level)
		seen = append(seen, one)
	}
	resolved := slices.ContainsFunc(names, func(l string) bool { return l != "" })
	if !resolved {
		return Column{}, false
	}
	total := Column{Species: species, Element: elementOf(species), Method: MethodSum}
	if slices.Contains(names, "e") || slices.Contains(names, "f") {
		lambdaSum(&total, names, seen)
	} else {
		ladderSum(&total, species, names, seen)
	}
	return total, true
}

// lambdaSum adds the two levels of a Λ doublet.
func lambdaSum(total *Column, names []string, seen []Column) {
	at := func(level string) *Column {
		if i := slices.Index(names, level); i >= 0 {
			return &seen[i]
		}
		return nil
	}
	e, f, whole := at("e"), at("f"), at("")
	sum := Column{Species: total.Species, Method: MethodSum}
	switch {
	case e != nil && f != nil:
		sum.LogN = budget.Log10(budget.SumColumns(budget.Pow10(e.LogN), budget.Pow10(f.LogN)))
		sum.Rule = "sum of e and f"
	default:
		one, name, other := e, "e", "f"
		if one == nil {
			one, name, other = f, "f", "e"
		}
		n := budget.Pow10(one.LogN).Scale(2)
		sum.LogN = budget.Log10(n)
		if !math.IsNaN(sum.LogN.X) {
			sum.LogN = sum.LogN.Add(budget.Shift{Cause: budget.Excitation, D: lambdaErr / math.Ln10})
		}
		sum.Rule = fmt.Sprintf("twice level %s, because level %s is not there", name, other)
	}
	if whole != nil {
		best, rest := *whole, sum
		best.Rule = "the line that takes both levels (" + named(*whole) + "), " + show(whole.LogN)
		if isValue(sum.LogN) && (!isValue(whole.LogN) || sigma(sum.LogN) < sigma(whole.LogN)) {
			best, rest = sum, *whole
		}
		if isValue(best.LogN) {
			best = widen(best, []Column{rest})
		}
		total.LogN, total.Rule = best.LogN, best.Rule
		return
	}
	total.LogN, total.Rule = sum.LogN, sum.Rule
}

// A rung is one level of a species as the transition table knows it.
type rung struct {
	level string
	e, g  float64 // cm⁻¹, statistical weight
}

// ladder returns the levels of a species by energy.
func ladder(species string) []rung {
	var out []rung
	for _, l := range atomic.Default().Of(species) {
		if !slices.ContainsFunc(out, func(r rung) bool { return r.level == l.Level }) {
			out = append(out, rung{l.Level, l.ELow, l.GLow})
		}
	}
	slices.SortStableFunc(out, func(a, b rung) int { return compareFloat(a.e, b.e) })
	return out
}

// ladderSum adds rotational or fine-structure levels.
func ladderSum(total *Column, species string, names []string, seen []Column) {
	rungs := ladder(species)
	at := func(level string) int { return slices.IndexFunc(rungs, func(r rung) bool { return r.level == level }) }
	order := make([]int, len(names))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return at(names[a]) - at(names[b]) })
	n := make([]budget.Number, len(seen))
	var in []string
	for k, i := range order {
		n[k] = budget.Pow10(seen[i].LogN)
		in = append(in, label(names[i]))
	}
	total.LogN = budget.Log10(budget.SumColumns(n...))
	total.Rule = "sum of " + strings.Join(in, ", ")
	if len(in) == 1 {
		total.Rule = "only " + in[0]
	}
	var missing []rung
	var out []string
	for _, r := range rungs {
		if !slices.Contains(names, r.level) {
			missing = append(missing, r)
			out = append(out, label(r.level))
		}
	}
	if len(missing) == 0 {
		return
	}
	total.Rule += "; not included: " + strings.Join(out, ", ")
	part, temp, ok := unseen(rungs, names, seen, missing)
	if !ok {
		return
	}
	share := fmt.Sprintf("%.2g %% of what is seen at T = %s K", 100*part, table.FormatFixed(temp, 1))
	if part > 1 {
		share = fmt.Sprintf("more than what is seen at T = %s K", table.FormatFixed(temp, 1))
	}
	total.Rule += " (" + share + ")"
	switch {
	case total.LogN.Is(budget.Upper):
		total.LogN.X += math.Log10(1 + part)
		if total.LogN.Behind != nil {
			b := total.LogN.Behind.Scale(1 + part)
			total.LogN.Behind = &b
		}
		total.Rule += ", by which the limit is raised"
	case part > unseenMax:
		if total.LogN = total.LogN.Plain(); total.LogN.Is(budget.Interval) {
			total.LogN.X -= total.LogN.Lo
		}
		total.LogN.Flag = total.LogN.Flag&^budget.Interval | budget.Lower
		total.LogN.Up, total.LogN.Lo = 0, 0
		total.Rule += ": a lower limit"
	default:
		total.LogN = total.LogN.Add(budget.Shift{Cause: budget.Excitation, D: math.Log10(1 + part)})
	}
}

// unseen estimates what the missing levels hold over what the seen ones do.
func unseen(rungs []rung, names []string, seen []Column, missing []rung) (part, temp float64, ok bool) {
	var have []rung // by energy
	var logN []float64
	for _, r := range rungs {
		if i := slices.Index(names, r.level); i >= 0 && r.g > 0 {
			have = append(have, r)
			logN = append(logN, seen[i].LogN.X)
			if k := seen[i].LogN.Kind(); len(have) <= 2 && len(names) > 1 && k != "value" && k != "marginal" {
				return 0, 0, false // no temperature from limits
			}
		}
	}
	if len(have) == 0 || len(have) < len(names) {
		return 0, 0, false
	}
	temp = tCMB
	if len(have) > 1 {
		lnRatio := (logN[0]-logN[1])*math.Ln10 + math.Log(have[1].g/have[0].g)
		temp = kelvinPerK * (have[1].e - have[0].e) / lnRatio
		if !(temp > 0) || math.IsInf(temp, 0) {
			return 0, 0, false
		}
	}
	boltzmann := func(r rung) float64 {
		return r.g / have[0].g * math.Exp(-kelvinPerK*(r.e-have[0].e)/temp)
	}
	var lacks, holds float64
	for _, r := range missing {
		if !(r.g > 0) {
			return 0, 0, false
		}
		lacks += boltzmann(r)
	}
	for i := range have {
		holds += math.Pow(10, logN[i]-logN[0])
	}
	return lacks / holds, temp, true
}

// label names a level in a sentence.
func label(level string) string {
	if level == "" {
		return "the ground level"
	}
	return level
}
