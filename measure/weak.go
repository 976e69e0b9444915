package measure

import (
	"fmt"
	"math"
	"slices"

	"lacuna/atomic"
	"lacuna/budget"
)

// perWidth is the column of W = 1 Å with fλ² = 1 Å²: 1/(π rₑ) = 1.12958e20 cm⁻².
const perWidth = 1e8 / (math.Pi * atomic.ElectronRadius)

// weakTau is the largest central optical depth at which a width still gives a
// value: the correction is 0.045 dex there.
const weakTau = 0.3

// The corrections beyond which a column by optical depth is a lower limit: where
// the line's own width gives b, and where the b assumed does, so that the
// correction is only what might be (common practice, no source).
const (
	hiddenDex  = 0.10
	assumedDex = 0.25
)

// opticalDepth estimates the central optical depth tau0 that the deepest part of
// the line has behind the instrument, as one Gaussian component of Doppler
// parameter b: the component that, seen through the instrument (see blurred), has
// the depth and the width of the deepest dip. Saturation widens a component, so the
// width alone would give too large a b. b is not less than the b assumed: a dip no
// wider than the instrument may hide a component as narrow as that. tau0 is not less
// than the optical depth seen, and its width not more than W.
func (w *work) opticalDepth() (tau0, b float64) {
	o := &w.out
	wv := o.W.X / w.p.Line.Wave * atomic.C
	peak, at := w.peak()
	depth := -math.Expm1(-peak)
	if !(depth > 0) {
		return 0, o.B
	}
	box := float64(2*w.half()+1) * w.pixel()
	inst := math.Hypot(w.p.FWHM/fwhmPerB, box/math.Sqrt(6)) // b² = 2σ², σ² = box²/12
	obs := min(wv/(math.Sqrt(math.Pi)*depth), w.dipWidth(at, depth)/fwhmPerB)
	b = o.B
	if lo, hi := o.B, obs; hi > lo && blurredWidth(blurredTau(depth, lo, inst), lo, inst) < obs*fwhmPerB {
		for range 14 { // to 1e-4
			b = (lo + hi) / 2
			if blurredWidth(blurredTau(depth, b, inst), b, inst) > obs*fwhmPerB {
				hi = b
			} else {
				lo = b
			}
		}
	}
	tau0 = min(blurredTau(depth, b, inst), growthInverse(max(wv, 0)/b))
	return min(max(tau0, peak), mostTau), b
}

// half is how many pixels on each side of one are averaged before its depth is
// judged: half a resolution element in all, and three pixels at least.
func (w *work) half() int {
	if w.p.FWHM > 0 {
		return max(1, int(w.p.FWHM/w.pixel()/4+0.5))
	}
	return 1
}

// mean is the mean of f over a pixel and half() on each side; false where one of
// them is bad or missing.
func (w *work) mean(i int) (float64, bool) {
	h := w.half()
	if i < h || i+h >= w.n {
		return 0, false
	}
	s := 0.0
	for k := i - h; k <= i+h; k++ {
		if w.bad[k] {
			return 0, false
		}
		s += w.f[k]
	}
	return s / float64(2*h+1), true
}

// dipWidth is the width (km/s) at half depth of the dip whose deepest pixel is at:
// twice the narrower side.
func (w *work) dipWidth(at int, depth float64) float64 {
	side := func(step int) float64 {
		last, level := 1-depth, 1-depth/2
		for i := at + step; ; i += step {
			f, ok := w.mean(i)
			if !ok {
				return math.Inf(1)
			}
			if f >= level {
				part := 1.
				if f > last {
					part = (level - last) / (f - last)
				}
				return math.Abs(w.v[i-step] + part*(w.v[i]-w.v[i-step]) - w.v[at])
			}
			last = f
		}
	}
	return 2 * min(side(1), side(-1))
}

// hidden says what the apparent optical depth may hide: the correction (dex) of
// one component with tau0 and b behind the instrument. Beyond 0.10 dex, or 0.25 dex
// where b is only assumed, the line counts as saturated.
func (w *work) hidden(tau0, b float64) {
	o := &w.out
	if !(o.AOD.X > 0) {
		return
	}
	seen := growth(tau0) // much narrower than the instrument
	if r := w.p.FWHM / b; w.p.FWHM > 0 && r < 20 && tau0 < 1e3 {
		seen = apparent(tau0, r)
	}
	o.Hidden = max(0, math.Log10(math.Sqrt(math.Pi)*tau0/seen))
	most, how := hiddenDex, "is likely to hide"
	if b <= o.B {
		most, how = assumedDex, "would hide"
	}
	if o.Hidden > most {
		if o.Saturated == "" {
			o.Saturated = fmt.Sprintf("one cloud of b = %.2g km/s and optical depth %.2g %s %.2f dex", b, tau0, how, o.Hidden)
		}
		return
	}
}

