package survey

import (
	"fmt"
	"math"
	"slices"

	"lacuna/budget"
	"lacuna/voigt/clouds"
)

// absent finds clouds of which no species is detected and without which χ² is less
// than 9 larger. Their v and b mean nothing: they are held at the starts, one cloud after
// the other, so that of two clouds in the place of one the other remains.
func absent(r *clouds.Result, f *clouds.Fitter, cs, begin []clouds.Cloud, ws []clouds.Window, grid clouds.Options) (*clouds.Fitter, []clouds.Cloud, []string, error) {
	var held []string
	for i := len(cs) - 1; i >= 0; i-- {
		if !unseen(cs[i], *r) || needed(cs, cs[i].Name) {
			continue
		}
		shared := f.SharedAt(r.X)
		with := r.Chi2
		less := slices.Delete(slices.Clone(cs), i, i+1)
		if every(less, cs[i]) || len(less) == 0 { // the others hold all of its species: it can be left out
			p := clouds.Problem{Windows: ws, Clouds: less, Shared: shared}
			if len(less) == 0 {
				p.Shared = nil
			}
			g, err := clouds.New(p, grid)
			if err != nil {
				return nil, nil, nil, err
			}
			without, err := g.Fit()
			if err != nil {
				return nil, nil, nil, err
			}
			if without.Chi2-with > 9 {
				continue
			}
		}
		cs = slices.Clone(cs)
		cs[i] = hold(cs[i], begin[i])
		held = append(held, cs[i].Name)
		g, err := clouds.New(clouds.Problem{Windows: ws, Clouds: cs, Shared: shared}, grid)
		if err != nil {
			return nil, nil, nil, err
		}
		if *r, err = g.Fit(); err != nil {
			return nil, nil, nil, err
		}
		f, cs = g, g.Clouds(r.X)
	}
	return f, cs, held, nil
}

// every reports whether clouds hold all species of another one.
func every(cs []clouds.Cloud, c clouds.Cloud) bool {
	for _, s := range c.Species {
		if !slices.ContainsFunc(cs, func(o clouds.Cloud) bool {
			return slices.ContainsFunc(o.Species, func(q clouds.Species) bool { return q.Carrier == s.Carrier })
		}) {
			return false
		}
	}
	return true
}

// refine makes the columns of undetected species linear, with limits by Δχ², and the
// errors of the others those of their profile likelihood where a parabola is a poor
// guide. Where the likelihood cannot be followed, as when clouds hide behind each other,
// the parabola's errors stay, and words say so.
func refine(r *clouds.Result, f *clouds.Fitter, cs []clouds.Cloud, ws []clouds.Window, held []string, o FitOptions) (*clouds.Fitter, []string, error) {
	sigma := o.Sigma
	conditional := r.Conditional
	notes := r.Notes
	if weak(cs, *r, held) {
		g, err := clouds.New(clouds.Problem{Windows: ws, Clouds: cs, Shared: f.SharedAt(r.X)}, o.grid)
		if err != nil {
			return nil, nil, err
		}
		s, err := g.Fit()
		if err != nil {
			return nil, nil, err
		}
		if s.Converged { // else what was there tells more
			if conditional {
				s.Conditional = true
				s.Notes = append(s.Notes, last(notes)...)
			}
			*r, f = s, g
		}
	}
	var words []string
	for i := range r.Clouds {
		for j := range r.Clouds[i].Species {
			s := &r.Clouds[i].Species[j]
			if _, linear := r.Param(r.Clouds[i].Name + ": N(" + s.Carrier + ")"); !linear || !(s.N.X < sigma*s.N.Err()) {
				continue
			}
			n, err := f.UpperLimit(*r, r.Clouds[i].Name, s.Carrier, sigma)
			if err != nil {
				words = append(words, fmt.Sprintf("%s of %s: the limit is N + %gσ, not from the likelihood (%v)", s.Carrier, r.Clouds[i].Name, sigma, err))
				continue
			}
			if !math.IsNaN(n.X) {
				s.LogN = budget.Log10(n)
			}
		}
	}
	if err := f.Asymmetric(r); err != nil {
		words = append(words, fmt.Sprintf("errors of columns are symmetric, though the likelihood is not: it cannot be followed (%v)", err))
	}
	if err := boundB(r, f, sigma); err != nil {
		words = append(words, fmt.Sprintf("limits of b do not come from the likelihood: it cannot be followed (%v)", err))
	}
	return f, words, nil
}

// boundB gives limits of b their likelihood (Δχ² = sigma²) where the fit stopped at the
// lower bound: a parabola says nothing there.
func boundB(r *clouds.Result, f *clouds.Fitter, sigma float64) error {
	for i := range r.Clouds {
		c := &r.Clouds[i]
		for j := range c.Species {
			s := &c.Species[j]
			if !s.B.Is(budget.Upper | budget.AtBound) {
				continue
			}
			for _, name := range []string{c.Name + ": b(" + s.Carrier + ")", c.Name + ": b"} {
				q, ok := r.Param(name)
				if !ok || !q.Free || q.AtBound >= 0 {
					continue
				}
				iv, err := f.Profile(*r, name, sigma*sigma)
				if err != nil {
					return err
				}
				s.B.X, s.B.Conf = iv.Hi, sigma
				if iv.OpenHi {
					s.B.X = math.NaN()
				}
				break
			}
		}
	}
	return nil
}

// last is the note of an automatic fit on its errors, which is its last.
func last(notes []string) []string {
	if len(notes) == 0 {
		return nil
	}
	return notes[len(notes)-1:]
}

// structure gives totals the structure error of those found with them, where a new fit
// or a profile likelihood has taken their place; in log N, where an error larger than N
// itself is an error upwards, for N is above 0.
func structure(r *clouds.Result, with []clouds.Total) {
	for _, t := range with {
		for i := range r.Totals {
			u := &r.Totals[i]
			d := t.N.ErrBy(budget.Structure)
			if u.Carrier != t.Carrier || !(d > 0) {
				continue
			}
			u.N.Shifts = slices.DeleteFunc(slices.Clone(u.N.Shifts), func(s budget.Shift) bool { return s.Cause == budget.Structure })
			if !(u.N.X > 3*u.N.Without(budget.FValue)) { // not detected: a limit stays one
				u.N = u.N.Add(budget.Shift{Cause: budget.Structure, D: d})
				continue
			}
			if u.LogN.Kind() != "value" || u.LogN.ErrBy(budget.Structure) > 0 {
				u.LogN = budget.Log10(u.N)
			}
			up, lo := math.Log10(1+d/u.N.X), 0.0
			if d < u.N.X {
				lo = -math.Log10(1 - d/u.N.X)
			}
			a, b := u.LogN.ErrUp(), u.LogN.ErrLo()
			u.LogN.Shifts = append(slices.Clone(u.LogN.Shifts), budget.Shift{Cause: budget.Structure, D: max(up, lo)})
			u.LogN.Up, u.LogN.Lo = math.Hypot(a, up), math.Hypot(b, lo)
			u.N = u.N.Add(budget.Shift{Cause: budget.Structure, D: d})
		}
	}
}
