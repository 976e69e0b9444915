package clouds

import (
	"math"
	"slices"

	"lacuna/atomic"
)

// A density says how many sub-grid points there are per unit of ln λ: far points
// everywhere, for the instrument, and more about each narrow line,
//
//	ρ(x) = [ far⁴ + Σ near_k⁴/(1 + ((x − x_k)/Z_k)⁴)⁴ ]^¼.
//
// It is smooth, so that the points s(x) = ∫ρ dx at whole s, each with the weight 1/ρ, sum
// any smooth function as fast converging as an even grid does (the trapezoidal rule after
// a change of variable).
type density struct {
	far   float64
	bumps []bump
}

type bump struct{ x, near, zone float64 }

func (d *density) at(x float64) float64 {
	f := d.far * d.far
	sum := f * f
	for _, b := range d.bumps {
		t := (x - b.x) / b.zone
		t *= t
		r := b.near / (1 + t*t)
		r *= r
		sum += r * r
	}
	return math.Sqrt(math.Sqrt(sum))
}

// even returns the number of points of an even grid as dense as the densest place, and
// about the number of those of the uneven one.
func (d *density) even(span float64) (even, uneven float64) {
	most := d.far
	uneven = d.far * span
	for _, b := range d.bumps {
		most = max(most, b.near)
		uneven += math.Pi / math.Sqrt2 * b.near * b.zone
	}
	return most * span, uneven
}

// points lays the points from ln λ = lo past hi, by the Runge–Kutta rule of fourth order
// for dx/ds = 1/ρ, two steps a point. It returns wavelengths and the steps they stand for.
func (d *density) points(lo, hi float64) (sub, step []float64) {
	const h = 0.5
	for x := lo; ; {
		w := math.Exp(x)
		sub, step = append(sub, w), append(step, w/d.at(x))
		if x > hi {
			return sub, step
		}
		for range 2 {
			k1 := 1 / d.at(x)
			k2 := 1 / d.at(x+h/2*k1)
			k3 := 1 / d.at(x+h/2*k2)
			k4 := 1 / d.at(x+h*k3)
			x += h / 6 * (k1 + 2*k2 + 2*k3 + k4)
		}
	}
}

// A core is a line of a cloud that the sub-grid must resolve.
type core struct {
	x     float64 // ln λ of its centre
	b     float64 // km/s
	reach float64 // how far its τ is not small, in b
}

// cores lists those of a window at the current point, those that coincide but once.
func (w *window) cores(comps []comp) []core {
	var out []core
	for i := range w.absorb {
		a := &w.absorb[i]
		c := &comps[a.comp]
		if !(c.B > 0) {
			continue
		}
		tau := math.Abs(peakTau(a.line, c.N, c.B))
		if tau == 0 {
			continue
		}
		reach := max(2.3, 0.5*math.Ceil(2*math.Sqrt(math.Log(max(tau, 1)))+1.4))
		for _, p := range a.line.Within(0.5 * c.B) {
			k := core{math.Log(a.line.Wave * (1 + (c.V+w.shift+p.DV)/atomic.C)), c.B, reach}
			if !slices.ContainsFunc(out, k.like) {
				out = append(out, k)
			}
		}
	}
	return out
}

// like reports whether another core asks for nearly the same points and as many.
func (k core) like(o core) bool {
	return math.Abs(k.x-o.x) < 0.05*k.b/atomic.C && math.Abs(k.b/o.b-1) < 0.05 && k.reach <= o.reach
}

// covers reports whether a density still resolves a core: at its ends as well, with
// part of the points that it was made with.
func (d *density) covers(c core, q float64) bool {
	least := gridLimit * q * atomic.C / c.b
	if d.far >= least {
		return true
	}
	r := c.reach * c.b / atomic.C
	return d.at(c.x-r) >= least && d.at(c.x) >= least && d.at(c.x+r) >= least
}
