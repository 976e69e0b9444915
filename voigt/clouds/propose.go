package clouds

import (
	"cmp"
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"

	"lacuna/atomic"
)

// A proposal is a cloud that the residuals ask for.
type proposal struct {
	v, b float64            // km/s
	n    map[string]float64 // cm⁻² of each carrier, to first order
	gain float64            // fall of χ², to first order
}

// scan tries weak clouds over the range of velocities with three Doppler parameters
// each, and returns the best two places. For the columns g of the species of a trial
// cloud, projected on what the parameters of the fit cannot do,
//
//	N = gᵀr/gᵀg,  Δχ² = (gᵀr)²/gᵀg,
//
// N below 0 left out (the score test of Rao 1948, Proc. Camb. Phil. Soc. 44, 50; from
// memory).
func (f *Fitter) scan(r Result, s *Search) []proposal {
	a := r.a
	for i := range f.comps {
		f.comps[i].set(r.X)
	}
	m := 0
	var res []float64
	fwhm := math.Inf(1)
	for _, w := range f.wins {
		w.absorption(f.comps, r.X, false)
		w.project(w.resid)
		res = append(res, w.resid...)
		m += w.rows()
		fwhm = min(fwhm, w.grid.fwhm)
	}
	for range f.priors {
		res = append(res, 0) // at the minimum their pull is balanced by the data's
	}
	m += len(f.priors)
	bInst := fwhm / (2 * math.Sqrt(math.Ln2))
	var bs []float64
	for _, k := range []float64{0.4, 1, 2.5} {
		b := k * bInst
		if p := s.Like.B; p.Hi > 0 && !s.Like.Thermal {
			b = min(max(b, p.Lo), p.Hi)
		}
		if len(bs) == 0 || b != bs[len(bs)-1] {
			bs = append(bs, b)
		}
	}
	step := max(fwhm/4, (s.V[1]-s.V[0])/2000)
	g := make([]float64, m)
	var all [][]proposal // of each b, along v
	for _, b := range bs {
		var line []proposal
		for v := s.V[0] + step/2; v < s.V[1]; v += step {
			p := proposal{v: v, b: b, n: map[string]float64{}}
			for _, sp := range s.Like.Species {
				f.trial(g, sp.Carrier, v, b)
				whole := floats.Dot(g, g)
				gr := floats.Dot(g, res)
				if whole == 0 || gr <= 0 {
					continue
				}
				a.outside(g)
				if gg := floats.Dot(g, g); gg > 0.02*whole {
					p.n[sp.Carrier] = gr / gg
					p.gain += gr * gr / gg
				}
			}
			line = append(line, p)
		}
		all = append(all, line)
	}
	// Local maxima over v, the best b at each.
	var out []proposal
	for i := range all[0] {
		top := func(i int) proposal {
			best := proposal{}
			if i >= 0 && i < len(all[0]) {
				for _, line := range all {
					if line[i].gain > best.gain {
						best = line[i]
					}
				}
			}
			return best
		}
		p := top(i)
		if p.gain > 2 && p.gain >= top(i-1).gain && p.gain > top(i+1).gain {
			out = append(out, p)
		}
	}
	slices.SortStableFunc(out, func(p, q proposal) int { return -cmp.Compare(p.gain, q.gain) })
	return out[:min(2, len(out))]
}

// trial sets g to ∂(model/σ)/∂N of a cloud that is not there, whitened, continuum fixed.
func (f *Fitter) trial(g []float64, carrier string, v, b float64) {
	clear(g)
	at := 0
	for _, w := range f.wins {
		rows := w.rows()
		found := false
		clear(w.tau)
		for i := range w.in.Lines {
			l := &w.in.Lines[i]
			if l.Carrier() != carrier {
				continue
			}
			one := absorber{line: l, parts: l.Within(0.1 * b)}
			c := comp{V: v, B: b, N: 1e10}
			w.line(&one, &c, false)
			found = true
		}
		if found {
			floats.Mul(w.tau, w.trans)
			col := g[at : at+len(w.pix)]
			for r, wt := range w.grid.weight {
				first := w.grid.first[r]
				col[r] = -w.continuum(r) * floats.Dot(wt, w.tau[first:first+len(wt)]) * 1e-10
			}
			w.noise.whiten(col, 1)
		}
		at += rows
	}
}

// outside takes from g what lies in the space of the design matrix.
func (a *analysis) outside(g []float64) {
	if a.basis == nil {
		return
	}
	_, p := a.basis.Dims()
	x, y := mat.NewVecDense(len(g), g), mat.NewVecDense(p, nil)
	y.MulVec(a.basis.T(), x)
	var back mat.VecDense
	back.MulVec(a.basis, y)
	x.SubVec(x, &back)
}

// worst returns the clouds about which the residuals are largest: up to two.
func (s *Solution) worst() []int {
	type rank struct {
		i int
		x float64
	}
	f := s.fitter
	var list []rank
	for i, c := range s.clouds {
		sum, n := 0.0, 0.0
		for _, w := range f.wins {
			res := w.residuals()
			for _, a := range w.absorb {
				d := &f.comps[a.comp]
				if math.Abs(d.V-c.V.Start) > 1e-9 {
					continue
				}
				reach := (math.Abs(d.B) + w.grid.fwhm) * a.line.Wave / atomic.C
				centre := a.line.Wave * (1 + d.V/atomic.C)
				for k, p := range w.pix {
					if math.Abs(w.in.Wave[p]-centre) < reach {
						sum += res[k] * res[k]
						n++
					}
				}
			}
		}
		if n > 0 {
			list = append(list, rank{i, sum - n})
		}
	}
	slices.SortStableFunc(list, func(a, b rank) int { return -cmp.Compare(a.x, b.x) })
	var out []int
	for _, r := range list[:min(2, len(list))] {
		out = append(out, r.i)
	}
	return out
}
