package clouds

import (
	"cmp"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
)

// hunt is a search under way.
type hunt struct {
	*Search
	all  []*Solution
	best *Solution // of those not refused
}

func (h *hunt) criterion(s *Solution) float64 {
	if h.Criterion == "AICc" {
		if s.AICc == 0 { // too many parameters for it
			return math.Inf(1)
		}
		return s.AICc
	}
	return s.BIC
}

// glance fits some clouds only so far that it shows where that leads: the clouds, and
// the criterion there. ok is false if the fit cannot be made.
func (h *hunt) glance(cs []Cloud, shared []Shared) (at []Cloud, with []Shared, chi2, crit float64, ok bool, err error) {
	f, err := h.fitter(cs, shared)
	if err != nil {
		return nil, nil, 0, 0, false, err
	}
	f.tol, f.slow, f.most = 0.05, 2, 60
	s, err := f.minimise(f.start, f.lo, f.hi)
	if err != nil {
		return nil, nil, 0, 0, false, nil // a start from which nothing can be computed is no mistake of the user
	}
	r := Result{Chi2: s.chi2}
	r.count(f)
	return f.Clouds(s.x), f.SharedAt(s.x), s.chi2, h.criterion(&Solution{BIC: r.BIC, AICc: r.AICc}), true, nil
}

// fitter makes the problem of some clouds.
func (h *hunt) fitter(cs []Cloud, shared []Shared) (*Fitter, error) {
	p := Problem{Windows: h.Windows, Shared: shared}
	cs = slices.Clone(cs)
	slices.SortStableFunc(cs, func(a, b Cloud) int { return cmp.Compare(a.V.Start, b.V.Start) })
	for i, c := range cs {
		c.Name = fmt.Sprintf("cloud %d", i+1)
		p.Clouds = append(p.Clouds, c)
	}
	if len(cs) == 0 {
		p.Shared = nil
	}
	return New(p, h.Options)
}

// try fits some clouds and enters the solution; nil if the fit cannot be made.
func (h *hunt) try(cs []Cloud, shared []Shared) (*Solution, error) {
	f, err := h.fitter(cs, shared)
	if err != nil {
		return nil, err
	}
	r, err := f.Fit()
	if err != nil {
		if len(cs) == 0 {
			return nil, err
		}
		return nil, nil
	}
	s := &Solution{Number: len(cs), Chi2: r.Chi2, BIC: r.BIC, AICc: r.AICc, result: r, fitter: f}
	s.clouds = f.Clouds(r.X)
	s.shared = f.SharedAt(r.X)
	if len(cs) == 0 {
		s.shared = shared
	}
	slices.SortStableFunc(s.clouds, func(a, b Cloud) int { return cmp.Compare(a.V.Start, b.V.Start) })
	for _, c := range s.clouds {
		s.V = append(s.V, c.V.Start)
	}
	s.Refused = f.refuse(r)
	for _, o := range h.all { // the same minimum again
		if o.Number == s.Number && math.Abs(o.Chi2-s.Chi2) < 0.01 && near(o.V, s.V) {
			return o, nil
		}
	}
	h.all = append(h.all, s)
	if s.Refused == "" && (h.best == nil || h.criterion(s) < h.criterion(h.best)) {
		h.best = s
	}
	return s, nil
}

func near(a, b []float64) bool {
	for i := range a {
		if math.Abs(a[i]-b[i]) > 0.05 {
			return false
		}
	}
	return true
}

// more adds a cloud to a solution in the best of several ways.
func (h *hunt) more(s *Solution) (*Solution, error) {
	var starts [][]Cloud
	for _, p := range s.fitter.scan(s.result, h.Search) {
		starts = append(starts, append(slices.Clone(s.clouds), h.cloud(p.v, p.b, p.n)))
	}
	for _, i := range s.worst() {
		starts = append(starts, h.split(s.clouds, i, 1))
	}
	if len(starts) == 0 {
		return nil, nil
	}
	rng := rand.New(rand.NewPCG(h.Seed, uint64(len(s.clouds))))
	random := h.Starts
	if random == 0 {
		random = 2
	}
	ask := len(starts)
	for range random {
		starts = append(starts, h.shake(starts[rng.IntN(ask)], rng))
	}
	type lead struct {
		cs     []Cloud
		shared []Shared
		chi2   float64
	}
	var leads []lead
	for _, cs := range starts {
		at, shared, chi2, _, ok, err := h.glance(cs, s.shared)
		if err != nil {
			return nil, err
		}
		if ok {
			leads = append(leads, lead{at, shared, chi2})
		}
	}
	slices.SortStableFunc(leads, func(a, b lead) int { return cmp.Compare(a.chi2, b.chi2) })
	// The best, and others nearly as good: they may be other minima.
	var best *Solution
	for i, l := range leads {
		if i > 0 && (l.chi2 > leads[0].chi2+structureBIC || i > 3) {
			break
		}
		t, err := h.try(l.cs, l.shared)
		if err != nil {
			return nil, err
		}
		if t != nil && (best == nil || (t.Refused == "") == (best.Refused == "") && t.Chi2 < best.Chi2 || best.Refused != "" && t.Refused == "") {
			best = t
		}
	}
	return best, nil
}

// fewer drops each cloud of a solution, and merges neighbours; what comes near the best
// is fitted to the end.
func (h *hunt) fewer(s *Solution) error {
	for i := range s.clouds {
		ways := [][]Cloud{slices.Delete(slices.Clone(s.clouds), i, i+1)}
		if i+1 < len(s.clouds) {
			ways = append(ways, h.merge(s.clouds, i))
		}
		for _, cs := range ways {
			at, shared, _, crit, ok, err := h.glance(cs, s.shared)
			if err != nil {
				return err
			}
			if !ok || crit > h.criterion(h.best)+structureBIC+4 {
				continue
			}
			if _, err := h.try(at, shared); err != nil {
				return err
			}
		}
	}
	return nil
}
