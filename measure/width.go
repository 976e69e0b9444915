package measure

import (
	"fmt"
	"math"

	"lacuna/atomic"
	"lacuna/budget"
)

// Thresholds of detection, in σ of the total error (common practice, no source).
const (
	detect   = 3.
	marginal = 2.
)

// Measure integrates one line,
//
//	W = Σ (1 − fᵢ) Δλᵢ,  fᵢ = (1+z) Fᵢ/Cᵢ − z,
//
// over the window, pixels at its ends in part; C is the continuum as observed and
// z the zero level: light that the line cannot absorb, as a fraction of the star's
// continuum, so that f is what the line transmits and W = (1+z) W_observed.
//
// The error of W has these parts, each a shift of the result:
//   - Photon: Σᵢⱼ gᵢgⱼσᵢσⱼρ(|i−j|), gᵢ = (1+z) Δλᵢ/Cᵢ, with the noise as measured;
//   - Continuum: hᵀ Cov h, h_k = (1+z) Σ Δλᵢ Fᵢ/Cᵢ² φ_k(λᵢ), one shift for each
//     principal factor of Cov, so that lines on one continuum share it exactly;
//   - Placement: half the spread of W over the other placements of the continuum,
//     as far as pixel noise does not explain it: √(h² − 2σ_h²), 0 if negative.
//     The noise in the spread is already in the parts above;
//   - ZeroLevel: W at z ± σ_z;
//   - Fill: masked pixels (see fillIn).
//
// A line is detected at W ≥ 3σ with all of these. Below, the result keeps W ± σ,
// and Limit is LimitSigma·σ over LimitWidth, without the measured W; between 2σ
// and 3σ the flag is Marginal.
//
// Sources: Sembach & Savage 1992, ApJS 83, 147 (errors of noise and continuum in
// widths; from memory); correlated noise is our extension. SigmaVE06 is the error
// by Vollmann & Eversberg 2006, AN 327, 862 (as recalled): it takes all pixels of
// a line for one and is √n too large, and serves comparison only.
func Measure(p Piece) (Width, error) {
	w, err := newWork(p)
	if err != nil {
		return Width{}, err
	}
	w.describe()
	w.out.Window = p.Window
	if p.AutoWindow {
		w.findWindow()
	}
	cover := w.cover(w.out.Window[0], w.out.Window[1])
	if err := w.fillIn(cover); err != nil {
		return Width{}, err
	}
	if err := w.checkContinuum(); err != nil {
		return Width{}, err
	}
	w.out.W = w.width(cover)
	if err := w.checkFill(cover); err != nil {
		return Width{}, err
	}
	w.spread(cover)
	w.judge(cover)
	w.signalToNoise()
	w.blends()
	w.saturation(cover)
	w.moments(cover)
	w.weakLine()
	w.depths(cover)
	w.flags()
	w.profile(cover)
	return w.out, nil
}

// describe copies what a reader needs to know of line, continuum and noise.
func (w *work) describe() {
	p, m := w.p, w.p.Continuum
	w.out = Width{
		Line: p.Line.Name, Species: p.Line.Species, Level: p.Line.Level, Wave: p.Line.Wave, WaveAir: p.Line.WaveAir, F: p.Line.F,
		Order: p.Order, File: p.File, AutoWindow: p.AutoWindow, Zero: p.Zero, Gamma: p.Line.Gamma, Split: split(p.Line),
		NoiseRatio: m.Noise.Ratio, NoiseRho: m.Noise.Rho, NoisePixels: m.Noise.Pixels, NoiseBy: "error array, audited",
		Degree: m.Degree, ContinuumBy: m.By, Bin: 1, Notes: append([]string(nil), m.Notes...), LimitSigma: p.LimitSigma,
	}
	if m.Noise.FromData {
		w.out.NoiseBy = "scatter of the residuals"
	}
	for _, r := range m.Windows {
		w.out.Windows = append(w.out.Windows, [2]float64{velocity(r[0], p.Line.Wave), velocity(r[1], p.Line.Wave)})
	}
	if w.out.LimitSigma == 0 {
		w.out.LimitSigma = 3
	}
	w.out.B = p.B
	if p.B == 0 {
		w.out.B = 2
		if p.Line.Molecule() {
			w.out.B = 1
		}
	}
	w.out.LimitB = w.out.B
}

// split is the rms (km/s) of a line's structure about its centre.
func split(l atomic.Line) float64 {
	m, s, v := 0.0, 0.0, 0.0
	for _, p := range l.Parts {
		m, s = m+p.Strength*p.DV, s+p.Strength
	}
	if s == 0 {
		return 0
	}
	for _, p := range l.Parts {
		v += p.Strength / s * (p.DV - m/s) * (p.DV - m/s)
	}
	return math.Sqrt(v)
}

// checkContinuum refuses a slope that rests on one side of the line.
func (w *work) checkContinuum() error {
	m := w.p.Continuum
	for i, c := range w.cont {
		if w.v[i] >= w.out.Window[0] && w.v[i] <= w.out.Window[1] && !(c > 0) {
			return w.wrong(fmt.Sprintf("the continuum is %.3g at %.1f km/s", c, w.v[i]), "look at its windows and degree, or use another order")
		}
	}
	if m.Pixels == nil || m.Given != nil {
		return nil
	}
	below, above, inside := 0, 0, 0
	for i, u := range m.Pixels {
		switch {
		case !u:
		case w.v[i] < w.out.Window[0]:
			below++
		case w.v[i] > w.out.Window[1]:
			above++
		default:
			inside++
		}
	}
	if m.Degree > 0 && (below == 0 || above == 0) {
		return w.wrong(fmt.Sprintf("a continuum of degree %d with %d pixels below the window and %d above", m.Degree, below, above), "give windows on both sides, or degree 0")
	}
	if min(below, above) < 50 {
		w.note("the continuum rests on %d pixels below the window and %d above (50 are advised)", below, above)
	}
	if inside > 0 {
		w.note("%d continuum pixels lie inside the window", inside)
	}
	return nil
}

