// Package abundance turns columns into abundances: one adopted column a species,
// sums over levels, hydrogen, which ions may give a depletion, and depletions.
//
// All columns are log₁₀ cm⁻², errors are 1σ in dex, split by cause. Nothing here
// knows how a column was measured; methods are told apart by their names.
package abundance

import (
	"fmt"
	"math"
	"strings"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/internal/table"
)

// The methods by which a column may have been found.
const (
	MethodWeak    = "weak line"                       // equivalent width on the linear part
	MethodAOD     = "apparent optical depth"          // integral of ln(C/F)
	MethodDoublet = "doublet-corrected optical depth" // two lines, unresolved saturation corrected
	MethodGrowth  = "growth curve"                    // several widths, N and b
	MethodFit     = "fit"                             // Voigt clouds through the instrument's profile
	MethodGiven   = "given"                           // the user's, or the literature's
	MethodSum     = "sum over levels"                 // totals made by SumLevels
)

// A Column is one column density of one species by one method.
type Column struct {
	Species string        // "Ca II", "CN", or with its level "CN N=1", "C II*"
	Element string        // "Ca"; "" for molecules
	Method  string        // weak line, apparent optical depth, growth curve, fit, given, sum over levels
	Line    string        // the transition, where one line gives it
	LogN    budget.Number // log₁₀ cm⁻²
	Rule    string        // why it was adopted, or what was summed (adopted columns and sums only)
}

// Stated returns a column as someone states it: log₁₀ N, its errors up and lo
// (dex; 0 for limits), its kind (value, upper, lower or marginal; "" is value),
// the level of a limit in σ (0 unknown) and where it comes from. The whole error
// stands under one cause, Photon, because its parts are not known.
func Stated(logN, up, lo float64, kind string, conf float64, source string) (budget.Number, error) {
	n := budget.Number{X: logN}
	if source != "" {
		n.From = []budget.Ref{{Kind: "literature", Key: source}}
	}
	if math.IsNaN(logN) || math.IsInf(logN, 0) {
		return n, fmt.Errorf("log N is %v, not a number", logN)
	}
	isLimit := true
	switch kind {
	case "", "value":
		isLimit = false
	case "marginal":
		isLimit = false
		n.Flag = budget.Marginal
	case "upper":
		n.Flag = budget.Upper
	case "lower":
		n.Flag = budget.Lower
	default:
		return n, fmt.Errorf("%q is no kind of column: value, upper, lower or marginal", kind)
	}
	if isLimit {
		if up != 0 || lo != 0 {
			return n, fmt.Errorf("a limit (kind %s) has no error", kind)
		}
		n.Conf = conf
		return n, nil
	}
	if !(up > 0 && lo > 0) || math.IsInf(up, 0) || math.IsInf(lo, 0) {
		return n, fmt.Errorf("a value needs a 1σ error above 0 dex")
	}
	n.Shifts = []budget.Shift{{Cause: budget.Photon, D: (up + lo) / 2}}
	if up != lo {
		n.Up, n.Lo = up, lo
	}
	return n, nil
}

// splitCarrier takes the level off a carrier: "CN N=1" is CN in "N=1", "C II*" is
// C II in "*", "CH e" is CH in "e", "Ca II" has none.
func splitCarrier(carrier string) (species, level string) {
	s := strings.Join(strings.Fields(carrier), " ")
	if bare := strings.TrimRight(s, "*"); bare != s {
		return bare, s[len(bare):]
	}
	if i := strings.LastIndexByte(s, ' '); i > 0 {
		last := s[i+1:]
		if last == "e" || last == "f" || strings.Contains(last, "=") {
			return s[:i], last
		}
	}
	return s, ""
}

func joinCarrier(species, level string) string {
	if level == "" || level[0] == '*' {
		return species + level
	}
	return species + " " + level
}

func elementOf(species string) string {
	e, _, _ := atomic.SplitSpecies(species)
	return e
}

// show prints a column for a sentence: "12.34 ± 0.05", "< 11.2", "12.1 to 12.4".
func show(n budget.Number) string {
	n = n.Plain()
	switch n.Kind() {
	case "none":
		return "unknown"
	case "upper":
		return "< " + table.RoundLimit(n.X, 2, true)
	case "lower":
		return "> " + table.RoundLimit(n.X, 2, false)
	case "interval":
		return table.FormatFixed(n.X-n.Lo, 2) + " to " + table.FormatFixed(n.X+n.Up, 2)
	}
	v, u, l := table.RoundAsym(n.X, n.ErrUp(), n.ErrLo())
	switch {
	case u == "" && l == "":
		return v
	case u == l:
		return v + " ± " + u
	case l == "":
		return v + " +" + u + " (open below)"
	case u == "":
		return v + " −" + l + " (open above)"
	}
	return v + " +" + u + " −" + l
}

// Hydrogen is the total hydrogen column of a sightline. See NewHydrogen.
type Hydrogen struct {
	Route  string        `json:"route"` // RouteSum, RouteHI, RouteGiven
	HI, H2 budget.Number // log₁₀; X is NaN where unknown
	H      budget.Number `json:"h"` // log₁₀; Interval where H2 is only bounded
	Source string        `json:"source"`
	Tracer string        `json:"tracer,omitempty"` // the species that N(H) was derived from, or ""
	Notes  []string      `json:"notes,omitempty"`
}

// A Depletion is D(X) = log N(X) − log N(H) − (ε(X) − 12), or the reason why there is none.
type Depletion struct {
	Element  string        `json:"element"`
	Species  []string      `json:"species"` // the ions it was made from
	D        budget.Number `json:"d"`       // dex; NaN when refused
	Gas      budget.Number `json:"gas"`     // 12 + log N(X)/N(H)
	LogN     budget.Number `json:"log_n"`   // of the element in the gas; NaN where its ions cannot give it
	Scale    string        `json:"scale"`
	Solar    float64       `json:"solar"`             // ε(X); 0 where the scale has none
	SolarErr float64       `json:"solar_err"`         // 0 where the scale gives none
	Refused  string        `json:"refused,omitempty"` // "trace ion: needs ionization correction"
	Notes    []string      `json:"notes,omitempty"`
}
