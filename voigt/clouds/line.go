package clouds

import (
	"math"

	"gonum.org/v1/gonum/floats"

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

// peakTau is the optical depth at the centre of a line without structure.
func peakTau(l *atomic.Line, n, b float64) float64 { return voigt.Tau0(n, l.F, l.Wave, b) }