func (w *work) note(format string, a ...any) {
	w.out.Notes = append(w.out.Notes, fmt.Sprintf(format, a...))
}

// continuumName names the continuum for shifts that lines share.
func (w *work) continuumName() string {
	if w.p.ContinuumKey != "" {
		return w.p.ContinuumKey
	}
	d := w.p.Continuum.Domain
	return fmt.Sprintf("%s:%d:%.3f-%.3f", w.p.File, w.p.Order, d[0], d[1])
}

// integral is Σ (1−f) cover with continuum c (on the pixels) in place of w.cont;
// bad pixels keep what was filled in.
func (w *work) integral(cover, c []float64) float64 {
	s := 0.0
	for i, d := range cover {
		if d > 0 {
			s += d * (1 - w.value(i, c))
		}
	}
	return s
}

// value is f of pixel i with continuum c.
func (w *work) value(i int, c []float64) float64 {
	if !w.bad[i] {
		return w.grow*w.p.Flux[i]/c[i] - w.p.Zero.Level
	}
	k := w.fill[i]
	if k.left < 0 && k.right < 0 {
		return w.f[i]
	}
	f := 0.0
	if k.left >= 0 {
		f += (1 - k.t) * w.value(k.left, c)
	}
	if k.right >= 0 {
		f += k.t * w.value(k.right, c)
	}
	return f
}

// width is W over the covered pixels with the errors that belong to it alone;
// the placement is added by spread.
func (w *work) width(cover []float64) budget.Number {
	n := budget.Number{X: w.integral(cover, w.cont)}
	n.Shifts = w.linear(cover, func(i int) float64 { return -1 })
	if z := w.p.Zero; z.Err > 0 {
		n.Shifts = append(n.Shifts, budget.Shift{Cause: budget.ZeroLevel, Key: w.zeroKey(), D: n.X / w.grow * z.Err})
	}
	return n
}

func (w *work) zeroKey() string { return fmt.Sprintf("zero:%s:%d", w.p.File, w.p.Order) }

// linear returns the shifts by noise, continuum and filled pixels of a quantity
// that changes by slope(i)·cover[i] with f of pixel i.
func (w *work) linear(cover []float64, slope func(i int) float64) []budget.Shift {
	g, h, fills := w.gradient(cover, slope, w.cont, len(w.p.Continuum.Coef))
	var out []budget.Shift
	if v := w.p.Continuum.Noise.Variance(g, w.p.Continuum.Sigma); v > 0 {
		out = append(out, budget.Shift{Cause: budget.Photon, D: math.Sqrt(v)})
	}
	name := w.continuumName()
	for k, d := range factors(w.p.Continuum.Cov, h) {
		if d != 0 {
			out = append(out, budget.Shift{Cause: budget.Continuum, Key: fmt.Sprintf("continuum:%s#%d", name, k), D: d})
		}
	}
	if fills > 0 {
		out = append(out, budget.Shift{Cause: budget.Fill, D: math.Sqrt(fills)})
	}
	return out
}

// gradient returns ∂/∂F of every pixel, ∂/∂Coef of the continuum (np terms), and
// the variance by filled pixels: half the local depth, common to all pixels of a
// gap.
func (w *work) gradient(cover []float64, slope func(i int) float64, cont []float64, np int) (g, h []float64, fills float64) {
	g, h = make([]float64, w.n), make([]float64, np)
	basis := make([]float64, np)
	gap := 0.0
	var add func(i int, d float64)
	add = func(i int, d float64) { // d = ∂/∂f of pixel i
		if !w.bad[i] {
			c := cont[i]
			g[i] += d * w.grow / c
			w.p.Continuum.Basis(basis, w.p.Wave[i])
			for k, b := range basis {
				h[k] -= d * w.grow * w.p.Flux[i] / (c * c) * b
			}
			return
		}
		k := w.fill[i]
		if k.left >= 0 {
			add(k.left, d*(1-k.t))
		}
		if k.right >= 0 {
			add(k.right, d*k.t)
		}
	}
	for i, c := range cover {
		if c > 0 {
			d := c * slope(i)
			add(i, d)
			if w.bad[i] {
				gap += math.Abs(d) * math.Abs(1-w.f[i]) / 2
				continue
			}
		}
		fills += gap * gap
		gap = 0
	}
	return g, h, fills + gap*gap
}

// factors returns Lᵀh of the Cholesky factor of cov: independent shifts whose
// squares add to hᵀ cov h.
func factors(cov, h []float64) []float64 {
	p := len(h)
	if p == 0 || len(cov) != p*p {
		return nil
	}
	l := make([]float64, p*p)
	out := make([]float64, p)
	for j := range p {
		d := cov[j*p+j]
		for k := range j {
			d -= l[j*p+k] * l[j*p+k]
		}
		if !(d > 0) {
			continue // a combination without error
		}
		l[j*p+j] = math.Sqrt(d)
		for i := j + 1; i < p; i++ {
			v := cov[i*p+j]
			for k := range j {
				v -= l[i*p+k] * l[j*p+k]
			}
			l[i*p+j] = v / l[j*p+j]
		}
	}
	for k := range p {
		for i := k; i < p; i++ {
			out[k] += l[i*p+k] * h[i]
		}
	}
	return out
}
