package main

import (
	"math"

	"lacuna/atomic"
)

// The forward model of the simulations: direct sums on a fine even grid of wavelengths.
// Nothing of packages voigt and voigt/lsf is in it.

// Constants of its own: √π e²/(mₑc) per Å of wavelength and km/s of b, from the classical
// electron radius (CODATA 2022, arXiv:2409.03787) and the speed of light.
const (
	lightSpeed = 299792.458                                           // km/s
	tauUnit    = 1.772453850905516 * 2.8179403205e-13 * 299792.458e-8 // cm² (km/s) Å⁻¹
	fwhmSigma  = 2.3548200450309493
	// Cells of the grid in the narrowest b and in σ of the instrument. Sums over analytic
	// functions converge faster than any power of the step; the tests halve it.
	cells = 8
)

// gas is one cloud as it truly is.
type gas struct {
	v, b, logN float64 // km/s, km/s, log₁₀ cm⁻²
}

// tau0 is the central optical depth of a line without structure.
func (g gas) tau0(l *atomic.Line) float64 {
	return tauUnit * l.F * l.Wave * math.Pow(10, g.logN) / g.b
}

// addTau adds the optical depth of one cloud in one line, with all members of the line.
func (g gas) addTau(tau, wave []float64, l *atomic.Line) {
	a := l.Gamma * l.Wave * 1e-13 / (4 * math.Pi * g.b)
	peak := g.tau0(l)
	parts := l.Parts
	if len(parts) == 0 {
		parts = []atomic.Part{{Strength: 1}}
	}
	for _, p := range parts {
		for j, x := range wave {
			u := (lightSpeed*(x/l.Wave-1) - g.v - p.DV) / g.b
			tau[j] += p.Strength * peak * voigtH(a, u)
		}
	}
}

// An optics is the instrument in one window: what each pixel records of the light at each
// point of the grid, and how that changes with the logarithm of the profile's width.
type optics struct {
	wave   []float64
	step   float64
	first  []int
	weight [][]float64
	slope  [][]float64 // ∂weight/∂ln(width)
}

// newOptics integrates a Gaussian of this FWHM (Å, at the wavelength of the light) over
// pixels with these borders: by eight points in each pixel, and a sum over the grid.
func newOptics(edges []float64, fwhm func(wave float64) float64, narrowest float64) *optics {
	mid := edges[len(edges)/2]
	sigma := fwhm(mid) / fwhmSigma
	o := &optics{step: min(sigma, narrowest*mid/lightSpeed) / cells}
	const reach = 8 // σ
	lo, hi := edges[0]-reach*1.01*sigma, edges[len(edges)-1]+reach*1.01*sigma
	o.wave = make([]float64, int((hi-lo)/o.step)+2)
	for j := range o.wave {
		o.wave[j] = lo + float64(j)*o.step
	}
	for i := range len(edges) - 1 {
		a := max(0, int((edges[i]-reach*sigma-lo)/o.step))
		z := min(len(o.wave), int((edges[i+1]+reach*sigma-lo)/o.step)+2)
		w, dw := make([]float64, z-a), make([]float64, z-a)
		for k, x := range legendreX {
			at := edges[i] + (edges[i+1]-edges[i])*(1+x)/2
			for j := range w {
				s := fwhm(o.wave[a+j]) / fwhmSigma
				t := (at - o.wave[a+j]) / s
				g := legendreW[k] / 2 * math.Exp(-t*t/2) / (math.Sqrt(2*math.Pi) * s) * o.step
				w[j] += g
				dw[j] += g * (t*t - 1)
			}
		}
		o.first, o.weight, o.slope = append(o.first, a), append(o.weight, w), append(o.slope, dw)
	}
	return o
}

// see sums weights × t for each pixel.
func (o *optics) see(weight [][]float64, t []float64) []float64 {
	out := make([]float64, len(weight))
	for i, w := range weight {
		s := 0.0
		for j, x := range t[o.first[i] : o.first[i]+len(w)] {
			s += w[j] * x
		}
		out[i] = s
	}
	return out
}

// A scene is one window as it truly is.
type scene struct {
	line      *atomic.Line
	edges     []float64
	continuum []float64 // Legendre coefficients
	zero      float64   // light added to every pixel
}

