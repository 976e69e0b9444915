package measure

import (
	"math"

	"lacuna/budget"
)

// spread compares W over the placements of the continuum and adds the error of
// the choice.
func (w *work) spread(cover []float64) {
	s := w.placement(cover, func(c []float64) float64 { return w.integral(cover, c) }, func(int) float64 { return -1 })
	w.out.Placements, w.out.Spread, w.out.SpreadErr = s.each, s.half, s.noise
	if s.shift != nil {
		w.out.W.Shifts = append(w.out.W.Shifts, *s.shift)
	}
}

type spreadOf struct {
	each        []Placement
	half, noise float64
	shift       *budget.Shift
}

// placement is the half-spread of a quantity over all placements, its noise, and
// the shift that is left.
//
// Two placements differ by noise alone as well, since they weight pixels
// differently; that noise belongs to the photon and continuum errors already, and
// to add it again makes every error too large (by 5 to 10 % for wide lines on
// simulated spectra, so that 3σ does not mean 3σ). Its size in the half-spread of
// the two extreme placements follows exactly from the weights that they give to
// each pixel. The shift is √(half² − 2 noise²), 0 if negative: twice, because the
// two extremes of several were picked. With this the scatter of W equals the quoted total
// within 1 % on average (TestQuotedErrorIsTheScatter).
func (w *work) placement(cover []float64, quantity func(cont []float64) float64, slope func(i int) float64) spreadOf {
	m := w.p.Continuum
	var out spreadOf
	if len(m.Alt) == 0 {
		return out
	}
	conts := make([][]float64, len(m.Alt)+1)
	conts[0] = w.cont
	lo, hi, far := 0, 0, 0
	value := make([]float64, len(conts))
	value[0] = quantity(w.cont)
	for k := range m.Alt {
		c, bad := w.alt[k], false
		for i, d := range cover {
			bad = bad || d > 0 && !(c[i] > 0)
		}
		what := "other placement"
		if k < len(m.AltWhat) {
			what = m.AltWhat[k]
		}
		conts[k+1], value[k+1] = c, value[0]
		if bad { // a wild polynomial is no choice
			continue
		}
		v := quantity(c)
		if math.IsNaN(v) {
			continue
		}
		value[k+1] = v
		out.each = append(out.each, Placement{what, v})
		if v < value[lo] {
			lo = k + 1
		}
		if v > value[hi] {
			hi = k + 1
		}
		if math.Abs(v-value[0]) > math.Abs(value[far]-value[0]) {
			far = k + 1
		}
	}
	out.half = (value[hi] - value[lo]) / 2
	if out.half == 0 {
		return out
	}
	a, oka := w.weights(cover, slope, conts[hi], hi-1)
	b, okb := w.weights(cover, slope, conts[lo], lo-1)
	if oka && okb {
		for i := range a {
			a[i] = (a[i] - b[i]) / 2
		}
		out.noise = math.Sqrt(m.Noise.Variance(a, m.Sigma))
	}
	if d2 := out.half*out.half - 2*out.noise*out.noise; d2 > 0 {
		d := math.Sqrt(d2)
		if value[far] < value[0] {
			d = -d
		}
		out.shift = &budget.Shift{Cause: budget.Placement, Key: "placement:" + w.continuumName(), D: d}
	}
	return out
}

// weights returns how a quantity changes with the flux of each pixel of the piece,
// through the line and through continuum alt (−1: the model).
func (w *work) weights(cover []float64, slope func(i int) float64, cont []float64, alt int) ([]float64, bool) {
	np := len(w.p.Continuum.Coef)
	if alt >= 0 {
		np = len(w.p.Continuum.Alt[alt])
	}
	g, h, _ := w.gradient(cover, slope, cont, np)
	ok := w.p.Continuum.Pull(g, h, alt)
	return g, ok
}
