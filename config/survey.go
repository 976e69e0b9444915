package config

import "lacuna/spectrum/frame"

// A Survey is a survey file with everything resolved: each Sightline holds all
// it needs, [defaults] and the catalogue are already in it.
type Survey struct {
	File            string     `json:"-"` // the TOML file
	Dir             string     `json:"-"` // its folder: where relative paths start
	Name            string     `json:"name" toml:"name"`
	Frame           frame.Kind `json:"frame" toml:"frame"`
	Scale           string     `json:"scale" toml:"scale"` // "" when no sightline has hydrogen
	FSet            string     `json:"f_set" toml:"f_set"`
	LineTable       string     `json:"line_table,omitempty" toml:"line_table"`
	Catalogue       string     `json:"catalogue,omitempty" toml:"catalogue"`
	CatalogueIgnore []string   `json:"-" toml:"catalogue_ignore"`
	AirFormula      string     `json:"air_formula" toml:"air_formula"`
	Seed            int        `json:"seed" toml:"seed"`
	Sightlines      []Sightline
	Notes           []string `json:"-"` // what the reader of results must know of the loading

	by origins
}

// A Sightline is one star with its spectra and what to do with them.
type Sightline struct {
	Name         string     `json:"name" toml:"name"`
	Override     bool       `json:"-" toml:"override"`
	Note         string     `json:"note,omitempty" toml:"note"`
	SpectralType string     `json:"spectral_type,omitempty" toml:"spectral_type"`
	VMag         *float64   `json:"V_mag,omitempty" toml:"V_mag"`
	RA           *float64   `json:"ra,omitempty" toml:"ra"` // degrees, ICRS
	Dec          *float64   `json:"dec,omitempty" toml:"dec"`
	EBV          *Quantity  `json:"E_BV,omitempty" toml:"E_BV"`
	Velocity     [2]float64 `json:"velocity" toml:"velocity"` // km/s; {0, 0} where not given
	AutoWindow   bool       `json:"auto_window" toml:"auto_window"`
	Detection    float64    `json:"detection" toml:"detection"`     // σ
	LimitSigma   float64    `json:"limit_sigma" toml:"limit_sigma"` // σ
	LimitWidth   float64    `json:"limit_width" toml:"limit_width"` // km/s; 0: twice the observed FWHM
	BAtom        float64    `json:"b_atom" toml:"b_atom"`           // km/s
	BMolecule    float64    `json:"b_molecule" toml:"b_molecule"`   // km/s
	BRange       [2]float64 `json:"b_range" toml:"b_range"`         // km/s, of growth curves
	ZeroLevel    ZeroLevel  `json:"zero_level" toml:"zero_level"`
	MaxDegree    int        `json:"max_degree" toml:"max_degree"`
	Spectra      []Spectrum `json:"spectra"`
	Lines        []Line     `json:"lines"` // only those to use
	Fits         []Fit      `json:"fits,omitempty"`
	Hydrogen     *Hydrogen  `json:"hydrogen,omitempty"`
	Columns      []Column   `json:"columns,omitempty"`
	Adopt        []Adopt    `json:"adopt,omitempty"`
	Skipped      []string   `json:"-"` // lines left out by use = false

	Named   []string `json:"-" toml:"lines"` // empty after loading
	linesAt string
	raw     []rawLine
	rawFits []rawLine
	by      origins
}

// A ZeroLevel is where zero flux lies, over the continuum, before it is measured.
type ZeroLevel struct {
	Level float64 `json:"level" toml:"level"`
	Err   float64 `json:"err" toml:"err"`
}

// A Quantity is a number with its error and source.
type Quantity struct {
	Value  float64 `json:"value" toml:"value"`
	Err    float64 `json:"err" toml:"err"` // 0 unknown
	Source string  `json:"source,omitempty" toml:"source"`
}

