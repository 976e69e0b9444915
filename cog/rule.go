package cog

import (
	"math"

	"lacuna/voigt"
)

// A region is what one rule integrates over: mid ± half, in km/s, or in x of a wing
// (side ±1).
type region struct{ half, mid, root, mean, side float64 }

// rule integrates over a region with 16, 32, … 128 points (wings from 8), until the rules have
// converged. d = |Iₙ − Iₙ⁄₂| is the error of Iₙ⁄₂; the next one is smaller by the
// square of the last gain where convergence is geometric. Only the gain itself is
// counted on, because the change from the Gaussian to its wing may slow it down.
func (p *profile) rule(r region, times float64) (sum, bool) {
	k := 1
	if r.side != 0 {
		k = 0 // wings are smoother
	}
	step := maxNodes >> (3 + k)
	p.fill(r, 0, step)
	last, gain := p.weighted(k, r.half), 1.
	d := math.Inf(1)
	for {
		p.fill(r, step/2, step)
		step /= 2
		k++
		s := p.weighted(k, r.half)
		was := d
		d = math.Abs(s.w-last.w) * times
		if !math.IsInf(was, 1) {
			gain = math.Min(d/was, 1)
		}
		if !(d*gain > tolerance*(p.total+times*s.w)) {
			return s, true
		}
		if k == len(ccWeight)-1 {
			return s, false
		}
		last = s
	}
}

// weighted applies rule k to the values at hand.
func (p *profile) weighted(k int, half float64) sum {
	var s sum
	step := maxNodes >> (3 + k)
	for i, w := range ccWeight[k] {
		s.w += w * p.f[0][i*step]
	}
	s.w *= half
	if p.grad {
		for i, w := range ccWeight[k] {
			s.dlnN += w * p.f[1][i*step]
			s.db += w * p.f[2][i*step]
		}
		s.dlnN *= half
		s.db *= half
	}
	return s
}

// fill computes the integrands at nodes j0, j0+step, …
func (p *profile) fill(r region, j0, step int) {
	n := 0
	for j := j0; j <= maxNodes; j += step { // v ascends
		switch {
		case r.side == 0:
			p.v[n] = r.mid - r.half*ccNode[j]
		case r.side > 0:
			p.v[n] = r.mean + r.root/math.Max(r.mid+r.half*ccNode[j], tiny)
		default:
			p.v[n] = r.mean - r.root/math.Max(r.mid-r.half*ccNode[j], tiny)
		}
		n++
	}
	p.depth(n)
	b := p.blobs[0].b
	n = 0
	for j := j0; j <= maxNodes; j += step {
		e := math.Expm1(-p.tau[n])
		f := [3]float64{-e, 0, 0}
		if p.grad {
			f[1] = p.tau[n] * (1 + e)
			f[2] = b / 2 * p.dtau[n] * p.dtau[n] * (1 + e)
		}
		if r.side != 0 { // dv = √A dx/x²
			x := r.mid + r.side*r.half*ccNode[j]
			k := r.root / (x * x)
			f[0], f[1], f[2] = f[0]*k, f[1]*k, f[2]*k
			if x <= tiny {
				f = [3]float64{r.root, r.root, 0}
			}
		}
		p.f[0][j], p.f[1][j], p.f[2][j] = f[0], f[1], f[2]
		n++
	}
}

// tiny stands for x = 0, where v is infinite.
const tiny = 1e-12

// depth computes τ and dτ/dv at the first n velocities, which ascend.
func (p *profile) depth(n int) {
	v, u, h, tau := p.v[:n], p.u[:n], p.h[:n], p.tau[:n]
	clear(tau)
	var hu, dtau []float64
	if p.grad {
		hu, dtau = p.hu[:n], p.dtau[:n]
		clear(dtau)
	}
	for i := range p.blobs {
		c := &p.blobs[i]
		for _, q := range p.parts {
			v0 := c.v + q.DV
			for k, x := range v {
				u[k] = (x - v0) / c.b
			}
			voigt.Fill(h, hu, nil, c.a, u)
			t := c.tau0 * q.Strength
			for k, x := range h {
				tau[k] += t * x
			}
			if p.grad {
				t /= c.b
				for k, x := range hu {
					dtau[k] += t * x
				}
			}
		}
	}
}
