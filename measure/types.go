// Package measure turns a piece of spectrum around one line into an equivalent
// width, an apparent-optical-depth column or a limit, with errors split by cause.
package measure

import (
	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/spectrum"
	"lacuna/spectrum/continuum"
)

// A Piece is one line's neighbourhood in one segment: wavelengths in vacuum Å,
// ascending, in the velocity frame of the results.
type Piece struct {
	File            string // of the spectrum, and its order: name what lines share
	Order           int
	ContinuumKey    string // names the continuum among all of the sightline; "": made from file, order and its range
	Line            atomic.Line
	Wave, Flux, Err []float64 // Err as tabulated; the errors used are Continuum.Sigma
	Mask            []spectrum.Reason
	Continuum       continuum.Model
	Window          [2]float64 // km/s, integration range
	AutoWindow      bool       // Window is the range to search; the used one is found
	FWHM            float64    // of the instrument, km/s; 0 unknown
	B               float64    // km/s, assumed where nothing is detected; 0: 1 for molecules, 2 for atoms
	Detection       float64    // σ from which a line counts as detected; 0: 3
	LimitWidth      float64    // km/s over which a limit is taken; 0: twice the observed FWHM
	LimitSigma      float64    // of a limit; 0: 3
	Zero            Zero       // zero level of the order
	Fill            []float64  // expected F/C of each pixel from a fitted profile, or nil
	Neighbours      []Feature  // everything known that could fall into the window
}

// Zero is where zero flux lies, as a fraction of the continuum.
type Zero struct {
	Level, Err float64
	Pixels     int    // black pixels it was measured on; 0: a prior
	By         string // "black cores", "prior", "user"
}

// A Feature is something else that absorbs: another transition, a diffuse band,
// a telluric or a stellar line.
type Feature struct {
	Kind       string // transition, band, telluric, stellar
	Name       string
	Wave       float64    // vacuum Å in the frame of the piece (telluric lines already moved)
	Range      [2]float64 // km/s of gas (or half-widths) about Wave in which it may absorb
	W          float64    // expected equivalent width, Å; 0 unknown
	Negligible bool       `json:",omitempty"` // listed, but too weak or too wide to matter
	Note       string
}

// A Width is what one line in one segment gives.
type Width struct {
	Line       string        `json:"line"`
	Species    string        `json:"species"`
	Level      string        `json:"level,omitempty"`
	Wave       float64       `json:"wave"`     // vacuum Å
	WaveAir    float64       `json:"wave_air"` // 0 below 2000 Å
	F          float64       `json:"f"`
	FDefault   float64       `json:"f_default,omitempty"` // of the default set, where another one was chosen and differs
	Order      int           `json:"order"`
	File       string        `json:"file"`
	Window     [2]float64    `json:"window"` // km/s, used
	AutoWindow bool          `json:"auto_window,omitempty"`
	W          budget.Number `json:"w"` // Å; always W ± σ, also where not detected
	Detected   bool          `json:"detected"`
	Limit      float64       `json:"limit"` // Å, upper limit where not detected, else 0
	LimitSigma float64       `json:"limit_sigma"`
	LimitWidth float64       `json:"limit_width"`      // km/s
	LimitB     float64       `json:"limit_b"`          // km/s
	Inside     *Stretch      `json:"inside,omitempty"` // where the window drowns a line: what raised the limit
	SigmaVE06  float64       `json:"sigma_ve06"`       // Å, Vollmann & Eversberg 2006, for comparison only
	V          budget.Number `json:"v"`                // km/s, mean velocity weighted by 1−F/C
	Depth      float64       `json:"depth"`            // deepest 1−F/C
	SNPixel    float64       `json:"sn_pixel"`
	SNElement  float64       `json:"sn_element"` // per resolution element; 0 when FWHM is unknown
	FillPart   float64       `json:"fill_part"`  // part of W that was filled
	Zero       Zero          `json:"zero"`

	NoiseRatio  float64      `json:"noise_ratio"`
	NoiseRho    []float64    `json:"noise_rho"`
	NoisePixels int          `json:"noise_pixels"`
	NoiseBy     string       `json:"noise_by"` // "error array, audited" or "scatter of the residuals"
	Degree      int          `json:"degree"`
	ContinuumBy string       `json:"continuum_by"`
	Windows     [][2]float64 `json:"continuum_windows"` // km/s

	Linear    budget.Number `json:"linear"`    // N cm⁻², weak-line relation
	AOD       budget.Number `json:"aod"`       // N_a cm⁻²
	AODV      budget.Number `json:"aod_v"`     // km/s, first moment
	AODB      budget.Number `json:"aod_b"`     // km/s, √2 × second moment
	AODBias   float64       `json:"aod_bias"`  // expected relative bias by noise, not corrected
	Saturated string        `json:"saturated"` // why the line counts as saturated, or ""
	TauPeak   float64       `json:"tau_peak"`  // largest apparent optical depth
	Blends    []Feature     `json:"blends,omitempty"`
	Flag      budget.Flag   `json:"flag"`
	Notes     []string      `json:"notes,omitempty"`

	Spread     float64     `json:"spread"`               // Å, half-spread of W over the continuum placements
	SpreadErr  float64     `json:"spread_err"`           // Å, 1σ of that half-spread by pixel noise alone
	Placements []Placement `json:"placements,omitempty"` // W with each of them
	B          float64     `json:"b"`                    // km/s, assumed where the data do not tell
	Gamma      float64     `json:"gamma,omitempty"`      // s⁻¹, of the line
	Split      float64     `json:"split,omitempty"`      // km/s, rms of its hyperfine and isotope structure
	Hidden     float64     `json:"hidden,omitempty"`     // dex that one cloud of Tau0 would hide from the apparent optical depth
	Tau0       float64     `json:"tau0"`                 // central optical depth that the weak-line column was judged by
	Correction float64     `json:"correction"`           // dex, applied to the weak-line column
	Floored    int         `json:"floored,omitempty"`    // points of the apparent optical depth below 2σ of zero flux
	Bin        int         `json:"bin"`                  // pixels averaged before the logarithm of the apparent optical depth

	Profile Profile `json:"profile"` // for figures
}

// A Stretch is a part of a window, as wide as a limit, with a width of its own.
type Stretch struct {
	Window   [2]float64 `json:"window"` // km/s
	W        float64    `json:"w"`      // Å
	Err      float64    `json:"err"`    // Å, 1σ, all causes
	Detected bool       `json:"detected,omitempty"`
}

// A Placement is the width with another continuum.
type Placement struct {
	What string  `json:"what"`
	W    float64 `json:"w"` // Å
}

// A Profile is what a figure of the line needs; velocities in km/s.
type Profile struct {
	V, Flux, Err []float64 // flux over the continuum, zero level as observed
	Na           []float64 // cm⁻² per km/s, inside the window; 0 outside
	Placement    []float64 // half-width of the continuum band, relative
	Used         []bool    // continuum pixels
	Bad          []bool
}

// A Doublet compares the apparent columns of two lines of one species whose fλ differ.
type Doublet struct {
	Species      string        `json:"species"`
	Strong, Weak string        `json:"-"`
	Delta        budget.Number `json:"delta"`     // log N_a(weak) − log N_a(strong)
	Corrected    budget.Number `json:"corrected"` // log N; NaN when refused
	Refused      string        `json:"refused,omitempty"`
	Saturated    bool          `json:"saturated"` // δ > 0.05 + 2σ: the instrument hides saturation
}
