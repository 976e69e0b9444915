package abundance

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/internal/oops"
)

// TraceRefusal is what stands in place of the depletion of an element of which
// only a trace is seen.
const TraceRefusal = "trace ion: needs ionization correction"

// Deplete returns the depletion of every element that cols has an ion of, in
// order of atomic number,
//
//	D(X) = log N(X) − log N(H) − (ε(X) − 12),   Gas = 12 + log N(X) − log N(H),
//
// both in dex, 1σ errors, limits and intervals by budget.Ratio. cols hold one
// column a species (or one a level: SumLevels is called first, and a total over
// levels goes before its parts). The error of ε is a shift of its own, cause
// Solar, key "solar:<scale>:<X>", so that D.Err() has it and
// D.Without(budget.Solar) has not; that of N(H) has the key "NH:<sightline>".
//
// N(X) follows atomic.Dominance:
//
//	direct   the ion's column
//	sum      all stages of the element added; a lower limit where one is missing
//	partly   (Ca II) refused; the lower bound on D stands in Notes
//	trace    refused: "trace ion: needs ionization correction"
//	never    refused; molecules are not listed at all
//
// An element whose direct ion is there takes no notice of its traces. Elements
// without a solar value, and all elements where N(H) is unknown or was derived
// from the element itself, are refused with the reason; LogN stays for Ratio.
//
// The scale must be named (a key of atomic.SolarScales): an unknown one, and two
// columns of one species, are input errors.
//
// Source: Jenkins 2009, ApJ 700, 1299; Savage & Sembach 1996, ARA&A 34, 279.
func Deplete(cols []Column, h Hydrogen, scale string) ([]Depletion, error) {
	if err := checkScale(scale); err != nil {
		return nil, err
	}
	species, err := totals(SumLevels(cols))
	if err != nil {
		return nil, err
	}
	var out []Depletion
	for _, el := range elements(species) {
		var ions []Column
		for _, c := range species {
			if elementOf(c.Species) == el {
				ions = append(ions, c)
			}
		}
		out = append(out, depleteElement(el, ions, h, scale))
	}
	return out, nil
}

func checkScale(scale string) error {
	var keys []string
	for _, s := range atomic.SolarScales() {
		keys = append(keys, s.Key)
	}
	switch {
	case scale == "":
		return oops.Input("", "scale", "no solar scale is named, and none is taken silently", "choose one of "+strings.Join(keys, ", "))
	case !slices.Contains(keys, scale):
		fix := "choose one of " + strings.Join(keys, ", ")
		if near := oops.Nearest(scale, keys, 2); len(near) > 0 {
			fix = "did you mean " + strings.Join(near, " or ") + "?"
		}
		return oops.Inputf("", "scale", fix, "no solar scale %q", scale)
	}
	return nil
}

// totals leaves one column a species: the total over levels where there is one.
func totals(cols []Column) ([]Column, error) {
	var out []Column
	for _, c := range cols {
		s, level := splitCarrier(c.Species)
		sum := slices.ContainsFunc(cols, func(d Column) bool {
			ds, _ := splitCarrier(d.Species)
			return ds == s && d.Method == MethodSum
		})
		if sum && c.Method != MethodSum {
			continue
		}
		if slices.ContainsFunc(out, func(d Column) bool { return d.Species == joinCarrier(s, level) }) {
			return nil, oops.Input("", c.Species, "two columns of one species", "keep the adopted one")
		}
		c.Species = joinCarrier(s, level)
		out = append(out, c)
	}
	return out, nil
}

// elements returns the elements of the atoms in cols by atomic number.
func elements(cols []Column) []string {
	var out []string
	for _, c := range cols {
		if el := elementOf(c.Species); el != "" && el != "H" && !slices.Contains(out, el) {
			out = append(out, el)
		}
	}
	z := func(el string) int { e, _ := atomic.Element(el); return e.Z }
	slices.SortStableFunc(out, func(a, b string) int { return z(a) - z(b) })
	return out
}

