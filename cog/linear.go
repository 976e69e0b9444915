package cog

import (
	"errors"
	"fmt"
	"math"

	"lacuna/atomic"
	"lacuna/voigt"
)

// SaturatedAbove is the correction (dex) from which a line counts as saturated
// (common practice, no source).
const SaturatedAbove = 0.10

// Linear returns the column density (cm⁻²) of the weak-line relation,
//
//	N = W / (π rₑ f λ²),
//
// for an equivalent width w (Å). It holds to 1 % while τ₀ < 0.03 and is too low
// by any amount beyond: Correction says by how much. Negative widths give
// negative columns.
func Linear(w float64, l atomic.Line) float64 {
	return voigt.ColumnPerWidth * w / (l.F * l.Wave * l.Wave)
}

// Invert returns log₁₀N (cm⁻²) of the cloud with Doppler parameter b (km/s) that
// gives line l the equivalent width w (Å). W grows with N everywhere, so there is
// one answer, found to 1e-12 in W.
//
// Errors: w not above 0 (a width that is not detected has no logarithm), b not
// above 0, a line without wavelength or f, and a width that no column below
// 10²⁶ cm⁻² gives, as for b far too small and a line without damping.
func Invert(l atomic.Line, w, b float64) (logN float64, err error) {
	if !(w > 0) || math.IsInf(w, 0) {
		return math.NaN(), fmt.Errorf("curve of growth of %s: no column gives the width %g Å; it must be above 0", l.Name, w)
	}
	if err := checkLine(&l); err != nil {
		return math.NaN(), err
	}
	if !(b > 0) || math.IsInf(b, 0) {
		return math.NaN(), fmt.Errorf("curve of growth of %s: b = %g km/s is not a Doppler parameter; it must be above 0", l.Name, b)
	}
	lo := math.Log10(Linear(w, l)) // W ≤ W of the weak-line relation
	hi := math.Max(mostN, lo+1)
	x, target := lo, math.Log(w)
	for range 200 {
		got, slope, _ := WidthGrad(l, x, b)
		d := math.Log(got) - target
		if math.Abs(d) <= 1e-12 {
			return x, nil
		}
		if d < 0 {
			lo = x
		} else {
			hi = x
		}
		// ln W against log N is concave up to the damping wings: Newton's step from
		// below falls short there, and overshoots only at the foot of the wings.
		next := x - d*got/slope
		if !(next > lo && next < hi) {
			next = lo + (hi-lo)/2
		}
		if next == x {
			return x, nil
		}
		x = next
		if lo >= mostN-1e-6 {
			return math.NaN(), fmt.Errorf("curve of growth of %s: %g Å at b = %g km/s needs more than 10^%d cm⁻²", l.Name, w, b, mostN)
		}
	}
	return x, nil
}

const mostN = 26 // log₁₀ of the largest column that is looked for

// Correction returns log₁₀N − log₁₀N(weak-line relation) in dex for a width w (Å)
// of line l at Doppler parameter b (km/s): what saturation hides. It is never
// negative. Above SaturatedAbove the weak-line column is no value any more.
// Errors as Invert.
func Correction(l atomic.Line, w, b float64) (float64, error) {
	x, err := Invert(l, w, b)
	if err != nil {
		return math.NaN(), err
	}
	return math.Max(x-math.Log10(Linear(w, l)), 0), nil
}

func checkLine(l *atomic.Line) error {
	switch {
	case !(l.Wave > 0) || math.IsInf(l.Wave, 0):
		return fmt.Errorf("curve of growth of %q: wavelength %g Å", l.Name, l.Wave)
	case !(l.F > 0) || math.IsInf(l.F, 0):
		return fmt.Errorf("curve of growth of %s: oscillator strength %g; without one there is no column", l.Name, l.F)
	case !(l.Gamma >= 0) || math.IsInf(l.Gamma, 0):
		return fmt.Errorf("curve of growth of %s: damping %g s⁻¹", l.Name, l.Gamma)
	}
	var total float64
	for _, p := range l.Parts {
		if !(p.Strength >= 0) || math.IsNaN(p.DV) || math.IsInf(p.DV, 0) {
			return errors.New("curve of growth of " + l.Name + ": its structure has a negative strength or no shift")
		}
		total += p.Strength
	}
	if len(l.Parts) > 0 && !(math.Abs(total-1) < 1e-3) {
		return fmt.Errorf("curve of growth of %s: the strengths of its structure add up to %g, not 1", l.Name, total)
	}
	return nil
}

// Curve returns the theoretical curve of growth of line l at Doppler parameter b
// (km/s) for a figure: log₁₀(W/λ) at each log₁₀(f N λ) of x, N in cm⁻² and λ in cm.
// The undamped part is common to all unsplit lines of that b; the damping part
// holds for lines with the γλ of l. NaN outside the domain of Width.
func Curve(l atomic.Line, b float64, x []float64) []float64 {
	y := make([]float64, len(x))
	for i, at := range x {
		y[i] = math.Log10(Width(l, at-logFL(&l), b) / l.Wave)
	}
	return y
}

// logFL is log₁₀(f λ), λ in cm.
func logFL(l *atomic.Line) float64 { return math.Log10(l.F * l.Wave * 1e-8) }
