package measure

import (
	"math"

	"lacuna/atomic"
	"lacuna/budget"
)

// perTau is the column density per velocity of τ = 1 with fλ = 1 Å: 1/(π rₑ c)
// = 3.767885e14 cm⁻² (km/s)⁻¹ Å, the 1e8 turning cm into Å.
const perTau = 1e8 / (math.Pi * atomic.ElectronRadius * atomic.C)

// A bin is one or more pixels whose flux is averaged before the logarithm.
type bin struct {
	first, last int     // pixels
	v, dv       float64 // km/s: centre weighted by coverage, and width
	sum         float64 // of coverage, Å
	tau         float64
	dtau        float64 // −dτ/df: 1/f, or 0 where f is below the floor
}

// moments fills in the mean velocity and the apparent optical depth,
//
//	τ_a = −ln f,  N_a(v) = 3.767885e14 τ_a/(fλ) cm⁻² (km/s)⁻¹  (λ in Å),
//	N_a = Σ N_a(v) Δv,  v̄ = Σ v τ_a Δv / Σ τ_a Δv,  b_a = √(2 Σ (v−v̄)² τ_a Δv / Σ τ_a Δv),
//
// all with the line's instrument width in them (b_a² = b² + b_inst² for a weak
// line). Where f falls below 2σ, τ_a of 2σ is taken and the column is a lower
// limit.
//
// Noise makes the mean of −ln f too large by σ²/2f². Where that is expected to be
// more than 1 % of the whole, pixels are averaged to at least half a resolution
// element first; what is expected after that stands in AODBias (relative) and is
// not taken off.
//
// Source: Savage & Sembach 1991, ApJ 379, 245.
func (w *work) moments(cover []float64) {
	o := &w.out
	o.V, o.AOD, o.AODV, o.AODB = none(), none(), none(), none()
	if !(o.W.X >= marginal*o.W.Err()) {
		return
	}
	o.V = w.centre(cover)
	if !o.Detected {
		return
	}
	bins, low := w.bins(cover, 1)
	if w.p.FWHM > 0 && w.bias(bins) > 0.01 {
		if m := int(math.Ceil(w.p.FWHM / 2 / w.pixel() * (1 - 1e-9))); m > 1 {
			o.Bin = m
			bins, low = w.bins(cover, m)
		}
	}
	scale := perTau / (w.p.Line.F * w.p.Line.Wave)
	s, v, m2 := sums(bins)
	if !(s > 0) {
		w.note("no apparent optical depth: its sum is not positive")
		return
	}
	o.AODBias, o.Floored = w.bias(bins), low
	for _, b := range bins {
		o.TauPeak = max(o.TauPeak, b.tau)
	}
	of := make([]int, w.n) // the bin of each pixel
	for k, b := range bins {
		for i := b.first; i <= b.last; i++ {
			of[i] = k
		}
	}
	perA := atomic.C / w.p.Line.Wave // km/s per Å
	again := func(cont []float64, zero float64) []bin {
		q, keep := *w, w.p.Zero.Level
		q.p.Zero.Level, q.grow = keep+zero, 1+keep+zero
		q.f = make([]float64, w.n)
		for i, c := range cover {
			if c > 0 {
				q.f[i] = w.f[i]
				if !w.bad[i] || w.fill[i].left >= 0 || w.fill[i].right >= 0 {
					q.f[i] = q.value(i, cont)
				}
			}
		}
		b, _ := q.bins(cover, o.Bin)
		return b
	}
	number := func(x float64, slope func(b bin) float64, of2 func(b []bin) float64) budget.Number {
		n := budget.Number{X: x}
		d := func(i int) float64 { b := bins[of[i]]; return -b.dtau * slope(b) * perA }
		n.Shifts = w.linear(cover, d)
		if p := w.placement(cover, func(c []float64) float64 { return of2(again(c, 0)) }, d); p.shift != nil {
			n.Shifts = append(n.Shifts, *p.shift)
		}
		if z := w.p.Zero.Err; z > 0 {
			n.Shifts = append(n.Shifts, budget.Shift{Cause: budget.ZeroLevel, Key: w.zeroKey(), D: (of2(again(w.cont, z)) - of2(again(w.cont, -z))) / 2})
		}
		if low > 0 {
			n.Flag |= budget.Lower | budget.Saturated
		}
		if o.W.Is(budget.Filled) {
			n.Flag |= budget.Filled
		}
		return n
	}
	o.AOD = number(scale*s, func(bin) float64 { return scale }, func(b []bin) float64 { s, _, _ := sums(b); return scale * s })
	if l := w.p.Line; l.FErr > 0 {
		o.AOD.Shifts = append(o.AOD.Shifts, budget.Shift{Cause: budget.FValue, Key: "f:" + l.Name, D: -o.AOD.X * l.FErr / l.F})
	}
	o.AODV = number(v, func(b bin) float64 { return (b.v - v) / s }, func(b []bin) float64 { _, v, _ := sums(b); return v })
	o.AODV.Flag &^= budget.Lower
	if m2 > 0 {
		ba := math.Sqrt(2 * m2)
		o.AODB = number(ba, func(b bin) float64 { return ((b.v-v)*(b.v-v) - m2) / (s * ba) },
			func(b []bin) float64 { _, _, m := sums(b); return math.Sqrt(2 * max(m, 0)) })
		o.AODB.Flag &^= budget.Lower
	}
	if low > 0 {
		w.note("%d of %d points of the apparent optical depth lie below 2σ of zero flux: lower limit", low, len(bins))
	}
	w.out.Profile.Na = make([]float64, w.n)
	for _, b := range bins {
		for i := b.first; i <= b.last; i++ {
			w.out.Profile.Na[i] = scale * b.tau
		}
	}
}