// A view is what a scene looks like without noise, and how that changes with each true
// number: v, b, log N of each cloud, ln(width), continuum coefficients, zero level.
type view struct {
	flux  []float64
	slope [][]float64
	width []float64 // ∂W/∂(v, b, log N), of the line before the instrument, Å
}

// look computes a scene behind an instrument of this FWHM (Å).
func (s scene) look(clouds []gas, fwhm func(wave float64) float64) view {
	narrowest := math.Inf(1)
	for _, c := range clouds {
		narrowest = min(narrowest, c.b)
	}
	o := newOptics(s.edges, fwhm, narrowest)
	n := len(o.wave)
	total := make([]float64, n)
	each := make([][]float64, len(clouds))
	for k, c := range clouds {
		each[k] = make([]float64, n)
		c.addTau(each[k], o.wave, s.line)
		for j, t := range each[k] {
			total[j] += t
		}
	}
	trans := make([]float64, n)
	for j, t := range total {
		trans[j] = math.Exp(-t)
	}
	seen := o.see(o.weight, trans)
	pixels := len(seen)
	x := make([]float64, pixels)
	first, last := (s.edges[0]+s.edges[1])/2, (s.edges[pixels-1]+s.edges[pixels])/2
	for i := range x {
		x[i] = (s.edges[i] + s.edges[i+1] - first - last) / (last - first)
	}
	cont := make([]float64, pixels)
	for i := range cont {
		for k, c := range s.continuum {
			cont[i] += c * legendre(k, x[i])
		}
	}
	out := view{flux: make([]float64, pixels)}
	for i := range out.flux {
		out.flux[i] = cont[i]*seen[i] + s.zero
	}
	column := func(t []float64) {
		for i := range t {
			t[i] *= cont[i]
		}
		out.slope = append(out.slope, t)
	}
	d, lo := make([]float64, n), make([]float64, n)
	by := func(plus, minus gas, h float64) {
		clear(d)
		clear(lo)
		plus.addTau(d, o.wave, s.line)
		minus.addTau(lo, o.wave, s.line)
		w := 0.0
		for j := range d {
			d[j] = -trans[j] * (d[j] - lo[j]) / (2 * h)
			w -= d[j] * o.step
		}
		out.width = append(out.width, w)
		column(o.see(o.weight, d))
	}
	for k, c := range clouds {
		h := 1e-4 * c.b
		by(gas{c.v + h, c.b, c.logN}, gas{c.v - h, c.b, c.logN}, h)
		by(gas{c.v, c.b + h, c.logN}, gas{c.v, c.b - h, c.logN}, h)
		w := 0.0
		for j, t := range each[k] {
			d[j] = -trans[j] * t * math.Ln10
			w -= d[j] * o.step
		}
		out.width = append(out.width, w)
		column(o.see(o.weight, d))
	}
	column(o.see(o.slope, trans))
	for k := range s.continuum {
		t := make([]float64, pixels)
		for i := range t {
			t[i] = legendre(k, x[i]) * seen[i]
		}
		out.slope = append(out.slope, t)
	}
	one := make([]float64, pixels)
	for i := range one {
		one[i] = 1
	}
	out.slope = append(out.slope, one)
	return out
}

func legendre(k int, x float64) float64 {
	switch k {
	case 0:
		return 1
	case 1:
		return x
	}
	f := float64(k)
	return ((2*f-1)*x*legendre(k-1, x) - (f-1)*legendre(k-2, x)) / f
}

// equivalent is the equivalent width ∫ (1 − e^{−τ}) dλ (Å) of a line between two
// velocities.
func equivalent(l *atomic.Line, clouds []gas, lo, hi float64) float64 {
	narrowest := math.Inf(1)
	for _, c := range clouds {
		narrowest = min(narrowest, c.b)
	}
	n := int((hi-lo)/narrowest*cells) + 1
	h := (hi - lo) / float64(n)
	wave, tau := make([]float64, n), make([]float64, n)
	for j := range wave {
		wave[j] = l.Wave * (1 + (lo+(float64(j)+0.5)*h)/lightSpeed)
	}
	for _, c := range clouds {
		c.addTau(tau, wave, l)
	}
	w := 0.0
	for _, t := range tau {
		w -= math.Expm1(-t) * h
	}
	return w * l.Wave / lightSpeed
}
