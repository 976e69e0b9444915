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

// A Level is one column density: the widths of the lines that start from one
// level of a species.
type Level struct {
	Name   string // carrier: "CN N=1", "C I*", "Fe II"
	Points []Point
}

// Options of a fit; 0 stands for the default.
type Options struct {
	Key        string  // goes into the keys of shifts that are private to this sightline: its name
	BMin, BMax float64 // km/s, bounds of b; 0.3 and 30
	// Where the widths do not constrain b, N is taken at B and its error spans BLow
	// to BHigh (km/s). Defaults: 1 for molecules, 2 for atoms; half and twice B. A
	// species whose default lies outside BMin .. BMax uses the nearer bound.
	B, BLow, BHigh float64
	Sigma          float64 // of limits, in σ; 3
	NoContours     bool    // for batches that draw none
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

	// The point that χ² prefers, also where LogN and B are limits: for drawing. A
	// level without a detection has its limit in BestLogN; BestB is the assumed b
	// where the widths do not constrain it.
	BestLogN []float64 `json:"best_log_n"`
	BestB    float64   `json:"best_b"`
	// Cov is the covariance of log₁₀N of each level and ln b, row by row, from the
	// errors of the widths alone (0 where a limit or a bound decides).
	Cov []float64 `json:"cov"`
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
	LogNLinear float64 `json:"log_n_linear"`   // of the measured width; NaN (left out of JSON) where W is not above 0
	LogWL      float64 `json:"log_w_lambda"`   // log₁₀(W/λ), measured; NaN as above
	LogFNL     float64 `json:"log_f_n_lambda"` // log₁₀(f N λ) at the best fit, λ in cm
}
