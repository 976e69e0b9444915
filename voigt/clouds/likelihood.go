package clouds

import (
	"math"
	"slices"
	"strings"

	"lacuna/budget"
)

// An Interval is where χ², minimised over all else, lies less than Delta above its
// minimum: with Delta 1 the 68.27 % interval of one number, with 3.84 that of 95 %
// (Wilks 1938, Ann. Math. Stat. 9, 60; from memory), whether or not the errors are
// symmetric.
type Interval struct {
	Name   string  `json:"name"`
	X      float64 `json:"x"` // at the minimum
	Lo, Hi float64
	// No end was found before the bounds of the parameter, or before the fit could
	// follow no further: Lo and Hi are then as far as it came.
	OpenLo bool    `json:"open_lo,omitempty"`
	OpenHi bool    `json:"open_hi,omitempty"`
	Delta  float64 `json:"delta"`
	// Lower is by how much χ² fell below the minimum on the way: above 0.1 the fit was in a
	// local minimum, and BestX is the place of the lower one.
	Lower float64   `json:"lower,omitempty"`
	BestX []float64 `json:"-"`
}

// A target is a function of the parameters that a profile runs along: a parameter, or
// the column of a carrier over all clouds.
type target struct {
	free    int        // index of the free parameter; −1
	carrier string     // of a column
	in      [2]float64 // km/s, of the column
	logs    bool       // in log₁₀
}

// A hold is the row that keeps a target in its place during a fit.
type hold struct {
	of     target
	at     float64
	weight float64
	grad   []float64
}

// TotalName is the name by which Profile knows the column of a carrier over all clouds
// ("log N total(Na I)").
func TotalName(carrier string) string { return "log N total(" + carrier + ")" }

// find returns the target of a name.
func (f *Fitter) target(name string) (target, error) {
	if i, ok := f.params.byName[name]; ok {
		if f.params.all[i].free < 0 {
			return target{}, bad(name, "take the parameter that it follows", "not a free parameter")
		}
		return target{free: f.params.all[i].free}, nil
	}
	if c, ok := strings.CutPrefix(name, "log N total("); ok {
		c = strings.TrimSuffix(c, ")")
		for i := range f.comps {
			if f.comps[i].carrier == c {
				return target{free: -1, carrier: c, in: everything, logs: true}, nil
			}
		}
	}
	_, err := f.params.find(name, -1, "profile")
	return target{}, err
}

// value returns the target at the current point of the comps; grad, if not nil, gets
// its gradient.
func (f *Fitter) value(t target, x, grad []float64) float64 {
	if t.free >= 0 {
		return x[t.free]
	}
	sum := f.columnIn(t.carrier, t.in, grad)
	if !t.logs {
		return sum
	}
	for j := range grad {
		grad[j] /= sum * math.Ln10
	}
	return math.Log10(sum)
}

// Profile finds the interval of a free parameter, or of a total (TotalName), about the
// result r of this fitter.
func (f *Fitter) Profile(r Result, name string, delta float64) (Interval, error) {
	if !(delta > 0) {
		return Interval{}, bad(name, "give a Δχ² such as 1, 3.84 or 9", "Δχ² of %g", delta)
	}
	t, err := f.target(name)
	if err != nil {
		return Interval{}, err
	}
	for i := range f.comps {
		f.comps[i].set(r.X)
	}
	p := profile{f: f, t: t, base: r.Chi2, best: r.X}
	out := Interval{Name: name, X: f.value(t, r.X, nil), Delta: delta}
	p.sigma = f.sigma(r, t)
	out.Hi, out.OpenHi, err = p.edge(out.X, r.X, delta, +1)
	if err != nil {
		return out, err
	}
	out.Lo, out.OpenLo, err = p.edge(out.X, r.X, delta, -1)
	if err != nil {
		return out, err
	}
	if d := r.Chi2 - p.base; d > 0.1 {
		out.Lower, out.BestX = d, p.best
	}
	return out, nil
}

