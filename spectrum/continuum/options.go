package continuum

import (
	"fmt"
	"math"

	"lacuna/internal/oops"
	"lacuna/spectrum"
)

// Ceiling is the highest degree that a continuum may have.
const Ceiling = 5

// Options says where the continuum may be looked for and how stiff it is.
type Options struct {
	Windows   [][2]float64 // Å, line-free by the user's word; nil: found automatically
	Exclude   [][2]float64 // Å, never used
	Target    [2]float64   // Å, the line that the continuum is for: never used, and a slope needs pixels on both sides of it; zero: none
	Degree    int          // of the polynomial; −1: by the information criterion
	MaxDegree int          // of the automatic choice; 0: 3
	Low, High float64      // rejection below and above, in σ of one pixel; 0: 3.5 and 4, with windows 5 and 5
	Rescale   bool         // Given: fit a polynomial of Degree to flux over continuum
	Noise     *Noise       // known correlations (from Audit of a longer stretch), and ratio unless 0; nil: measured here
}

// check refuses what cannot be meant and fills in the defaults.
func (o *Options) check(wave []float64) error {
	bad := func(what, fix string) error { return oops.Input("", "", what, fix) }
	if o.Degree < -1 || o.Degree > Ceiling {
		return bad(fmt.Sprintf("continuum degree %d", o.Degree), fmt.Sprintf("give 0 to %d, or -1 for the automatic choice", Ceiling))
	}
	if o.MaxDegree < 0 || o.MaxDegree > Ceiling {
		return bad(fmt.Sprintf("largest continuum degree %d", o.MaxDegree), fmt.Sprintf("give 1 to %d", Ceiling))
	}
	if o.MaxDegree == 0 {
		o.MaxDegree = 3
	}
	if o.Low < 0 || o.High < 0 || math.IsNaN(o.Low) || math.IsNaN(o.High) {
		return bad(fmt.Sprintf("rejection at −%g and +%g σ", o.Low, o.High), "give positive numbers")
	}
	low, high := 3.5, 4.0
	if o.Windows != nil {
		low, high = 5, 5
	}
	if o.Low == 0 {
		o.Low = low
	}
	if o.High == 0 {
		o.High = high
	}
	first, last := wave[0], wave[len(wave)-1]
	for _, r := range o.Windows {
		if !(r[1] > r[0]) {
			return bad(fmt.Sprintf("continuum window %g to %g Å is empty", r[0], r[1]), "give the smaller number first")
		}
		if r[1] < first || r[0] > last {
			return bad(fmt.Sprintf("continuum window %.3f to %.3f Å lies outside the spectrum (%.3f to %.3f Å)", r[0], r[1], first, last), "move the window")
		}
	}
	for _, r := range append([][2]float64{o.Target}, o.Exclude...) {
		if !(r[1] >= r[0]) {
			return bad(fmt.Sprintf("excluded range %g to %g Å", r[0], r[1]), "give the smaller number first")
		}
	}
	return nil
}

func (o *Options) hasTarget() bool { return o.Target[1] > o.Target[0] }

// barred reports whether a pixel may never be continuum.
func (o *Options) barred(wave float64) bool {
	if o.hasTarget() && wave >= o.Target[0] && wave <= o.Target[1] {
		return true
	}
	return within(wave, o.Exclude)
}

func within(wave float64, ranges [][2]float64) bool {
	for _, r := range ranges {
		if wave >= r[0] && wave <= r[1] {
			return true
		}
	}
	return false
}

// checkPixels refuses slices that do not belong together.
func checkPixels(wave, flux, err []float64, mask []spectrum.Reason) error {
	n := len(wave)
	if len(flux) != n || err != nil && len(err) != n || mask != nil && len(mask) != n {
		panic("continuum: wave, flux, err and mask differ in length")
	}
	if n < 3 {
		return oops.Input("", "", fmt.Sprintf("only %d pixels to fit a continuum to", n), "take a wider range")
	}
	for i := 1; i < n; i++ {
		if !(wave[i] > wave[i-1]) {
			return oops.Input("", "", fmt.Sprintf("wavelengths do not ascend at pixel %d (%g, %g Å)", i+1, wave[i-1], wave[i]), "")
		}
	}
	return nil
}
