package clouds

import (
	"math"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"

	"lacuna/atomic"
	"lacuna/voigt"
)

// Where a profile is cut off.
const (
	// A line is 0 beyond the point where its τ falls below this, by default: 1e-6 would move χ² of a
	// fit at S/N 100 by 0.015.
	tauTol = 1e-7
	// Its derivatives are 0 where they are below this part of the smaller of 1 and τ₀.
	slopeTol = 1e-5
)

// Points returns the number of residuals, for lsq.Problem.
func (f *Fitter) Points() int {
	if f.hold != nil {
		return f.rows + 1
	}
	return f.rows
}

// Eval sets the residuals and their derivatives at x, for lsq.Problem.
func (f *Fitter) Eval(x, r []float64, jac *mat.Dense) {
	for i := range f.comps {
		f.comps[i].set(x)
	}
	raw := jac.RawMatrix()
	n := len(x)
	at := 0
	for _, w := range f.wins {
		w.absorption(f.comps, x, true)
		rows := w.rows()
		if !w.project(r[at : at+rows]) {
			r[at] = math.NaN()
			return
		}
		w.derivatives()
		if w.k > 0 {
			w.proj.Jacobian(w.d)
		}
		src := w.d.RawMatrix()
		for i := range rows {
			dst := raw.Data[(at+i)*raw.Stride : (at+i)*raw.Stride+n]
			clear(dst)
			row := src.Data[i*src.Stride:]
			for k, j := range w.cols {
				dst[j] = row[k]
			}
		}
		at += rows
	}
	for i, p := range f.priors {
		r[at+i] = (p.mean - p.value.at(x)) / p.sigma
		dst := raw.Data[(at+i)*raw.Stride : (at+i)*raw.Stride+n]
		clear(dst)
		for _, t := range p.value.terms {
			dst[t.j] -= t.k / p.sigma
		}
	}
	if h := f.hold; h != nil {
		i := f.rows
		r[i] = h.weight * (f.value(h.of, x, h.grad) - h.at)
		dst := raw.Data[i*raw.Stride : i*raw.Stride+n]
		for j, g := range h.grad {
			dst[j] = h.weight * g
		}
	}
}

// absorption computes the transmission on the sub-grid and after the instrument,
// and with slopes the derivatives of the optical depth.
func (w *window) absorption(comps []comp, x []float64, slopes bool) {
	clear(w.tau)
	for i := range w.slope {
		w.slope[i].lo, w.slope[i].hi = 0, 0
	}
	if w.width >= 0 {
		w.grid.set(x[w.cols[w.width]])
	}
	w.place(x)
	for i := range w.absorb {
		a := &w.absorb[i]
		w.line(a, &comps[a.comp], slopes)
	}
	for j, t := range w.tau {
		switch {
		case t == 0:
			w.trans[j] = 1
		default:
			w.trans[j] = math.Exp(-t)
		}
	}
	if w.factor != nil {
		floats.Mul(w.trans, w.factor)
	}
	for i, wt := range w.grid.weight {
		first := w.grid.first[i]
		w.flux[i] = floats.Dot(wt, w.trans[first:first+len(wt)])
	}
}

// place sets the velocity zero point.
func (w *window) place(x []float64) {
	w.shift = 0
	for _, t := range w.zeroAt {
		w.shift += t.k * x[t.j]
	}
}

