// Package spectrum is one observed spectrum: its segments, and the readers of
// every file layout.
package spectrum

import "lacuna/spectrum/frame"

// A Reason is a bit set of why a pixel is not used.
type Reason uint16

// The reasons.
const (
	BadFile     Reason = 1 << iota // the file's quality flags
	BadError                       // error missing, negative or infinite
	BadFlux                        // flux or wavelength not finite
	BadCosmic                      // cosmic ray
	BadUser                        // masked by the user
	BadTelluric                    // inside a telluric line
	ZeroCount                      // error 0 with good quality: kept, not bad (see Bad)
)

// Bad reports whether a pixel is unusable.
func (r Reason) Bad() bool { return r&^ZeroCount != 0 }

// A Spectrum is one file: its segments are never merged or sorted.
type Spectrum struct {
	Object   string
	Layout   string // "ESO row vector", "linear image", …
	Segments []Segment
	Header   map[string]string // cards worth keeping, by keyword
	Coord    *Coord            // direction of the star, nil unknown
	Notes    []string          // warnings of the reader, for people
}

// Coord is a direction on the sky in degrees, ICRS (FK5 J2000 is taken for it).
type Coord struct{ RA, Dec float64 }

// A Segment is one order, stripe or detector of one exposure, wavelengths
// ascending and without gaps between pixels. After reading, Wave is in the file's medium and frame (converted to
// Å); ToVacuum and ToFrame convert it.
type Segment struct {
	Order           int       // order or aperture number; index+1 where the file has none
	Label           string    // "order 87", "FUVA"
	Wave, Flux, Err []float64 // Err is nil when the file has none
	ErrLow          []float64 // 1σ towards smaller flux where the file has two errors (Err is then the upper one), else nil
	Continuum       []float64 // the file's own continuum column, or nil
	Mask            []Reason
	Medium          frame.Medium
	MediumBy        string // how it was decided
	Frame           frame.Kind
	FrameBy         string
	Shift           []frame.Applied
	Unit            string  // of the flux, as the file says
	UnitGuessed     bool    // the wavelengths came without a unit, and their size gave it: enough to look at, not to measure
	Resolution      float64 // λ/FWHM from the header, 0 unknown
	Coord           *Coord  // direction of the star, nil unknown
	Normalised      bool    // the file says that its continuum is 1
	Source          Source
	Notes           []string
}

// Source says where a segment was read.
type Source struct {
	File   string
	SHA256 string
	HDU    int
	Row    int // 1-based row of a table or line of an image
}
