package main

import "math"

// The Voigt function of the simulations, apart from package voigt: plain formulas, checked
// in the tests against the integral itself.

// dawson is Dawson's integral D(u) = e^{−u²} ∫₀ᵘ e^{t²} dt at steps of dawsonStep, by
// Gauss–Legendre sums from step to step; between them a cubic through D and
// D′ = 1 − 2uD, good to 1e-13.
var dawson = tabulate()

const (
	dawsonStep = 1.0 / 1024
	nearU      = 12 // beyond it the asymptotic series takes over
)

// Abscissae and weights of Gauss–Legendre sums over −1…1, 8 points (Abramowitz & Stegun
// 1964, table 25.4; from memory, checked in the tests by the moments).
var (
	legendreX = [8]float64{-0.9602898564975363, -0.7966664774136267, -0.5255324099163290, -0.1834346424956498, 0.1834346424956498, 0.5255324099163290, 0.7966664774136267, 0.9602898564975363}
	legendreW = [8]float64{0.1012285362903763, 0.2223810344533745, 0.3137066458778873, 0.3626837833783620, 0.3626837833783620, 0.3137066458778873, 0.2223810344533745, 0.1012285362903763}
)

func tabulate() []float64 {
	d := make([]float64, int(nearU/dawsonStep)+2)
	for i := 1; i < len(d); i++ {
		u := float64(i) * dawsonStep
		sum := 0.0
		for k, x := range legendreX {
			t := u - dawsonStep*(1-x)/2
			sum += legendreW[k] * dawsonStep / 2 * math.Exp((t-u)*(t+u))
		}
		d[i] = d[i-1]*math.Exp(-dawsonStep*(2*u-dawsonStep)) + sum
	}
	return d
}

// dawsonAt interpolates for 0 ≤ u ≤ nearU.
func dawsonAt(u float64) float64 {
	i := int(u / dawsonStep)
	x0 := float64(i) * dawsonStep
	y0, y1 := dawson[i], dawson[i+1]
	m0, m1 := dawsonStep*(1-2*x0*y0), dawsonStep*(1-2*(x0+dawsonStep)*y1)
	t := (u - x0) / dawsonStep
	s := 1 - t
	return s*s*((1+2*t)*y0+t*m0) + t*t*((1+2*s)*y1-s*m1)
}

// voigtH is the Voigt function H(a, u) = (a/π) ∫ e^{−t²}/((u − t)² + a²) dt for 0 ≤ a ≤ 0.02:
// the real part of the Taylor series in ia of
//
//	w(u) = e^{−u²} + 2i/√π D(u),  w⁽ⁿ⁺¹⁾ = −2u w⁽ⁿ⁾ − 2n w⁽ⁿ⁻¹⁾,  w′ = −2uw + 2i/√π,
//
// to eighth order, and far out the asymptotic series of the wings.
func voigtH(a, u float64) float64 {
	u = math.Abs(u)
	if u >= nearU {
		t := 1 / (u * u)
		return a / math.SqrtPi * (1/(u*u+a*a) + t*t*(1.5+t*(3.75+t*(13.125+t*59.0625))))
	}
	re0, im0 := math.Exp(-u*u), 2/math.SqrtPi*dawsonAt(u)
	re1, im1 := -2*u*re0, -2*u*im0+2/math.SqrtPi
	h := re0 - a*im1
	p := a
	for n := 1; n < 8; n++ {
		k := float64(n)
		re0, re1 = re1, -2*u*re1-2*k*re0
		im0, im1 = im1, -2*u*im1-2*k*im0
		p *= a / (k + 1) // aⁿ⁺¹/(n+1)!
		switch n & 3 {   // Re iⁿ⁺¹ w
		case 0:
			h -= p * im1
		case 1:
			h -= p * re1
		case 2:
			h += p * im1
		default:
			h += p * re1
		}
	}
	return h
}
