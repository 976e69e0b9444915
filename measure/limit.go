package measure

import (
	"math"
	"slices"

	"lacuna/budget"
)

// fwhmPerB is the full width at half maximum of a Gaussian over its b: 2√ln 2.
var fwhmPerB = 2 * math.Sqrt(math.Ln2)

// judge decides between detection, marginal detection and limit.
//
// A limit is LimitSigma·σ_W, with σ_W as for a width over a stated range of
// velocity: twice the width at half maximum that the line would be observed with,
// √(FWHM² + (2√ln2·b)²), about the middle of the window. It describes the data and
// not the line, so the measured W does not enter; but where W is marginal (2σ to
// 3σ) the limit is not below W + 2σ. A window wider than that may drown a line that
// a stretch of it shows (see stretch): the limit is not below W + 2σ there.
func (w *work) judge(cover []float64) {
	o := &w.out
	sigma := o.W.Err()
	threshold := w.p.Detection
	if threshold == 0 {
		threshold = detect
	}
	o.Detected = o.W.X >= threshold*sigma
	o.SigmaVE06 = w.vollmannEversberg(cover)
	o.LimitWidth = w.p.LimitWidth
	if o.LimitWidth == 0 {
		if w.p.FWHM > 0 {
			o.LimitWidth = 2 * math.Hypot(w.p.FWHM, fwhmPerB*o.LimitB)
		} else {
			o.LimitWidth = o.Window[1] - o.Window[0]
			if !o.Detected {
				w.note("the resolution is unknown: the limit is taken over the whole window")
			}
		}
	}
	if o.Detected {
		return
	}
	mid := (o.Window[0] + o.Window[1]) / 2
	lo, hi := mid-o.LimitWidth/2, mid+o.LimitWidth/2
	first, last := velocity(w.edge[0], w.p.Line.Wave), velocity(w.edge[w.n], w.p.Line.Wave)
	if lo < first || hi > last {
		w.note("the limit's range of %.1f km/s reaches outside the spectrum and was cut", o.LimitWidth)
		lo, hi = max(lo, first), min(hi, last)
	}
	o.Limit = o.LimitSigma * w.over(lo, hi).Err()
	if o.W.X >= marginal*sigma {
		o.W.Flag |= budget.Marginal
		o.Flag |= budget.Marginal
		if up := o.W.X + 2*sigma; !(o.Limit >= up) {
			o.Limit = up
			w.note("marginal: the limit is W + 2σ = %.2f mÅ", 1e3*up)
		}
	}
	w.stretch(threshold)
}

// stretch looks for the line in stretches of the window as wide as the limit, one
// every half of that. Of n that fit beside each other each may exceed the level
// whose chance, for all together, is that of 2σ for one (Bonferroni); the largest
// W + 2σ of those that do is a lower bound of the limit.
func (w *work) stretch(threshold float64) {
	o := &w.out
	span := o.Window[1] - o.Window[0]
	if !(o.LimitWidth < span) {
		return
	}
	level := oneOf(marginal, span/o.LimitWidth)
	steps := int(math.Ceil(2 * (span/o.LimitWidth - 1)))
	for k := range steps + 1 {
		lo := o.Window[0] + float64(k)/float64(steps)*(span-o.LimitWidth)
		n := w.over(lo, lo+o.LimitWidth)
		if s := n.Err(); n.X >= level*s && n.X+2*s > o.Limit {
			o.Limit = n.X + 2*s
			o.Inside = &Stretch{Window: [2]float64{lo, lo + o.LimitWidth}, W: n.X, Err: s, Detected: n.X >= threshold*s}
		}
	}
	if in := o.Inside; in != nil {
		w.note("between %.1f and %.1f km/s W = %.2f ± %.2f mÅ: the limit is W + 2σ there; a narrower window may find the line",
			in.Window[0], in.Window[1], 1e3*in.W, 1e3*in.Err)
	}
}

// oneOf is the level that one of n ≥ 1 independent Gaussian numbers exceeds as
// rarely as a single one exceeds z.
func oneOf(z, n float64) float64 {
	return math.Sqrt2 * math.Erfcinv(math.Erfc(z/math.Sqrt2)/n)
}

// over is W with its total error over a range of velocity; NaN where it holds
// nothing but masked pixels.
func (w *work) over(lo, hi float64) budget.Number {
	cover := w.cover(lo, hi)
	keepF, keepFill, bad := slices.Clone(w.f), w.fill, w.bad
	if w.fillIn(cover) != nil { // nothing but masked pixels there
		w.f, w.fill, w.bad = keepF, keepFill, bad
		return budget.Number{X: math.NaN(), Up: math.NaN(), Lo: math.NaN(), Shifts: []budget.Shift{{D: math.NaN()}}}
	}
	n := w.width(cover)
	s := w.placement(cover, func(c []float64) float64 { return w.integral(cover, c) }, func(int) float64 { return -1 })
	if s.shift != nil {
		n.Shifts = append(n.Shifts, *s.shift)
	}
	w.f, w.fill = keepF, keepFill
	return n
}

// vollmannEversberg is √(1 + C̄/F̄) (Δλ − W) / (S/N), S/N that of one pixel of the
// continuum.
func (w *work) vollmannEversberg(cover []float64) float64 {
	dl, sn := 0.0, 0.0
	for i, c := range cover {
		if c > 0 {
			dl += c
			sn += c * w.p.Continuum.Sigma[i] / w.cont[i]
		}
	}
	ratio := 1 - w.out.W.X/dl
	if !(ratio > 0) {
		return 0
	}
	return math.Sqrt(1+1/ratio) * (dl - w.out.W.X) * sn / dl
}

// signalToNoise measures S/N on the residuals of the 100 continuum pixels nearest
// to the window.
func (w *work) signalToNoise() {
	m := w.p.Continuum
	type near struct{ d, sn float64 }
	var all []near
	mid := (w.out.Window[0] + w.out.Window[1]) / 2
	for i := range w.f {
		if m.Pixels != nil && !m.Pixels[i] || w.bad[i] || !(w.cont[i] > 0) || !(m.Sigma[i] > 0) {
			continue
		}
		all = append(all, near{math.Abs(w.v[i] - mid), w.cont[i] / m.Sigma[i]})
	}
	if len(all) == 0 {
		return
	}
	slices.SortStableFunc(all, func(a, b near) int {
		switch {
		case a.d < b.d:
			return -1
		case a.d > b.d:
			return 1
		}
		return 0
	})
	all = all[:min(100, len(all))]
	sn := make([]float64, len(all))
	for i, a := range all {
		sn[i] = a.sn
	}
	slices.Sort(sn)
	w.out.SNPixel = (sn[(len(sn)-1)/2] + sn[len(sn)/2]) / 2
	if w.p.FWHM > 0 {
		n := max(w.p.FWHM/w.pixel(), 1)
		w.out.SNElement = w.out.SNPixel * math.Sqrt(n/m.Noise.Tau(int(math.Round(n))))
	}
}
