// Package cog is the curve of growth: exact equivalent widths of Voigt profiles
// and what measured widths say about N and b.
package cog

import (
	"lacuna/atomic"
	"lacuna/budget"
)

// A Point is one measured width.
type Point struct {
	Line   atomic.Line
	W      float64        // Å
	Err    float64        // 1σ, Å, private part (photon noise, placement)
	Common []budget.Shift // shifts shared with other points (same continuum, zero level), Å
	Limit  bool           // someone else's upper limit: W is the limit at Sigma
	Sigma  float64        // of the limit
}

// A Result is N and b of one species (or of several levels that share one b).
type Result struct {
	Species  string          `json:"species"`
	Levels   []string        `json:"levels"` // column by column
	LogN     []budget.Number `json:"log_n"`
	B        budget.Number   `json:"b"`
	Chi2     float64         `json:"chi2"`
	DOF      int             `json:"dof"`
	Stop     string          `json:"stop"`
	Contours []Contour       `json:"contours,omitempty"` // of the first column
	Lines    []LineResult    `json:"lines"`
	Notes    []string        `json:"notes,omitempty"`
}

// A Contour is a curve of equal Δχ² in the plane of log N and b.
type Contour struct {
	Delta   float64   `json:"delta"` // 2.30 (68.27 %, two parameters), 6.17 (95.45 %)
	LogN, B []float64 `json:",omitempty"`
	Open    string    `json:"open,omitempty"` // where it does not close: "b", "log N"
}

// A LineResult is one point against the fitted curve.
type LineResult struct {
	Line       string  `json:"line"`
	Column     int     `json:"column"` // of Result.LogN
	Wave       float64 `json:"wave"`   // Å, vacuum
	F          float64 `json:"f"`      // oscillator strength
	W, Err     float64 // Å
	Limit      bool    `json:"limit,omitempty"`
	Model      float64 `json:"model"`      // Å
	Correction float64 `json:"correction"` // dex, log N − log N of the weak-line relation
	Tau0       float64 `json:"tau0"`
	LogNLinear float64 `json:"log_n_linear"`
}
