// Package frame holds velocity frames, and air and vacuum wavelengths.
package frame

// A Kind is a velocity frame, in the words of FITS (SPECSYS).
type Kind string

// The frames.
const (
	Unknown     Kind = ""
	Topocentric Kind = "TOPOCENT"
	Geocentric  Kind = "GEOCENTR"
	Heliocent   Kind = "HELIOCEN"
	Barycentric Kind = "BARYCENT"
	LSRK        Kind = "LSRK"
	LSRD        Kind = "LSRD"
	Source      Kind = "SOURCE"
)

// A Medium is what wavelengths are measured in.
type Medium string

// The media.
const (
	UnknownMedium Medium = ""
	Air           Medium = "air"
	Vacuum        Medium = "vacuum"
)

// Applied is one velocity correction found with a spectrum.
type Applied struct {
	Keyword string  // where it was found ("ESO QC VRAD HELICOR", "user")
	To      Kind    // the frame it leads to
	V       float64 // km/s, to add: λ_new = λ (1+V/c)
	Done    bool    // already in the wavelengths
	By      string  // who says so
}
