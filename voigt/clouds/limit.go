package clouds

import (
	"math"
	"slices"

	"lacuna/budget"
)

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