// ByDepth is the column that the apparent optical depth stands for, log₁₀ N: N_a
// raised by half of what one cloud could hide behind the instrument (Hidden), with
// all of it as an error of structure, which lines of one species share: the gas may
// be in clouds still narrower than the one assumed. A limit stays N_a. (Common practice, no source.)
func (o Width) ByDepth() budget.Number {
	n := budget.Log10(o.AOD)
	if o.Hidden == 0 || n.Kind() != "value" {
		return n
	}
	n.X += o.Hidden / 2
	n.Shifts = append(slices.Clone(n.Shifts), budget.Shift{Cause: budget.Structure, Key: structureKey(atomic.Line{Species: o.Species, Level: o.Level}), D: o.Hidden})
	return n
}

// structureKey names what lines of one species share: the unseen structure of the
// same gas.
func structureKey(l atomic.Line) string { return "structure:" + l.Carrier() }

// weakLine fills in the column by the weak-line relation,
//
//	N = 1.12958e20 W/(fλ²)  (W, λ in Å),
//
// exact for τ₀ → 0. It is a value only where the line is optically thin, τ₀ ≤ 0.3
// by opticalDepth. A value gets the correction of that component, log √πτ₀/F(τ₀) ≤
// 0.045 dex, and half of it as an error of structure, since no one sees how the
// gas is spread within it. Beyond, N is a lower limit. Without detection it is an
// upper limit, from Limit.
//
// Sources: the relation, Spitzer 1978, Physical Processes in the Interstellar
// Medium, §3.4 (from memory); the thresholds, common practice, no source.
func (w *work) weakLine() {
	o, l := &w.out, w.p.Line
	k := perWidth / (l.F * l.Wave * l.Wave)
	n := budget.Number{X: k * o.W.X, Flag: o.W.Flag}
	for _, s := range o.W.Shifts {
		s.D *= k
		n.Shifts = append(n.Shifts, s)
	}
	if l.FErr > 0 {
		n.Shifts = append(n.Shifts, budget.Shift{Cause: budget.FValue, Key: "f:" + l.Name, D: -n.X * l.FErr / l.F})
	}
	if !o.Detected {
		o.Linear = budget.Limit(n, k*o.Limit, o.LimitSigma)
		return
	}
	tau0, b := w.opticalDepth()
	o.Tau0 = tau0
	w.hidden(tau0, b)
	if !(tau0 <= weakTau) {
		n.Flag |= budget.Lower | budget.Saturated
		o.Linear = n
		return
	}
	c := 1.0
	if tau0 > 0 {
		c = math.Sqrt(math.Pi) * tau0 / growth(tau0)
	}
	o.Correction = math.Log10(c)
	was := n.X
	n.X *= c
	for i := range n.Shifts {
		n.Shifts[i].D *= c
	}
	if c > 1 {
		n.Shifts = append(n.Shifts, budget.Shift{Cause: budget.Structure, Key: structureKey(w.p.Line), D: (n.X - was) / 2})
	}
	o.Linear = n
}

// peak is the apparent optical depth of the deepest part of the line (see mean),
// and its middle pixel.
func (w *work) peak() (tau float64, at int) {
	least := 1.0
	for i := range w.f {
		if w.v[i] < w.out.Window[0] || w.v[i] > w.out.Window[1] {
			continue
		}
		if f, ok := w.mean(i); ok && f < least {
			least, at = f, i
		}
	}
	return -math.Log(max(least, 1e-6)), at
}

// saturation says why a detected line counts as saturated: two or more adjacent
// pixels with f below 0.1, or below 3σ of zero flux (pixel noise and zero level).
// Common practice, no source.
func (w *work) saturation(cover []float64) {
	if !w.out.Detected {
		return
	}
	dark, faint, most, mostFaint := 0, 0, 0, 0
	for i, c := range cover {
		if c == 0 || w.bad[i] {
			dark, faint = 0, 0
			continue
		}
		s := math.Hypot(w.sigma[i], w.p.Zero.Err)
		if w.f[i] < 0.1 {
			dark++
		} else {
			dark = 0
		}
		if w.f[i] < 3*s && 1-w.f[i] > 2*s { // and not merely lost in noise
			faint++
		} else {
			faint = 0
		}
		most, mostFaint = max(most, dark), max(mostFaint, faint)
	}
	switch {
	case most >= 2:
		w.out.Saturated = fmt.Sprintf("flux below 0.1 of the continuum in %d adjacent pixels", most)
	case mostFaint >= 2:
		w.out.Saturated = fmt.Sprintf("flux within 3σ of zero in %d adjacent pixels", mostFaint)
	}
}
