package budget

// A Cause names one source of error.
type Cause uint8

// The causes, in the order in which tables print them.
const (
	Photon       Cause = iota + 1 // pixel noise, as measured on the spectrum
	Continuum                     // coefficients of the fitted continuum
	Placement                     // continuum placement: degree ±1, windows ±20 %
	ZeroLevel                     // where zero flux lies
	Fill                          // masked pixels filled from the profile
	Profile                       // instrument profile, Doppler parameter assumed
	Structure                     // number of clouds, unresolved saturation
	Telluric                      // residual of the correction for the air's lines
	FValue                        // oscillator strength
	Disagreement                  // methods that differ by more than their errors
	Excitation                    // population of unseen levels
	Ionization                    // unseen stages
	Hydrogen                      // hydrogen column
	Solar                         // reference abundance
	VelocityZero                  // zero point of the velocity scale
)

// A Shift is what +1σ of one unknown does to a number.
type Shift struct {
	Cause Cause   `json:"cause"`
	Key   string  `json:"key,omitempty"` // "f:Ca II 3933.66", "NH:Lantern 1", "continuum:<window>"; "" is private
	D     float64 `json:"d"`             // signed, in the number's unit
}

// A Ref points at something a number rests on.
type Ref struct {
	Kind string `json:"kind"` // spectrum, order, window, line, solar, literature, user
	Key  string `json:"key"`
	Note string `json:"note,omitempty"`
}

// A Flag is a bit set of what a reader must know about a number.
type Flag uint32

// The flags.
const (
	Upper       Flag = 1 << iota // upper limit
	Lower                        // lower limit
	Saturated                    // the line is, or may be, saturated
	Blended                      // other features fall into the window
	InTelluric                   // telluric lines fall into the window and are not corrected
	InStellar                    // inside a stellar line
	Trace                        // trace ion: needs an ionization correction
	Marginal                     // between 2σ and the detection threshold
	AtBound                      // a fit stopped at a bound
	Filled                       // masked pixels were filled
	NoStructure                  // known hyperfine or isotope structure is not in the table
	Interval                     // only an interval is known: X−Lo .. X+Up
	Overridden                   // chosen by the user, with a reason
)

// A Number is a value with its history: its errors by cause, its flags, and
// the rows it rests on.
type Number struct {
	X      float64 // the value, or the limit
	Shifts []Shift
	Up, Lo float64 // total 1σ errors where not symmetric (both > 0), else 0
	Flag   Flag
	Conf   float64 // of a limit, in σ
	From   []Ref
	Behind *Number // of our own upper limit: the value ± σ behind it, linear, may be negative; nil otherwise
}