// line adds one line of one comp.
func (w *window) line(a *absorber, c *comp, slopes bool) {
	l := a.line
	damping := voigt.Damping(l.Gamma, l.Wave, c.B)
	perN := voigt.Tau0(1, l.F, l.Wave, c.B)
	tau0 := perN * c.N
	scale := atomic.C / (l.Wave * c.B) // u per Å
	dn := tau0 * math.Ln10
	if c.linear {
		dn = perN
	}
	if !finite(tau0) || !finite(scale) {
		w.tau[0] = math.NaN()
		return
	}
	// How far ∂τ/∂N, ∂τ/∂v and ∂τ/∂b, and τ count; the same with slopes and without.
	least := slopeTol / max(1, math.Abs(tau0))
	inner, core := extent(damping, least), slopeExtent(damping, least)
	reach := max(inner, core, extent(damping, w.cut/math.Abs(tau0)))
	for _, part := range a.parts {
		v := c.V + w.shift + part.DV
		centre := l.Wave * (1 + v/atomic.C)
		lo, hi := w.grid.index(centre-reach/scale), w.grid.index(centre+reach/scale)
		if lo >= hi {
			continue
		}
		peak := part.Strength * tau0
		// Inside 8 Doppler widths by package voigt, outside by the Lorentz wing.
		a, z := lo, hi
		if damping <= wingDamping {
			a, z = w.grid.index(centre-wingFrom/scale), w.grid.index(centre+wingFrom/scale)
			a, z = min(max(a, lo), hi), max(min(z, hi), lo)
		}
		w.wing(w.tau, peak, damping, scale, centre, lo, a)
		w.wing(w.tau, peak, damping, scale, centre, z, hi)
		off := v / c.B
		u, h, hu, ha := w.u, w.h, w.hu, w.ha
		for j := a; j < z; j++ {
			u[j] = (w.grid.sub[j]-l.Wave)*scale - off
		}
		if !slopes {
			voigt.Fill(h[a:z], nil, nil, damping, u[a:z])
			floats.AddScaled(w.tau[a:z], peak, h[a:z])
			continue
		}
		voigt.Fill(h[a:z], hu[a:z], ha[a:z], damping, u[a:z])
		floats.AddScaled(w.tau[a:z], peak, h[a:z])
		from, to := w.grid.index(centre-inner/scale), w.grid.index(centre+inner/scale)
		vFrom, vTo := w.grid.index(centre-core/scale), w.grid.index(centre+core/scale)
		w.wingSlopes(damping, scale, centre, min(from, vFrom), min(a, max(to, vTo)))
		w.wingSlopes(damping, scale, centre, max(z, min(from, vFrom)), max(to, vTo))
		if from < to {
			for _, t := range c.dn {
				floats.AddScaled(w.slopeOf(t.j).open(from, to), t.k*part.Strength*dn, h[from:to])
			}
		}
		if vFrom >= vTo {
			continue
		}
		from, to = vFrom, vTo
		h, hu, ha, u = h[from:to], hu[from:to], ha[from:to], u[from:to]
		for _, t := range c.dv {
			floats.AddScaled(w.slopeOf(t.j).open(from, to), -t.k*peak/c.B, hu)
		}
		for _, t := range w.zeroAt {
			floats.AddScaled(w.slopeOf(t.j).open(from, to), -t.k*peak/c.B, hu)
		}
		for _, t := range c.db {
			k := -t.k * peak / c.B
			dst := w.slopeOf(t.j).open(from, to)
			for j := range dst {
				dst[j] += k * (h[j] + u[j]*hu[j] + damping*ha[j])
			}
		}
	}
}

// Beyond wingFrom Doppler widths, and up to this damping, H is its asymptotic series,
//
//	H = (a/√π) t (1 + 3/2 t + 15/4 t² + 105/8 t³ + 945/16 t⁴ + …),  t = 1/(u² + a²),
//
// the real part of that of w(z) (DLMF 7.12.1) with terms of a²t² left out: at u = 8 it
// is good to 1e-6 of itself, which there is below 1e-3 of H at the centre.
const (
	wingFrom    = 8
	wingDamping = 0.1

	wing1 = 3.0 / 2
	wing2 = 15.0 / 4
	wing3 = 105.0 / 8
	wing4 = 945.0 / 16
)

// wing adds the optical depth of a wing for lo ≤ j < hi.
func (w *window) wing(tau []float64, peak, a, scale, centre float64, lo, hi int) {
	if lo >= hi {
		return
	}
	k, aa := peak*a/math.SqrtPi, a*a
	sub := w.grid.sub[lo:hi]
	tau = tau[lo:hi][:len(sub)]
	for j, x := range sub {
		u := (x - centre) * scale
		t := 1 / (u*u + aa)
		tau[j] += k * t * (1 + t*(wing1+t*(wing2+t*(wing3+t*wing4))))
	}
}

// wingSlopes sets u, H and its derivatives for lo ≤ j < hi in a wing.
func (w *window) wingSlopes(a, scale, centre float64, lo, hi int) {
	k, aa := a/math.SqrtPi, a*a
	for j := lo; j < hi; j++ {
		u := (w.grid.sub[j] - centre) * scale
		t := 1 / (u*u + aa)
		h := t * (1 + t*(wing1+t*(wing2+t*(wing3+t*wing4))))
		w.u[j], w.h[j], w.ha[j] = u, k*h, h/math.SqrtPi
		w.hu[j] = -2 * u * k * t * t * (1 + t*(2*wing1+t*(3*wing2+t*(4*wing3+t*5*wing4))))
	}
}

// slopeOf returns the derivative buffer of free parameter j.
func (w *window) slopeOf(j int) *stretch {
	for i, c := range w.cols {
		if c == j {
			return &w.slope[i]
		}
	}
	panic("clouds: a parameter without a column")
}

// extent returns the |u| beyond which H(a, u) stays below y: where the Gaussian and
// where the Lorentz wing a/(√π u²) fall below it, and a little further.
func extent(a, y float64) float64 {
	u := 0.0
	if y < 1 {
		u = math.Sqrt(-math.Log(y))
	}
	if y > 0 {
		u = max(u, math.Sqrt(a/(math.Sqrt(math.Pi)*y)))
	}
	return u + 0.3
}

