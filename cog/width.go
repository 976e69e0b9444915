package cog

import (
	"math"

	"lacuna/atomic"
	"lacuna/voigt"
)

// Width returns the equivalent width (Å) that one cloud of column density
// log₁₀N = logN (cm⁻², in the lower level of the line) and Doppler parameter b
// (km/s) gives to line l,
//
//	W = (λ/c) ∫ (1 − e^−τ(v)) dv,   τ(v) = τ₀ Σₖ sₖ H(a, (v − δₖ)/b),
//
// with τ₀ from voigt.Tau0, a from voigt.Damping, and the hyperfine and isotopic
// parts k of l (one, unshifted, where it has none). The profile is symmetric in
// velocity v = c(λ/λ₀ − 1); where W/λ exceeds 1e-3 an integral in wavelength with
// ν = c/λ differs at second order in W/λ.
//
// The quadrature is good to 1e-11 of W from the linear part to lines with wings
// beyond |u| = 1e7. It returns 0 for logN = −Inf and NaN unless b > 0 and the
// line's wavelength, f and γ are in range. No allocation.
//
// Source of the relation: Spitzer 1978, Physical Processes in the Interstellar
// Medium, ch. 3 (from memory).
func Width(l atomic.Line, logN, b float64) float64 {
	s := one(&l, logN, b, false)
	return l.Wave / atomic.C * s.w
}

// WidthGrad returns Width with its derivatives ∂W/∂log₁₀N (Å per dex) and ∂W/∂b
// (Å per km/s), both analytic:
//
//	∂W/∂ln N = (λ/c) ∫ τ e^−τ dv,   ∂W/∂b = (λ/c)(b/2) ∫ (dτ/dv)² e^−τ dv.
//
// Neither is ever negative. Good to 1e-9 of the larger of themselves and 1e-3 W
// (per dex, or times b).
func WidthGrad(l atomic.Line, logN, b float64) (w, dLogN, dB float64) {
	s := one(&l, logN, b, true)
	k := l.Wave / atomic.C
	return k * s.w, k * s.dlnN * math.Ln10, k * s.db
}

// WidthOf returns the equivalent width (Å) of line l in several clouds, whose
// optical depths add:
//
//	W = (λ/c) ∫ (1 − exp(−Σ τⱼ(v))) dv.
//
// It is at most the sum of the widths of the clouds alone, and independent of
// their order to rounding. Accuracy and domain as Width.
func WidthOf(l atomic.Line, clouds []voigt.Cloud) float64 {
	blobs := make([]blob, 0, len(clouds))
	for _, c := range clouds {
		blobs = append(blobs, newBlob(&l, c.V, c.LogN, c.B))
	}
	if len(blobs) == 0 || !computable(&l, blobs) {
		return zeroOrNaN(&l, blobs)
	}
	p := profile{blobs: blobs, parts: parts(&l)}
	return l.Wave / atomic.C * p.integrate().w
}

func one(l *atomic.Line, logN, b float64, grad bool) sum {
	blobs := [1]blob{newBlob(l, 0, logN, b)}
	if !computable(l, blobs[:]) {
		x := zeroOrNaN(l, blobs[:])
		return sum{x, x, x}
	}
	p := profile{blobs: blobs[:], parts: parts(l), grad: grad}
	return p.integrate()
}

func newBlob(l *atomic.Line, v, logN, b float64) blob {
	return blob{v: v, b: b, a: voigt.Damping(l.Gamma, l.Wave, b), tau0: voigt.Tau0(math.Pow(10, logN), l.F, l.Wave, b)}
}

// computable reports whether there is something to integrate, all of it finite.
func computable(l *atomic.Line, blobs []blob) bool {
	some := false
	for _, c := range blobs {
		if !(c.b > 0 && c.a >= 0 && c.tau0 >= 0 && c.tau0 < 1e150) || math.IsInf(c.b, 0) || math.IsInf(c.a, 0) ||
			math.IsNaN(c.v) || math.IsInf(c.v, 0) {
			return false
		}
		some = some || c.tau0 > 0
	}
	return some && l.Wave > 0
}

func zeroOrNaN(l *atomic.Line, blobs []blob) float64 {
	for _, c := range blobs {
		if !(c.b > 0 && c.tau0 == 0 && c.a >= 0) || math.IsInf(c.b, 0) {
			return math.NaN()
		}
	}
	if !(l.Wave > 0) {
		return math.NaN()
	}
	return 0
}
