package clouds

import (
	"lacuna/atomic"
	"lacuna/voigt/lsf"
)

// A Problem is all that one fit knows: pieces of spectrum and the clouds that
// shall explain them. Slices are read, not changed or kept for writing.
type Problem struct {
	Windows []Window
	Clouds  []Cloud
	Shared  []Shared // parameters that several clouds use through a Tie, a Boltzmann or alone
}

// A Window is one contiguous piece of spectrum with the lines that may absorb in
// it. Flux and Err have any unit, the same for both.
type Window struct {
	Name  string        // for messages and results: "Na I 5889.95, order 71"
	Lines []atomic.Line // every transition of the model that may absorb here

	Wave  []float64 // pixel centres, vacuum Å, ascending, in the velocity frame of the results
	Edges []float64 // pixel borders, one more; nil: half-way between the centres
	Flux  []float64
	Err   []float64 // 1σ of each pixel, as audited
	Mask  []bool    // true: the pixel is left out; nil: none
	Rho   []float64 // correlation of the noise of pixels 1, 2, … apart; nil: independent

	// Narrow features that are not of the clouds, stellar × telluric transmission. They
	// fall on the instrument as the clouds' do, so they multiply before the line
	// spread function. nil: none.
	Factor *Curve

	Profile lsf.Profile // line spread function
	// Instrument names windows that share one line spread function, whose width is one
	// unknown factor for all of them. "": one for all windows without a name.
	Instrument string
	WidthErr   float64 // 1σ, relative, of that width; 0: DefaultWidthErr; < 0: known exactly

	// Exposure names windows that share one unknown zero point of the velocity
	// scale; used where VelocityErr (km/s, 1σ) is above 0.
	Exposure    string
	VelocityErr float64

	// Degree of the Legendre polynomial that is the continuum; NoContinuum: Flux is
	// already divided by an exact one.
	Degree int

	// Zero flux lies at Zero ± ZeroErr of the continuum (added light, positive). A
	// ZeroErr of 0 takes it as known, +Inf leaves it free.
	Zero, ZeroErr float64
}

const (
	// DefaultWidthErr is the relative 1σ error of the width of a line spread function
	// where none is stated: R as λ/FWHM is known to about 5 % (common practice, no
	// source).
	DefaultWidthErr = 0.05
	// NoContinuum is the Degree of a window without a continuum to fit.
	NoContinuum = -1
)

// A Curve is a function given at points, interpolated by a monotone cubic spline and
// constant beyond its ends.
type Curve struct {
	Wave, Value []float64 // Å, ascending; the transmission, above 0
}

// A Cloud is one velocity component: gas that shares a velocity.
type Cloud struct {
	Name string // "": cloud 1, cloud 2, … by its place
	V    Par    // km/s
	// B is the Doppler parameter (km/s) of all species without their own. With
	// Thermal, b² = 2kT/m + Turb² in its place, m the mass of the species.
	B       Par
	Thermal bool
	T, Turb Par // K, km/s
	Species []Species
}

// Species is the gas of one carrier (atomic.Line.Carrier: "Na I", "C I*", "CN
// N=1", "CH e") in a cloud.
type Species struct {
	Carrier string
	LogN    Par // log₁₀ of the column density (cm⁻²); with Linear the column density itself
	// Linear makes the column the parameter, which may then be negative: for species
	// that may be absent. Its Number is N ± σ, with the limit.
	Linear bool
	B, V   *Par // its own Doppler parameter and velocity (km/s); nil: those of the cloud
	// Boltzmann, if not nil, takes the place of LogN.
	Boltzmann *Boltzmann
}

// Boltzmann ties the column of one level to that of another of the same cloud,
//
//	N_u/N_l = (g_u/g_l) exp(−(E_u − E_l)/kT),
//
// with weights and energies (atomic.Line.GLow, ELow) from the lines.
type Boltzmann struct {
	Of string // the carrier of the other level
	T  string // the name of the Shared parameter that is the temperature, K
}

// Shared is a parameter that belongs to no single cloud, such as the temperature of
// an excitation, an isotope ratio (in dex), or the velocity offset of a species.
type Shared struct {
	Name string
	Kind Kind // sets the default bounds
	Par  Par
}

// A Kind is what a parameter measures.
type Kind uint8

// The kinds of parameters, with the bounds that hold where none are given.
const (
	Other        Kind = iota // none
	Velocity                 // km/s; 50 km/s about the start
	Doppler                  // km/s; 0.1 to 50
	LogColumn                // dex; 4 to 23
	Column                   // cm⁻²; none
	Temperature              // K; 2 to 1e5
	Turbulence               // km/s; 0 to 50
	WidthFactor              // ln of a width; ±0.3
	VelocityZero             // km/s; none
)

// A Par says what is known of a parameter beforehand. The zero value starts at 0,
// free within the bounds of its kind.
type Par struct {
	Start  float64
	Fixed  bool
	Lo, Hi float64 // bounds; both 0: those of its kind
	// A Gaussian prior, Mean ± Sigma; Sigma 0: none.
	Mean, Sigma float64
	Tie         *Tie // the parameter follows others; Start, Fixed, Lo and Hi are not used
}

// A Tie makes a parameter a linear function of others,
//
//	x = Add + Σ Factor × To,
//
// so that a ratio of columns is an Add in log N, and a ratio of Doppler parameters
// a Factor.
type Tie struct {
	Add   float64
	Terms []Term
}

// A Term names a parameter, and its factor. The names are
//
//	"v", "b", "T", "turbulence", "log N(Na I)", "N(Na I)", "b(Na I)", "v(Na I)"
//
// for those of the same cloud, the same after the cloud's name and a colon
// ("cloud 1: b") for those of another, and the bare name of a Shared.
type Term struct {
	To     string
	Factor float64
}

// Start returns a free parameter that starts at x.
func Start(x float64) Par { return Par{Start: x} }

// Fix returns a parameter that is known to be x.
func Fix(x float64) Par { return Par{Start: x, Fixed: true} }

// Follow returns a parameter that is add + factor × the parameter to.
func Follow(to string, factor, add float64) Par {
	return Par{Tie: &Tie{Add: add, Terms: []Term{{to, factor}}}}
}

// Within returns p with bounds.
func (p Par) Within(lo, hi float64) Par {
	p.Lo, p.Hi = lo, hi
	return p
}

// Prior returns p with a Gaussian prior.
func (p Par) Prior(mean, sigma float64) Par {
	p.Mean, p.Sigma = mean, sigma
	return p
}
