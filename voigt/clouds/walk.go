package clouds

import (
	"math"
	"slices"
)

// A profile is a walk along a target.
type profile struct {
	f     *Fitter
	t     target
	sigma float64
	base  float64 // lowest χ² so far
	best  []float64
	close float64 // how near √Δχ² shall come, relative; 0: 0.005
	// Another start for the target at y, beside the last point of the walk; nil: none.
	seed func(y float64) []float64
}

// chi2 fits everything else with the target at y, from x, which it moves.
func (p *profile) chi2(y float64, x *[]float64) (float64, error) {
	f := p.f
	lo, hi := slices.Clone(f.lo), slices.Clone(f.hi)
	start := slices.Clone(*x)
	if p.t.free >= 0 {
		lo[p.t.free], hi[p.t.free], start[p.t.free] = y, y, y
	} else {
		f.hold = &hold{of: p.t, at: y, weight: 1e3 / p.sigma, grad: make([]float64, len(start))}
		defer func() { f.hold = nil }()
	}
	s, err := f.minimise(start, lo, hi)
	if err != nil {
		return 0, err
	}
	free := func(x []float64) float64 { // χ² without the row that holds the target
		h := f.hold
		f.hold = nil
		c := f.chi2(x)
		f.hold = h
		return c
	}
	c := free(s.x)
	if p.seed != nil {
		if start := p.seed(y); start != nil {
			if t, err := f.minimise(start, lo, hi); err == nil {
				if d := free(t.x); d < c {
					s, c = t, d
				}
			}
		}
	}
	*x = s.x
	if c < p.base {
		p.base, p.best = c, s.x
	}
	return c, nil
}

// edge looks for the end of the interval in one direction.
func (p *profile) edge(y0 float64, x0 []float64, delta float64, dir float64) (float64, bool, error) {
	f := p.f
	limit := math.Inf(int(dir))
	if j := p.t.free; j >= 0 {
		limit = f.hi[j]
		if dir < 0 {
			limit = f.lo[j]
		}
	}
	if y0 == limit {
		return y0, true, nil
	}
	x := slices.Clone(x0)
	// √Δχ² is nearly linear in y: walk on until it passes √delta, then close in.
	want := math.Sqrt(delta)
	tol := p.close * want
	if tol == 0 {
		tol = 5e-3 * want
	}
	root := func(c float64) float64 { return math.Sqrt(max(0, c-p.base)) }
	in, fin := y0, 0.0
	out, fout := 0.0, 0.0
	step := p.sigma * want
	found := false
	for range 25 {
		y := in + dir*step
		if dir*(y-limit) >= 0 {
			y = limit
		}
		c, err := p.chi2(y, &x)
		if err != nil {
			return 0, false, err
		}
		g := root(c)
		if math.IsNaN(g) {
			return in, true, nil
		}
		if g >= want {
			out, fout, found = y, g, true
			break
		}
		if y == limit {
			return limit, true, nil
		}
		// aim a little beyond the crossing, at most four times as far
		slope := (g - fin) / math.Abs(y-in)
		in, fin = y, g
		step = 1.3 * (want - g) / max(slope, 1e-300)
		step = min(max(step, 0.1*p.sigma*want), 4*math.Abs(y-y0))
	}
	if !found {
		return in, true, nil
	}
	for range 20 {
		if fout-want < tol || math.Abs(out-in) < 1e-3*math.Abs(out-y0) {
			break
		}
		y := in + (out-in)*min(max((want-fin)/(fout-fin), 0.05), 0.95)
		c, err := p.chi2(y, &x)
		if err != nil {
			return 0, false, err
		}
		g := root(c)
		if g >= want {
			out, fout = y, g
		} else {
			in, fin = y, g
			if want-g < tol {
				return y, false, nil
			}
		}
	}
	return out, false, nil
}
