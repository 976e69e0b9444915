package lsf

import (
	"fmt"
	"math"

	"lacuna/atomic"
	"lacuna/internal/oops"
)

// A Profile is a line spread function, one for every wavelength.
type Profile interface {
	// Below returns the fraction of the light of wavelength wave (Å) that is
	// recorded below wave + x (x in Å): 0 far to the left, 1 far to the right.
	Below(wave, x float64) float64
	// Reach returns the distance (Å) on either side of wave beyond which nothing
	// that counts is recorded.
	Reach(wave float64) float64
	// Sigma returns the width (Å, as the σ of a Gaussian) of the narrowest
	// feature of the profile, which sets the step of the sub-grid.
	Sigma(wave float64) float64
	// Check reports why the profile cannot serve between the wavelengths lo and hi.
	Check(lo, hi float64) error
}

// FWHM = fwhmBySigma σ for a Gaussian: 2 √(2 ln 2).
const fwhmBySigma = 2.3548200450309493820231386529194

// Where Gaussian tails are cut: 1.3e-12 of the light lies beyond either side.
const cutSigma = 7

// Constant returns a width that is fwhm (Å) at every wavelength.
func Constant(fwhm float64) func(wave float64) float64 {
	return func(float64) float64 { return fwhm }
}

// Resolution returns the width λ/r of constant resolution r.
func Resolution(r float64) func(wave float64) float64 {
	return func(wave float64) float64 { return wave / r }
}

// Velocity returns the width λ·fwhm/c of a fixed fwhm in km/s.
func Velocity(fwhm float64) func(wave float64) float64 {
	return func(wave float64) float64 { return wave * fwhm / atomic.C }
}

// A Component is one Gaussian of a Sum.
type Component struct {
	Weight float64                    // fraction of the light
	FWHM   func(wave float64) float64 // Å
	Shift  float64                    // of its centre, km/s, + redward
}

// A Sum is a line spread function made of Gaussians, such as a core and wings.
// The weights are positive and add up to 1.
type Sum []Component

// Below is the sum of the error integrals.
func (s Sum) Below(wave, x float64) float64 {
	y := 0.0
	table := nodes()
	for i := range s {
		c := &s[i]
		sigma := c.FWHM(wave) / fwhmBySigma
		y += c.Weight * normal(table, (x-c.Shift*wave/atomic.C)/sigma)
	}
	return y
}

// Reach is 7 σ of the widest component from its own centre.
func (s Sum) Reach(wave float64) float64 {
	r := 0.0
	for _, c := range s {
		r = max(r, cutSigma*c.FWHM(wave)/fwhmBySigma+math.Abs(c.Shift)*wave/atomic.C)
	}
	return r
}

// Sigma is that of the narrowest component.
func (s Sum) Sigma(wave float64) float64 {
	r := math.Inf(1)
	for _, c := range s {
		r = min(r, c.FWHM(wave)/fwhmBySigma)
	}
	return r
}

// Check wants positive weights that add up to 1 within 1e-6, and positive widths.
func (s Sum) Check(lo, hi float64) error {
	if len(s) == 0 {
		return oops.Input("", "line spread function", "it has no component", "give at least one Gaussian")
	}
	total := 0.0
	for i, c := range s {
		where := fmt.Sprintf("line spread function, component %d", i+1)
		if !(c.Weight > 0 && c.Weight <= 1) {
			return oops.Inputf("", where, "give the fraction of the light, above 0 and at most 1", "weight %g", c.Weight)
		}
		if math.IsNaN(c.Shift) || math.Abs(c.Shift) > 1e3 {
			return oops.Inputf("", where, "give km/s from the line's place", "shift %g km/s", c.Shift)
		}
		for _, w := range [...]float64{lo, hi} {
			if f := c.FWHM(w); !(f > 0 && f < w) {
				return oops.Inputf("", where, "give a width above 0 Å", "FWHM %g Å at %.3f Å", f, w)
			}
		}
		total += c.Weight
	}
	if !(math.Abs(total-1) <= 1e-6) {
		return oops.Inputf("", "line spread function", "divide them by their sum", "the weights add up to %g, not 1", total)
	}
	return nil
}
