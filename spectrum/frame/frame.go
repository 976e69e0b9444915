// Package frame holds velocity frames, and air and vacuum wavelengths.
//
//   - ToVacuum and ToAir: standard air; ToVacuumIn and ToAirIn: the air of a room.
//   - AddVelocity, SubVelocity: velocities combine as Doppler factors.
//   - Corrections: from topocentric to geocentric, heliocentric, barycentric and the
//     local standards of rest, for a time, a Site and a Target, without network.
//   - ReadExposure: time, site and target from the cards of a FITS header; Judge: what
//     a correction found there is; AppliedFromTelluric: whether it was applied.
//
// Units: wavelength Å; velocity km/s, v = cz, receding positive; angles degrees,
// longitudes east positive; heights m. A correction is the velocity of the observer
// towards the target: λ_new = λ (1 + v/c). Functions of numbers return NaN outside
// their domain, all others an error that says how to mend it.
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
	Keyword string  `json:"keyword"` // where it was found ("ESO QC VRAD HELICOR", "user")
	To      Kind    `json:"to"`      // the frame it leads to
	V       float64 `json:"v"`       // km/s, to add: λ_new = λ (1+V/c)
	Done    bool    `json:"done"`    // already in the wavelengths
	By      string  `json:"by"`      // who says so
}