func none() budget.Number { return budget.Number{X: math.NaN()} }

// bins averages m pixels at a time over the covered ones; low counts bins below 2σ.
func (w *work) bins(cover []float64, m int) (out []bin, low int) {
	var b bin
	f, n := 0.0, 0
	g := make([]float64, w.n)
	flush := func() {
		if n == 0 {
			return
		}
		f /= b.sum
		b.v /= b.sum
		b.dv = b.sum / w.p.Line.Wave * atomic.C
		s := math.Sqrt(w.p.Continuum.Noise.Variance(g[b.first:b.last+1], w.p.Continuum.Sigma[b.first:b.last+1])) / b.sum
		floor := 2 * math.Hypot(s, w.p.Zero.Err)
		if f < floor && floor < 1 {
			low++
			b.tau, b.dtau = -math.Log(floor), 0
		} else {
			f = max(f, 1e-6)
			b.tau, b.dtau = -math.Log(f), 1/f
		}
		out = append(out, b)
		b, f, n = bin{}, 0, 0
	}
	for i, c := range cover {
		if c == 0 {
			continue
		}
		if n == 0 {
			b.first = i
		}
		b.last = i
		b.sum += c
		b.v += c * w.v[i]
		f += c * w.f[i]
		if !w.bad[i] {
			g[i] = c * w.grow / w.cont[i]
		}
		if n++; n == m {
			flush()
		}
	}
	flush()
	return out, low
}

// bias is the expected relative excess of Σ τ_a Δv by noise, Σ σ²/2f² Δv / Σ τ_a Δv.
func (w *work) bias(bins []bin) float64 {
	g := make([]float64, w.n)
	over, sum := 0.0, 0.0
	for _, b := range bins {
		for i := b.first; i <= b.last; i++ {
			g[i] = 0
			if !w.bad[i] {
				g[i] = (w.edge[i+1] - w.edge[i]) * w.grow / w.cont[i]
			}
		}
		width := w.edge[b.last+1] - w.edge[b.first]
		v := w.p.Continuum.Noise.Variance(g[b.first:b.last+1], w.p.Continuum.Sigma[b.first:b.last+1]) / (width * width)
		f := math.Exp(-b.tau)
		over += v / (2 * f * f) * b.dv
		sum += b.tau * b.dv
	}
	if !(sum > 0) {
		return math.Inf(1)
	}
	return over / sum
}

// sums returns Σ τ Δv, the mean velocity and the second moment about it.
func sums(bins []bin) (s, v, m2 float64) {
	for _, b := range bins {
		s += b.tau * b.dv
		v += b.v * b.tau * b.dv
	}
	v /= s
	for _, b := range bins {
		m2 += (b.v - v) * (b.v - v) * b.tau * b.dv
	}
	return s, v, m2 / s
}

// centre is the mean velocity weighted by 1−f.
func (w *work) centre(cover []float64) budget.Number {
	mean := func(cont []float64) float64 {
		s, v := 0.0, 0.0
		for i, c := range cover {
			if c > 0 {
				d := c * (1 - w.value(i, cont))
				s, v = s+d, v+d*w.v[i]
			}
		}
		return v / s
	}
	v := mean(w.cont)
	n := budget.Number{X: v}
	slope := func(i int) float64 { return -(w.v[i] - v) / w.out.W.X }
	n.Shifts = w.linear(cover, slope)
	if p := w.placement(cover, mean, slope); p.shift != nil {
		n.Shifts = append(n.Shifts, *p.shift)
	}
	return n
}