func depleteElement(el string, ions []Column, h Hydrogen, scale string) Depletion {
	none := budget.Number{X: math.NaN()}
	d := Depletion{Element: el, Scale: scale, D: none, Gas: none, LogN: none}
	eps, err := atomic.Solar(scale, el)
	if err == nil {
		d.Solar = eps.LogEps
		if eps.Err > 0 {
			d.SolarErr = eps.Err
		}
	}
	partly := elementColumn(&d, ions)
	switch {
	case d.Refused != "":
	case d.LogN.Kind() == "none":
		d.Refused = "no column of " + strings.Join(d.Species, " or ")
	case err != nil:
		d.Refused = fmt.Sprintf("the scale %s has no value for %s", scale, el)
		d.Notes = append(d.Notes, err.Error())
	case h.tracedBy(el) != "":
		d.Refused = h.tracedBy(el)
	case !h.known():
		d.Refused = "N(H) is not known"
	case budget.Ratio(d.LogN, h.H).Kind() == "none":
		d.Refused = fmt.Sprintf("N(%s) is a limit and so is N(H): they leave the depletion open on both sides", el)
	}
	if d.Refused != "" {
		if partly != nil && err == nil && h.known() {
			if x := budget.Ratio(lowerEnd(*partly), h.H); x.Kind() == "lower" {
				x.X -= eps.LogEps - 12
				d.Notes = append(d.Notes, fmt.Sprintf("D(%s) %s from %s alone", el, show(x), strings.Join(d.Species, ", ")))
			}
		}
		return d
	}
	d.Gas = budget.Ratio(d.LogN, h.H)
	d.D = d.Gas
	d.D.X -= eps.LogEps - 12
	d.Gas.X += 12
	if d.SolarErr > 0 {
		d.D = d.D.Add(budget.Shift{Cause: budget.Solar, Key: solarKey(scale, el), D: -d.SolarErr})
	} else {
		d.Notes = append(d.Notes, "the scale gives no error for "+el)
	}
	d.D.From = append(slices.Clone(d.D.From), budget.Ref{Kind: "solar", Key: scale + ":" + el, Note: eps.Source})
	return d
}

func solarKey(scale, el string) string { return "solar:" + scale + ":" + el }

// elementColumn fills Species, LogN, Refused and Notes from the ions of one
// element. It returns the column of an ion that bounds N(X) from below, if that
// is all there is.
func elementColumn(d *Depletion, ions []Column) (partly *budget.Number) {
	of := map[atomic.RuleKind][]Column{}
	for _, c := range ions {
		k := atomic.Dominance(c.Species).Kind
		of[k] = append(of[k], c)
	}
	use := func(cols []Column) {
		for _, c := range cols {
			d.Species = append(d.Species, c.Species)
			if c.Method == MethodSum {
				d.Notes = append(d.Notes, c.Species+": "+c.Rule)
			}
		}
	}
	refuse := func(k atomic.RuleKind, why string) {
		use(of[k])
		d.Refused = why
		for _, c := range of[k] {
			if r := c.Species + ": " + atomic.Dominance(c.Species).Reason; !slices.Contains(d.Notes, r) {
				d.Notes = append(d.Notes, r)
			}
		}
	}
	switch {
	case len(of[atomic.Direct]) > 0:
		use(of[atomic.Direct][:1])
		d.LogN = of[atomic.Direct][0].LogN.Plain()
		if w := atomic.Dominance(d.Species[0]).Warning; w != "" {
			d.Notes = append(d.Notes, w)
		}
	case len(of[atomic.Sum]) > 0:
		use(of[atomic.Sum])
		sumStages(d, of[atomic.Sum])
	case len(of[atomic.Partly]) > 0:
		refuse(atomic.Partly, "holds only part of its element: needs ionization correction")
		d.Refused = d.Species[0] + " " + d.Refused
		n := of[atomic.Partly][0].LogN.Plain()
		if k := n.Kind(); k != "upper" && k != "none" {
			partly = &n
		}
	case len(of[atomic.Trace]) > 0:
		refuse(atomic.Trace, TraceRefusal)
	case len(of[atomic.NoRule]) > 0:
		refuse(atomic.NoRule, "no rule says whether this ion holds its element")
	default:
		refuse(atomic.Never, "never a depletion")
	}
	return partly
}

// stagesOf are the ions whose columns add up to their element in H I gas.
var stagesOf = map[string][]string{"Cl": {"Cl I", "Cl II"}}

// sumStages adds the stages of one element.
func sumStages(d *Depletion, stages []Column) {
	n := make([]budget.Number, len(stages))
	for i, c := range stages {
		n[i] = budget.Pow10(c.LogN)
	}
	d.LogN = budget.Log10(budget.SumColumns(n...))
	var missing []string
	for _, s := range stagesOf[d.Element] {
		if !slices.ContainsFunc(stages, func(c Column) bool { return c.Species == s && c.LogN.Kind() != "none" }) {
			missing = append(missing, s)
		}
	}
	if len(missing) == 0 {
		return
	}
	names := strings.Join(missing, " and ")
	switch d.LogN.Kind() {
	case "none":
	case "upper":
		d.LogN = budget.Number{X: math.NaN()}
		d.Refused = names + " is not there, and the other stage is an upper limit: N(" + d.Element + ") has no bound"
	default:
		d.LogN = lowerEnd(d.LogN)
		d.Notes = append(d.Notes, fmt.Sprintf("%s is not there: N(%s) is a lower limit", names, d.Element))
	}
}