// slopeExtent returns the |u| beyond which H_u, and with it H + uH_u + aH_a, stays below y:
// 2u exp(−u²) of the Gaussian, 2a/(√π u³) of the wing.
func slopeExtent(a, y float64) float64 {
	u := 1.0
	if y < 1 {
		u = math.Sqrt(-math.Log(y)) + 0.4
	}
	if y > 0 {
		u = max(u, math.Cbrt(2*a/(math.SqrtPi*y)))
	}
	return u + 0.3
}

// project solves for the linear parameters and sets r (a row each) to the residuals
// that they leave. It reports false where they cannot be found.
func (w *window) project(r []float64) bool {
	n := len(w.pix)
	w.columns()
	w.lost = false
	copy(r, w.data)
	if w.deg == NoContinuum { // the part without linear parameters
		for i, t := range w.flux {
			r[i] = w.fixedPart(t) * w.inv[i]
		}
		w.noise.whiten(r[:n], 1)
		for i := range n {
			r[i] = w.data[i] - r[i]
		}
	}
	if w.k > 0 {
		if w.proj.Factor(w.a) != nil {
			w.lost = true
			return false
		}
		w.proj.Coef(w.lin, r)
		w.proj.Residuals(r)
	}
	return true
}

// fixedPart is the model of a normalised window less its free zero level, for
// transmission t.
func (w *window) fixedPart(t float64) float64 {
	if w.zeroCol < 0 {
		return (t + w.knownZ) / (1 + w.knownZ)
	}
	return t
}

// columns fills the matrix of the linear parameters: F P_k for the continuum, and the
// zero level, which is one constant flux, or 1 − F where the continuum is known
// (added light z raises F to (F + z)/(1 + z), and z/(1 + z) is the parameter).
func (w *window) columns() {
	if w.k == 0 {
		return
	}
	a := w.a.RawMatrix()
	p := w.deg + 1
	n := len(w.pix)
	for i, t := range w.flux {
		row := a.Data[i*a.Stride : i*a.Stride+w.k]
		for k, b := range w.basis[i*p : (i+1)*p] {
			row[k] = (t + w.knownZ) * b
		}
		if w.zeroCol >= 0 {
			row[w.zeroCol] = w.inv[i]
			if p == 0 {
				row[w.zeroCol] *= 1 - t
			}
		}
	}
	w.noise.whiten(a.Data[:n*w.k], w.k)
	if w.zeroRow {
		row := a.Data[n*a.Stride : n*a.Stride+w.k]
		clear(row)
		mean, sigma := w.in.Zero, w.in.ZeroErr
		if p > 0 { // flux z' with the mean level c₀: (z' − Zero c₀)/(ZeroErr) in units of the mean flux
			row[0], row[w.zeroCol] = -mean/sigma, 1/sigma
		} else { // dz/dζ = (1 + z)²
			row[w.zeroCol] = (1 + mean) * (1 + mean) / sigma
		}
	}
}

// continuum returns the continuum over σ of row i.
func (w *window) continuum(i int) float64 {
	p := w.deg + 1
	if p == 0 {
		if w.zeroCol >= 0 {
			return (1 - w.lin[w.zeroCol]) * w.inv[i]
		}
		return w.inv[i] / (1 + w.knownZ)
	}
	return floats.Dot(w.lin[:p], w.basis[i*p:(i+1)*p])
}

// derivatives fills d with −∂(model/σ)/∂x, whitened.
func (w *window) derivatives() {
	raw := w.d.RawMatrix()
	clear(raw.Data)
	if len(w.cols) == 0 {
		return
	}
	for col := range w.cols {
		s := &w.slope[col]
		if s.lo == s.hi {
			continue
		}
		y := s.y[s.lo:s.hi]
		floats.Mul(y, w.trans[s.lo:s.hi])
		first, last := w.grid.seeing(s.lo, s.hi)
		for i := first; i < last; i++ {
			at := w.grid.first[i]
			lo, hi := max(s.lo, at+w.grid.trim[i][0]), min(s.hi, at+w.grid.trim[i][1])
			if lo < hi {
				raw.Data[i*raw.Stride+col] = floats.Dot(w.grid.weight[i][lo-at:hi-at], s.y[lo:hi])
			}
		}
	}
	if w.width >= 0 {
		for i, wt := range w.grid.slope {
			first := w.grid.first[i]
			raw.Data[i*raw.Stride+w.width] -= floats.Dot(wt, w.trans[first:first+len(wt)])
		}
	}
	n := len(w.pix)
	for i := range n {
		floats.Scale(w.continuum(i), raw.Data[i*raw.Stride:i*raw.Stride+raw.Cols])
	}
	w.noise.whiten(raw.Data[:n*raw.Cols], raw.Cols)
}

// peakTau is the optical depth at the centre of a line without structure.
func peakTau(l *atomic.Line, n, b float64) float64 { return voigt.Tau0(n, l.F, l.Wave, b) }
