package simulate

import (
	"math"

	"lacuna/atomic"
)

// A Cloud is one interstellar cloud with the column of each species in it.
type Cloud struct {
	V    float64 // km/s, heliocentric
	B    float64 // km/s
	Cols []Col
}

// A Col is the column density of one species, with its level where it has
// several ("CN N=1", "C I*").
type Col struct {
	Species string
	LogN    float64 // cm⁻²
}

// A StellarLine is a line of the star, rotationally broadened.
type StellarLine struct {
	Wave  float64 // vacuum Å at rest
	Depth float64 // of the unbroadened line, as an equivalent width in Å
	VSini float64 // km/s
}

// A TelluricLine is a line of the Earth's atmosphere, Gaussian in optical depth.
type TelluricLine struct {
	Wave float64 // vacuum Å, observer's frame
	Tau  float64 // central optical depth
	FWHM float64 // km/s
}

// A Star is everything between the source and the telescope.
type Star struct {
	Name     string
	RV       float64 // km/s, heliocentric
	Clouds   []Cloud
	Lines    []StellarLine
	Slope    float64 // of the continuum: relative change per 1000 Å
	Telluric []TelluricLine
}

// Columns returns the total column of each species over all clouds, in the
// order in which they first appear.
func (s Star) Columns() []Col {
	var out []Col
	for _, c := range s.Clouds {
	next:
		for _, col := range c.Cols {
			for i := range out {
				if out[i].Species == col.Species {
					out[i].LogN = math.Log10(math.Pow(10, out[i].LogN) + math.Pow(10, col.LogN))
					continue next
				}
			}
			out = append(out, col)
		}
	}
	return out
}

// stellar multiplies t by the star's own lines; wave is heliocentric vacuum Å.
// The profile is the rotation profile with linear limb darkening ε = 0.6
// (Gray 2005, The Observation and Analysis of Stellar Photospheres, ch. 18;
// formula from memory, its unit area is tested).
func (s Star) stellar(t, wave []float64) {
	for _, l := range s.Lines {
		centre := l.Wave * (1 + s.RV/atomic.C)
		half := centre * l.VSini / atomic.C
		for i, w := range wave {
			t[i] *= 1 - l.Depth*rotation((w-centre)/half)/half
		}
	}
}

// rotation is the rotation profile of unit area on −1..1.
func rotation(x float64) float64 {
	const eps = 0.6
	y := 1 - x*x
	if y <= 0 {
		return 0
	}
	return (2*(1-eps)*math.Sqrt(y) + 0.5*math.Pi*eps*y) / (math.Pi * (1 - eps/3))
}

// air multiplies t by the air's transmission; wave is observer's vacuum Å.
func (s Star) air(t, wave []float64) {
	for _, l := range s.Telluric {
		sigma := l.Wave * l.FWHM / atomic.C / (2 * math.Sqrt(2*math.Ln2))
		for i, w := range wave {
			if x := (w - l.Wave) / sigma; math.Abs(x) < 9 {
				t[i] *= math.Exp(-l.Tau * math.Exp(-x*x/2))
			}
		}
	}
}
