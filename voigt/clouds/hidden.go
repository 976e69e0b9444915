package clouds

import (
	"math"

	"lacuna/budget"
)

// hidden widens the columns of a search by what one more cloud could hide. Clouds that
// the instrument does not resolve cost no χ², so no criterion that counts clouds sees
// them; yet in saturated lines they hide column. So the cloud that holds most of a column
// gets a narrow companion, without a column at first, and the profile likelihood of the
// column is taken with that (Δχ² = 1 above its own minimum, which is no higher): the
// interval holds what either number of clouds allows. Where all lines are thin nothing
// can hide, and the interval is that of the fit.
func (h *hunt) hidden(out *Found, best *Solution) error {
	if len(best.clouds) == 0 || len(best.clouds) >= h.max() {
		return nil
	}
	c := companions{h: h, best: best, fit: map[int]companion{}}
	for k := range out.Totals {
		t := &out.Totals[k]
		if err := c.allow(&t.N, &t.LogN, t.Carrier, everything); err != nil {
			return err
		}
	}
	for g := range out.Ranges {
		for k := range out.Ranges[g].Columns {
			q := &out.Ranges[g].Columns[k]
			if out.Ranges[g].V == everything {
				q.N, q.LogN = out.Totals[k].N, out.Totals[k].LogN
				continue
			}
			if err := c.allow(&q.N, &q.LogN, q.Carrier, out.Ranges[g].V); err != nil {
				return err
			}
		}
	}
	return nil
}

// companions are the fits with one more cloud, by the cloud that it accompanies.
type companions struct {
	h    *hunt
	best *Solution
	fit  map[int]companion
}

type companion struct {
	f    *Fitter
	r    Result
	ok   bool
	v, b float64 // its start, km/s
}

// seed returns the start that puts into the companion what a column of 10^y lacks.
func (c companion) seed(carrier string, in [2]float64) func(y float64) []float64 {
	f := c.f
	for i := range f.comps {
		d := &f.comps[i]
		cl := f.in.Clouds[d.cloud]
		if d.carrier != carrier || cl.V.Start != c.v || cl.B.Start != c.b || d.linear || d.boltz || len(d.n.terms) != 1 || d.n.terms[0].k != 1 {
			continue
		}
		return func(y float64) []float64 {
			for k := range f.comps {
				f.comps[k].set(c.r.X)
			}
			part, _, _ := inside(in, d.V, d.B)
			lack := math.Pow(10, y) - f.columnIn(carrier, in, nil) + part*d.N
			if !(lack > 0) || !(part > 0.1) {
				return nil
			}
			x := append([]float64(nil), c.r.X...)
			j := d.n.terms[0].j
			x[j] = min(max(math.Log10(lack/part)-d.n.add, f.lo[j]), f.hi[j])
			return x
		}
	}
	return nil
}

// deepest returns the cloud with the largest column of a carrier in a range among those
// that are not thin; −1 if there is none.
func (c *companions) deepest(carrier string, in [2]float64) int {
	at, most := -1, 0.0
	for i, cl := range c.best.result.Clouds {
		for _, s := range cl.Species {
			if s.Carrier != carrier || !(s.Tau0 > thinTau) {
				continue
			}
			part, _, _ := inside(in, c.best.clouds[i].V.Start, max(c.best.clouds[i].B.Start, 0.1))
			if n := part * c.best.clouds[i].column() * min(s.Tau0, 10); n > most {
				at, most = i, n
			}
		}
	}
	return at
}

// with fits the companion of cloud i.
func (c *companions) with(i int) (companion, error) {
	if got, ok := c.fit[i]; ok {
		return got, nil
	}
	extra := c.h.move(c.best.clouds[i], 0, 0.4, 0.01)
	cs := append(append([]Cloud(nil), c.best.clouds...), extra)
	f, err := c.h.fitter(cs, c.best.shared)
	if err != nil {
		return companion{}, err
	}
	f.tol, f.slow = 0.01, 0.1
	s, err := f.minimise(f.start, f.lo, f.hi)
	got := companion{f: f, v: extra.V.Start, b: extra.B.Start}
	if err == nil {
		got.r = f.result(s)
		got.ok = got.r.Chi2 < c.best.Chi2+0.5
	}
	c.fit[i] = got
	return got, nil
}

// allow widens a column by its profile with a companion.
func (c *companions) allow(n, logN *budget.Number, carrier string, in [2]float64) error {
	i := c.deepest(carrier, in)
	if i < 0 || logN.Kind() != "value" || !(n.X > 0) {
		return nil
	}
	more, err := c.with(i)
	if err != nil || !more.ok {
		return err
	}
	f, r := more.f, more.r
	for i := range f.comps {
		f.comps[i].set(r.X)
	}
	t := target{free: -1, carrier: carrier, in: in, logs: true}
	x := f.value(t, r.X, nil)
	if !finite(x) {
		return nil
	}
	stat := logN.Without(budget.FValue, budget.Structure)
	p := profile{f: f, t: t, base: r.Chi2, best: r.X, sigma: min(max(stat, 1e-3), 0.3), close: 0.05}
	p.seed = more.seed(carrier, in)
	var side [2]float64 // how far the interval reaches from logN, down and up
	for k, dir := range []float64{-1, 1} {
		end, open, err := p.edge(x, r.X, 1, dir)
		if err != nil {
			return err
		}
		side[k] = max(0, dir*(end-logN.X))
		if open {
			side[k] = math.Inf(1)
		}
	}
	fv := logN.ErrBy(budget.FValue)
	down, up := max(logN.ErrLo(), math.Hypot(side[0], fv)), max(logN.ErrUp(), math.Hypot(side[1], fv))
	was := logN.Err()
	most := was
	for _, s := range []float64{down, up} {
		if finite(s) {
			most = max(most, s)
		}
	}
	if !(most > 1.05*was) && finite(up) && finite(down) {
		return nil
	}
	if most > was {
		*logN = logN.Add(budget.Shift{Cause: budget.Structure, D: math.Sqrt(most*most - was*was)})
	}
	logN.Up, logN.Lo = up, down
	if !(up < hiddenDex) {
		*logN = logN.With(budget.Saturated)
	}
	*n = budget.Pow10(*logN)
	return nil
}

// A column that may be larger by so much without a trace in χ² counts as saturated.
const hiddenDex = 0.3
