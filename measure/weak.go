package measure

import (
	"fmt"
	"math"

	"lacuna/atomic"
	"lacuna/budget"
)

// perWidth is the column of W = 1 Å with fλ² = 1 Å²: 1/(π rₑ) = 1.12958e20 cm⁻².
const perWidth = 1e8 / (math.Pi * atomic.ElectronRadius)

// weakTau is the largest central optical depth at which a width still gives a
// value: the correction is 0.045 dex there.
const weakTau = 0.3

// weakLine fills in the column by the weak-line relation,
//
//	N = 1.12958e20 W/(fλ²)  (W, λ in Å),
//
// exact for τ₀ → 0. It is a value only where the line is optically thin, τ₀ ≤ 0.3.
// τ₀ is the larger of two: the optical depth seen at the deepest point (mean of
// three pixels), and that of one Gaussian component with this W and
// b = √(b_a² − b_inst²), not less than the b assumed. A value gets the correction of
// that component, log √πτ₀/F(τ₀) ≤ 0.045 dex, and half of it as an error of
// structure, since no one sees how the gas is spread within it. Beyond, N is a
// lower limit. Without detection it is an upper limit, from Limit.
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
	b := o.B
	if ba := o.AODB.X; !math.IsNaN(ba) {
		inst := w.p.FWHM / fwhmPerB
		b = max(b, math.Sqrt(max(0, ba*ba-inst*inst)))
	}
	tau := growthInverse(o.W.X / l.Wave * atomic.C / b)
	o.Tau0 = min(max(tau, w.peak()), 1e9)
	if !(o.Tau0 <= weakTau) {
		n.Flag |= budget.Lower | budget.Saturated
		if o.Saturated == "" {
			o.Saturated = fmt.Sprintf("optical depth %.2g at the centre", o.Tau0)
		}
		o.Linear = n
		return
	}
	c := 1.0
	if o.Tau0 > 0 {
		c = math.Sqrt(math.Pi) * o.Tau0 / growth(o.Tau0)
	}
	o.Correction = math.Log10(c)
	was := n.X
	n.X *= c
	for i := range n.Shifts {
		n.Shifts[i].D *= c
	}
	if c > 1 {
		n.Shifts = append(n.Shifts, budget.Shift{Cause: budget.Structure, D: (n.X - was) / 2})
	}
	o.Linear = n
}

// peak is the apparent optical depth of the deepest three pixels in a row.
func (w *work) peak() float64 {
	least := 1.0
	for i := 1; i+1 < w.n; i++ {
		if w.v[i] < w.out.Window[0] || w.v[i] > w.out.Window[1] || w.bad[i-1] || w.bad[i] || w.bad[i+1] {
			continue
		}
		least = min(least, (w.f[i-1]+w.f[i]+w.f[i+1])/3)
	}
	return -math.Log(max(least, 1e-6))
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
