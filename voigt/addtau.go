package voigt

import (
	"math"

	"lacuna/atomic"
)

// chunk is how many pixels AddTau does at a time; its scratch is on the stack.
const chunk = 128

// whole stands for the structure of a line that has none.
var whole = [1]atomic.Part{{Strength: 1}}

func parts(l *atomic.Line) []atomic.Part {
	if len(l.Parts) == 0 {
		return whole[:]
	}
	return l.Parts
}

// AddTau adds to tau[i] the optical depth at wave[i] (Å, vacuum) of line l in
// cloud c,
//
//	τ(v) = Σ_k s_k τ₀ H(a, (v − V − DV_k)/b),   v = c (λ/λ₀ − 1),
//
// summed over the hyperfine and isotopic parts of l (strength s_k, shift DV_k; one
// unshifted part where l has none), with τ₀ from Tau0 and a from Damping. Hence
// ∫ τ dv = N f λ₀ / ColumnPerTau exactly, for any V: b is measured on the velocity
// scale v = cz of the frame, which is 1 + V/c times that of the gas.
//
// tau and wave have equal length, or AddTau panics; ascending wavelengths are
// fastest. NaN where c.B is not above 0. No allocation. Accuracy: 1e-13 in H,
// and a rounding of λ/λ₀ that is worth 1e-10 km/s.
func AddTau(tau, wave []float64, l atomic.Line, c Cloud) {
	if len(tau) != len(wave) {
		panic("voigt: AddTau: tau and wave differ in length")
	}
	var u, h [chunk]float64
	a := Damping(l.Gamma, l.Wave, c.B)
	tau0 := Tau0(c.N(), l.F, l.Wave, c.B)
	scale := atomic.C / (l.Wave * c.B) // u per Å
	for _, part := range parts(&l) {
		shift, peak := (c.V+part.DV)/c.B, part.Strength*tau0
		for from := 0; from < len(wave); from += chunk {
			w := wave[from:min(from+chunk, len(wave))]
			t := tau[from:][:len(w)]
			for i, x := range w {
				u[i] = (x-l.Wave)*scale - shift
			}
			Fill(h[:len(w)], nil, nil, a, u[:len(w)])
			for i, x := range h[:len(w)] {
				t[i] += peak * x
			}
		}
	}
}

// Gradient receives the derivatives of the optical depth by the three numbers of
// a cloud; each slice is as long as wave, or nil if not wanted.
type Gradient struct {
	LogN []float64 // ∂τ/∂log₁₀N
	V    []float64 // ∂τ/∂v, per km/s
	B    []float64 // ∂τ/∂b, per km/s
}

// AddTauGrad is AddTau and adds the derivatives to the slices of g as well:
//
//	∂τ/∂logN = τ ln 10,  ∂τ/∂v = −(τ₀/b) H_u,  ∂τ/∂b = −(τ₀/b) (H + u H_u + a H_a),
//
// summed over the parts of l. Lines that share a cloud may add to the same
// slices. tau may be nil. A slice of another length than wave panics. No
// allocation; analytic, accurate to about 1e-12 of their largest values.
func AddTauGrad(tau []float64, g Gradient, wave []float64, l atomic.Line, c Cloud) {
	for _, s := range [...][]float64{tau, g.LogN, g.V, g.B} {
		if s != nil && len(s) != len(wave) {
			panic("voigt: AddTauGrad: slices differ in length")
		}
	}
	var u, h, hu, ha [chunk]float64
	a := Damping(l.Gamma, l.Wave, c.B)
	tau0 := Tau0(c.N(), l.F, l.Wave, c.B)
	scale := atomic.C / (l.Wave * c.B)
	for _, part := range parts(&l) {
		shift, peak := (c.V+part.DV)/c.B, part.Strength*tau0
		for from := 0; from < len(wave); from += chunk {
			w := wave[from:min(from+chunk, len(wave))]
			n := len(w)
			for i, x := range w {
				u[i] = (x-l.Wave)*scale - shift
			}
			Fill(h[:n], hu[:n], ha[:n], a, u[:n])
			if tau != nil {
				addScaled(tau[from:from+n], peak, &h)
			}
			if g.LogN != nil {
				addScaled(g.LogN[from:from+n], peak*math.Ln10, &h)
			}
			if g.V != nil {
				addScaled(g.V[from:from+n], -peak/c.B, &hu)
			}
			if g.B != nil {
				t, k := g.B[from:from+n], -peak/c.B
				for i := range t {
					t[i] += k * (h[i] + u[i]*hu[i] + a*ha[i])
				}
			}
		}
	}
}

func addScaled(dst []float64, k float64, x *[chunk]float64) {
	for i := range dst {
		dst[i] += k * x[i]
	}
}