// sigma is the linear error of a target, or a guess where there is none.
func (f *Fitter) sigma(r Result, t target) float64 {
	g := make([]float64, r.a.n)
	guess := 0.1
	if t.free >= 0 {
		g[t.free] = 1
		if w := f.hi[t.free] - f.lo[t.free]; finite(w) {
			guess = w / 50
		} else {
			guess = 0.1 * max(math.Abs(r.X[t.free]), 1e-3)
		}
	} else {
		f.value(t, r.X, g)
	}
	s := math.Sqrt(max(0, r.a.covariance(g, g)))
	if s == 0 || !r.a.determined(g) {
		return guess
	}
	return s
}

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

// UpperLimit returns the upper limit of the column of a Linear species in one cloud, or
// with cloud "" over all clouds: the N at which χ² lies sigma² above its lowest value
// for N ≥ 0 (3: "3σ"), v, b and everything else following. N ± σ stands behind it.
func (f *Fitter) UpperLimit(r Result, cloud, carrier string, sigma float64) (budget.Number, error) {
	var n budget.Number
	t := target{free: -1, carrier: carrier, in: everything}
	if cloud == "" {
		found := false
		for _, q := range r.Totals {
			if q.Carrier == carrier {
				n, found = q.N, true
			}
		}
		if !found {
			return n, bad(carrier, "name a species of the fit", "no column of it")
		}
	} else {
		name := cloud + ": " + columnName(Species{Carrier: carrier, Linear: true})
		i, ok := f.params.byName[name]
		if !ok || f.params.all[i].free < 0 {
			return n, bad(name, "make the species Linear, with a free column", "no such parameter")
		}
		t.free = f.params.all[i].free
		for _, c := range r.Clouds {
			for _, s := range c.Species {
				if c.Name == cloud && s.Carrier == carrier {
					n = s.N
				}
			}
		}
	}
	p := profile{f: f, t: t, base: r.Chi2, best: r.X, sigma: f.sigma(r, t)}
	x := slices.Clone(r.X)
	from := n.X
	delta := sigma * sigma
	if !(from > 0) {
		from = 0
		c, err := p.chi2(0, &x)
		if err != nil {
			return n, err
		}
		delta += c - r.Chi2
	}
	up, open, err := p.edge(from, x, delta, +1)
	if err != nil {
		return n, err
	}
	out := budget.Limit(n, up, sigma)
	if open {
		out.X = math.NaN()
	}
	return out, nil
}

// Asymmetric replaces, in r, the symmetric errors of columns by those of their profile
// likelihood (Δχ² = 1) where a parabola is a poor guide: saturated lines, errors above
// 0.1 dex, and columns and b that trade against each other. An end that is not found
// makes the error there +Inf. Errors of the strengths of lines, which are not in χ², are
// added in quadrature.
func (f *Fitter) Asymmetric(r *Result) error {
	for i := range r.Clouds {
		for j := range r.Clouds[i].Species {
			s := &r.Clouds[i].Species[j]
			name := r.Clouds[i].Name + ": log N(" + s.Carrier + ")"
			k, ok := f.params.byName[name]
			if !ok || f.params.all[k].free < 0 || math.IsNaN(s.LogN.X) {
				continue
			}
			if !s.LogN.Is(budget.Saturated) && s.LogN.Err() < 0.1 && math.Abs(s.CorrNB) < 0.9 {
				continue
			}
			iv, err := f.Profile(*r, name, 1)
			if err != nil {
				return err
			}
			s.LogN = iv.onto(s.LogN)
			s.N = budget.Pow10(s.LogN)
		}
	}
	for i := range r.Totals {
		t := &r.Totals[i]
		if t.LogN.Kind() != "value" || !t.LogN.Is(budget.Saturated) && t.LogN.Err() < 0.1 {
			continue
		}
		iv, err := f.Profile(*r, TotalName(t.Carrier), 1)
		if err != nil {
			return err
		}
		t.LogN = iv.onto(t.LogN)
		t.N = budget.Pow10(t.LogN)
	}
	return nil
}

// onto puts an interval into a number.
func (iv Interval) onto(n budget.Number) budget.Number {
	f := n.ErrBy(budget.FValue)
	n.Up, n.Lo = math.Hypot(iv.Hi-iv.X, f), math.Hypot(iv.X-iv.Lo, f)
	if iv.OpenHi {
		n.Up = math.Inf(1)
	}
	if iv.OpenLo {
		n.Lo = math.Inf(1)
	}
	return n
}