// A Spectrum is one file and what the user knows of it. "" and nil leave the
// word to the file.
type Spectrum struct {
	File            string       `json:"file" toml:"file"`
	Medium          frame.Medium `json:"medium,omitempty" toml:"medium"`
	Frame           frame.Kind   `json:"frame,omitempty" toml:"frame"`
	Correction      *float64     `json:"correction,omitempty" toml:"correction"`         // km/s to add to reach the survey's frame
	R               float64      `json:"resolving_power" toml:"resolving_power"`         // λ/FWHM; 0: the header's
	RErr            float64      `json:"resolving_power_err" toml:"resolving_power_err"` // relative
	LineSpread      string       `json:"line_spread,omitempty" toml:"line_spread"`       // file; "": a Gaussian of R
	Normalised      *bool        `json:"normalised,omitempty" toml:"normalised"`
	ContinuumErr    float64      `json:"continuum_err" toml:"continuum_err"` // relative; 0 not given
	ContinuumColumn string       `json:"continuum_column,omitempty" toml:"continuum_column"`
	ContinuumFile   string       `json:"continuum_file,omitempty" toml:"continuum_file"`
	ZeroLevel       *ZeroLevel   `json:"zero_level,omitempty" toml:"zero_level"` // nil: the sightline's
	HDU             *int         `json:"hdu,omitempty" toml:"hdu"`               // 0 is the primary one
	Row             int          `json:"row,omitempty" toml:"row"`               // from 1; 0: all
	Orders          []int        `json:"orders,omitempty" toml:"orders"`         // nil: all
	Columns         Names        `json:"columns" toml:"columns"`
	Unit            string       `json:"unit,omitempty" toml:"unit"`
	Layout          string       `json:"layout,omitempty" toml:"layout"`
	Mask            [][2]float64 `json:"mask,omitempty" toml:"mask"` // Å, the file's medium and frame
	Note            string       `json:"note,omitempty" toml:"note"`

	by origins
}

// Names are the columns to read, by name or number from 1; "" is found.
type Names struct {
	Wave string `json:"wave,omitempty" toml:"wave"`
	Flux string `json:"flux,omitempty" toml:"flux"`
	Err  string `json:"err,omitempty" toml:"err"`
}

// A Line is one transition to measure.
type Line struct {
	Name       string       `json:"name" toml:"name"` // canonical name of the line table
	Use        bool         `json:"-" toml:"use"`
	Required   bool         `json:"required" toml:"required"` // an error where no spectrum holds it
	Window     [2]float64   `json:"window" toml:"window"`     // km/s
	AutoWindow bool         `json:"auto_window" toml:"auto_window"`
	Continuum  [][2]float64 `json:"continuum,omitempty" toml:"continuum"` // km/s; nil: automatic
	Degree     int          `json:"degree" toml:"degree"`                 // −1: automatic
	Order      *int         `json:"order,omitempty" toml:"order"`         // nil: every order that holds it
	File       string       `json:"file,omitempty" toml:"file"`           // "": every spectrum
	B          float64      `json:"b" toml:"b"`                           // km/s, for limits
	LimitWidth float64      `json:"limit_width" toml:"limit_width"`       // km/s; 0: twice the observed FWHM
	Note       string       `json:"note,omitempty" toml:"note"`

	by origins
}

// Inherited reports whether the line is wanted only where a spectrum holds it, as
// lines from [defaults] are.
func (l Line) Inherited() bool { return !l.Required }

// Hydrogen is what is known of hydrogen: log₁₀ cm⁻², errors in dex, nil unknown.
// A column has either a value with its error or a maximum.
type Hydrogen struct {
	HI     *float64 `json:"logN_HI,omitempty" toml:"logN_HI"`
	HIErr  *float64 `json:"logN_HI_err,omitempty" toml:"logN_HI_err"`
	HIMax  *float64 `json:"logN_HI_max,omitempty" toml:"logN_HI_max"`
	H2     *float64 `json:"logN_H2,omitempty" toml:"logN_H2"`
	H2Err  *float64 `json:"logN_H2_err,omitempty" toml:"logN_H2_err"`
	H2Max  *float64 `json:"logN_H2_max,omitempty" toml:"logN_H2_max"`
	H      *float64 `json:"logN_H,omitempty" toml:"logN_H"` // total
	HErr   *float64 `json:"logN_H_err,omitempty" toml:"logN_H_err"`
	HMax   *float64 `json:"logN_H_max,omitempty" toml:"logN_H_max"`
	Source string   `json:"source" toml:"source"`

	by origins
}

// A Column is a column density from elsewhere.
type Column struct {
	Species string  `json:"species" toml:"species"`
	LogN    float64 `json:"logN" toml:"logN"`
	LogNErr float64 `json:"logN_err" toml:"logN_err"` // dex; 0 for limits
	Kind    string  `json:"kind" toml:"kind"`         // value, upper, lower
	Sigma   float64 `json:"sigma" toml:"sigma"`       // of an upper limit
	Source  string  `json:"source" toml:"source"`

	by origins
}

// Adopt is the user's choice of a column: of a method, or of a number.
type Adopt struct {
	Species string   `json:"species" toml:"species"`
	Method  string   `json:"method,omitempty" toml:"method"` // "" when LogN is given
	LogN    *float64 `json:"logN,omitempty" toml:"logN"`
	LogNErr float64  `json:"logN_err,omitempty" toml:"logN_err"`
	Kind    string   `json:"kind,omitempty" toml:"kind"` // value, upper, lower; "" with a method
	Reason  string   `json:"reason" toml:"reason"`

	by origins
}

// origins says for each key that is set by whom: "" the user, else "default",
// "defaults", "catalogue" or the key that it was taken from.
type origins map[string]string
