// Package abundance turns columns into abundances: sums over levels, hydrogen,
// which ions may give a depletion, and depletions.
package abundance

import "lacuna/budget"

// A Column is one column density of one species by one method.
type Column struct {
	Species string        // "Ca II", "CN", or with its level "CN N=1", "C II*"
	Element string        // "Ca"; "" for molecules
	Method  string        // weak line, apparent optical depth, growth curve, fit, given
	Line    string        // the transition, where one line gives it
	LogN    budget.Number // log₁₀ cm⁻²
	Rule    string        // why it was adopted (adopted columns only)
}

// Hydrogen is the total hydrogen column of a sightline.
type Hydrogen struct {
	Route  string        `json:"route"` // "N(H I) + 2 N(H2)", "given total"
	HI, H2 budget.Number // log₁₀; X is NaN where unknown
	H      budget.Number `json:"h"` // log₁₀; Interval where H2 is unknown
	Source string        `json:"source"`
	Notes  []string      `json:"notes,omitempty"`
}

// A Depletion is D(X) = log N(X) − log N(H) − (ε(X) − 12), or the reason why there is none.
type Depletion struct {
	Element  string        `json:"element"`
	Species  []string      `json:"species"` // the ions it was made from
	D        budget.Number `json:"d"`       // dex; NaN when refused
	Gas      budget.Number `json:"gas"`     // 12 + log N(X)/N(H)
	Scale    string        `json:"scale"`
	Solar    float64       `json:"solar"` // ε(X)
	SolarErr float64       `json:"solar_err"`
	Refused  string        `json:"refused,omitempty"` // "trace ion: needs ionization correction"
	Notes    []string      `json:"notes,omitempty"`
}
