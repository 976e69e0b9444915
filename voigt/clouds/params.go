package clouds

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/internal/oops"
)

// A param is one named parameter of the problem.
type param struct {
	name   string
	kind   Kind
	cloud  int // −1: of no cloud
	par    Par
	lo, hi float64
	free   int  // index among the free ones, −1 if fixed or tied
	value  form // in terms of the free ones
	state  int8 // of the resolution: 0 untouched, 1 under way, 2 done
}

// A form is a linear function of the free parameters, add + Σ k x[j].
type form struct {
	add   float64
	terms []term
}

type term struct {
	j int
	k float64
}

func (f form) at(x []float64) float64 {
	s := f.add
	for _, t := range f.terms {
		s += t.k * x[t.j]
	}
	return s
}

// add adds k × g.
func (f *form) plus(g form, k float64) {
	f.add += k * g.add
	for _, t := range g.terms {
		if i := slices.IndexFunc(f.terms, func(u term) bool { return u.j == t.j }); i >= 0 {
			f.terms[i].k += k * t.k
		} else {
			f.terms = append(f.terms, term{t.j, k * t.k})
		}
	}
}

// parameters is the compiled list of parameters with the free ones among them.
type parameters struct {
	all    []param
	byName map[string]int
	free   []int // index into all of each free parameter
}

func bad(where, fix, format string, a ...any) error {
	return oops.Inputf("", where, fix, format, a...)
}

// add enters a parameter under its full name.
func (ps *parameters) add(name string, kind Kind, cloud int, p Par) error {
	if name == "" {
		return bad("shared parameter", "give it one", "it has no name")
	}
	if _, twice := ps.byName[name]; twice {
		return bad(name, "give each cloud, and each species of a cloud, but once", "the parameter exists already")
	}
	q := param{name: name, kind: kind, cloud: cloud, par: p, lo: p.Lo, hi: p.Hi, free: -1}
	if err := q.bounds(); err != nil {
		return err
	}
	if ps.byName == nil {
		ps.byName = map[string]int{}
	}
	ps.byName[name] = len(ps.all)
	ps.all = append(ps.all, q)
	return nil
}

// bounds fills in the default bounds and refuses what cannot be meant.
func (q *param) bounds() error {
	p := q.par
	if p.Sigma != 0 && (!(p.Sigma > 0) || math.IsInf(p.Sigma, 0) || !finite(p.Mean)) {
		return bad(q.name, "give a finite mean and a positive width", "prior %g ± %g", p.Mean, p.Sigma)
	}
	if p.Tie != nil {
		return nil
	}
	if !finite(p.Start) {
		return bad(q.name, "give a number", "the start is %g", p.Start)
	}
	positive := q.kind == Doppler || q.kind == Temperature
	if positive && !(p.Start > 0) || q.kind == Turbulence && !(p.Start >= 0) {
		return bad(q.name, "give a number above 0", "the start is %g", p.Start)
	}
	if p.Lo == 0 && p.Hi == 0 {
		q.lo, q.hi = math.Inf(-1), math.Inf(1)
		switch q.kind {
		case Velocity:
			q.lo, q.hi = p.Start-50, p.Start+50
		case Doppler:
			q.lo, q.hi = min(0.1, p.Start), max(50, p.Start)
		case LogColumn:
			q.lo, q.hi = min(4, p.Start), max(23, p.Start)
		case Temperature:
			q.lo, q.hi = min(2, p.Start), max(1e5, p.Start)
		case Turbulence:
			q.lo, q.hi = 0, max(50, p.Start)
		case WidthFactor:
			q.lo, q.hi = -0.3, 0.3
		}
		return nil
	}
	if !(q.lo < q.hi) && !p.Fixed {
		return bad(q.name, "give the smaller one first", "the bounds %g and %g leave no room", p.Lo, p.Hi)
	}
	if !p.Fixed && !(p.Start >= q.lo && p.Start <= q.hi) {
		return bad(q.name, "widen them, or start inside", "the bounds %g to %g exclude the start %g", p.Lo, p.Hi, p.Start)
	}
	if positive && !(q.lo > 0) || q.kind == Turbulence && !(q.lo >= 0) {
		return bad(q.name, "give a number above 0", "the lower bound is %g", q.lo)
	}
	return nil
}

// resolve numbers the free parameters and makes each one a form of them.
func (ps *parameters) resolve() error {
	for i := range ps.all {
		p := &ps.all[i]
		if p.par.Tie == nil && !p.par.Fixed {
			p.free = len(ps.free)
			ps.free = append(ps.free, i)
		}
	}
	for i := range ps.all {
		if _, err := ps.form(i); err != nil {
			return err
		}
	}
	return nil
}

func (ps *parameters) form(i int) (form, error) {
	p := &ps.all[i]
	switch {
	case p.state == 2:
		return p.value, nil
	case p.state == 1:
		return form{}, bad(p.name, "let one of them be free", "the ties run in a circle")
	case p.free >= 0:
		p.value = form{terms: []term{{p.free, 1}}}
	case p.par.Tie == nil:
		p.value = form{add: p.par.Start}
	default:
		p.state = 1
		f := form{add: p.par.Tie.Add}
		if !finite(f.add) {
			return form{}, bad(p.name, "give a number", "it is tied with the addend %g", f.add)
		}
		for _, t := range p.par.Tie.Terms {
			k, err := ps.find(t.To, p.cloud, p.name)
			if err != nil {
				return form{}, err
			}
			if !finite(t.Factor) {
				return form{}, bad(p.name, "give a number", "it is tied to %s with the factor %g", t.To, t.Factor)
			}
			g, err := ps.form(k)
			if err != nil {
				return form{}, err
			}
			f.plus(g, t.Factor)
		}
		p = &ps.all[i]
		p.value = f
	}
	p.state = 2
	return p.value, nil
}

// find looks a name up, as seen from a cloud.
func (ps *parameters) find(name string, cloud int, by string) (int, error) {
	if cloud >= 0 {
		for i, p := range ps.all {
			if p.cloud == cloud && strings.HasSuffix(p.name, ": "+name) {
				return i, nil
			}
		}
	}
	if i, ok := ps.byName[name]; ok {
		return i, nil
	}
	var names []string
	for _, p := range ps.all {
		names = append(names, p.name)
	}
	fix := "use one of the names that the parameters go by"
	if near := oops.Nearest(name, names, 1); len(near) > 0 {
		fix = fmt.Sprintf("did you mean %q?", near[0])
	}
	return 0, bad(by, fix, "it refers to %q, which is no parameter", name)
}

func finite(x float64) bool { return x-x == 0 }
