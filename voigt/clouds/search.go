package clouds

import (
	"cmp"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"lacuna/budget"
)

// A Search looks for the number of clouds and for the clouds themselves.
//
// It starts from the clouds that are given, or from none. Again and again a cloud is
// added where the residuals ask for it most (the score test: by how much χ² would
// fall for a weak cloud at v with b, all other parameters following), or one is split
// into two, and everything is fitted anew from several starts; then clouds are left
// out and neighbours merged, each with a new fit. Of the solutions whose clouds the
// data can tell apart, that of the lowest criterion is taken.
type Search struct {
	Windows []Window
	Shared  []Shared
	Begin   []Cloud // to start from; they may be merged or dropped like others
	// Like is what a cloud looks like: its species, ties, priors and bounds. Its starts of
	// v, b and N are not used. Ties by the bare name ("b") mean the cloud's own.
	Like Cloud
	V    [2]float64 // km/s, where clouds may lie

	Max       int          // clouds at most; 0: 12
	Starts    int          // random starts for each number, beside those that the residuals ask for; 0: 2
	Seed      uint64       // of those
	Criterion string       // "BIC" (also "") or "AICc"
	Ranges    [][2]float64 // km/s, for which columns and widths are summed; nil: everything
	Options   Options
}

// A Found is the outcome of a Search.
type Found struct {
	Result         // of the best solution
	Fitter *Fitter `json:"-"` // that made it
	Model  []Cloud `json:"-"` // its clouds as the start of another fit
	// Solutions are all that differ, the best first.
	Solutions []Solution `json:"solutions"`
	Ranges    []Range    `json:"ranges"` // with the structure error
}

// A Solution is one number of clouds that was tried, at one minimum.
type Solution struct {
	Number int       `json:"number"`
	V      []float64 `json:"v"` // km/s, of its clouds
	Chi2   float64   `json:"chi2"`
	BIC    float64   `json:"bic"`
	AICc   float64   `json:"aicc"`
	// Why it may not be the answer, whatever its criterion: two clouds that the data
	// cannot tell apart, a cloud without a detected column. "" if it may.
	Refused string `json:"refused,omitempty"`

	clouds []Cloud
	shared []Shared
	ranges []Range
	result Result
	fitter *Fitter
}

// structureBIC is the ΔBIC up to which a solution says how far the structure is known.
const structureBIC = 6

// alike: two clouds are told apart if their velocities or their b differ by so many
// standard errors of the difference.
const alike = 2

func (s *Search) max() int {
	if s.Max > 0 {
		return s.Max
	}
	return 12
}

// hunt is a search under way.
type hunt struct {
	*Search
	all  []*Solution
	best *Solution // of those not refused
}

// Run carries the search out. It is deterministic. No cloud at all is an answer as
// well: then Result has no clouds.
func (s *Search) Run() (Found, error) {
	if !(s.V[1] > s.V[0]) {
		return Found{}, bad("", "give the smaller velocity first", "clouds are looked for from %g to %g km/s", s.V[0], s.V[1])
	}
	if len(s.Like.Species) == 0 {
		return Found{}, bad("", "list the species that a cloud holds", "a search for clouds without species")
	}
	if s.Criterion != "" && s.Criterion != "BIC" && s.Criterion != "AICc" {
		return Found{}, bad("", `use "BIC" or "AICc"`, "criterion %q", s.Criterion)
	}
	with := *s
	with.Options.cache = new(gridCache)
	s = &with
	h := &hunt{Search: s}
	now, err := h.try(s.Begin, s.Shared)
	if err != nil {
		return Found{}, err
	}
	if len(s.Begin) > 0 {
		none, err := h.try(nil, s.Shared)
		if err != nil {
			return Found{}, err
		}
		if now == nil {
			now = none
		}
	}
	// Upwards, until two more clouds do not lower the criterion.
	for idle := 0; idle < 2 && len(now.clouds) < s.max(); {
		next, err := h.more(now)
		if err != nil {
			return Found{}, err
		}
		if next == nil {
			break
		}
		if h.criterion(next) < h.criterion(now) && next.Refused == "" {
			idle = 0
		} else {
			idle++
		}
		now = next
	}
	// Downwards from the best, and up again where that opened a way.
	for range 4 {
		was := h.best
		if err := h.fewer(was); err != nil {
			return Found{}, err
		}
		if h.best == was {
			break
		}
		if len(h.best.clouds) < s.max() {
			if _, err := h.more(h.best); err != nil {
				return Found{}, err
			}
		}
	}
	return h.found()
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

// refuse says why a solution has a cloud too many.
func (f *Fitter) refuse(r Result) string {
	a := r.a
	for i := range f.comps {
		f.comps[i].set(r.X)
	}
	for i := range f.in.Clouds {
		if s := f.undetected(a, i); s != "" {
			return s
		}
	}
	for i := range f.comps {
		for j := range i {
			c, d := &f.comps[i], &f.comps[j]
			if c.carrier != d.carrier {
				continue
			}
			apart := false
			for _, q := range []struct {
				x    float64
				g, h []term
			}{{c.V - d.V, c.dv, d.dv}, {c.B - d.B, c.db, d.db}} {
				g := gradient(a.n, q.g)
				for _, t := range q.h {
					g[t.j] -= t.k
				}
				if a.determined(g) && q.x*q.x > alike*alike*a.covariance(g, g) {
					apart = true
				}
			}
			if !apart {
				return fmt.Sprintf("clouds at %.2f and %.2f km/s cannot be told apart", d.V, c.V)
			}
		}
	}
	return ""
}

// undetected says so if no species of a cloud is seen at 2σ.
func (f *Fitter) undetected(a *analysis, cloud int) string {
	v := 0.0
	for i := range f.comps {
		c := &f.comps[i]
		if c.cloud != cloud {
			continue
		}
		v = c.V
		if len(c.dn) == 0 {
			return ""
		}
		g := c.columnGradient(a.n)
		if e := a.covariance(g, g); a.determined(g) && e > 0 && c.N*c.N > 4*e {
			return ""
		}
		var depth SpeciesFit // a saturated cloud has a badly known column, but it is there
		if f.depths(c, &depth); depth.Weakest > saturatedTau {
			return ""
		}
	}
	return fmt.Sprintf("the column of the cloud at %.2f km/s is less than 2σ", v)
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

// found picks the best and works out what its number leaves open.
func (h *hunt) found() (Found, error) {
	best := h.best
	slices.SortStableFunc(h.all, func(a, b *Solution) int {
		if (a == best) != (b == best) {
			if a == best {
				return -1
			}
			return 1
		}
		return cmp.Compare(h.criterion(a), h.criterion(b))
	})
	out := Found{Result: best.result, Fitter: best.fitter, Model: best.clouds}
	out.Conditional = true
	lim := h.Ranges
	if len(lim) == 0 {
		lim = [][2]float64{{math.Inf(-1), math.Inf(1)}}
	}
	for _, s := range h.all {
		if s == best || s.BIC < best.BIC+structureBIC {
			s.ranges = s.fitter.Ranges(s.result, append([][2]float64{{math.Inf(-1), math.Inf(1)}}, lim...)...)
		}
		out.Solutions = append(out.Solutions, *s)
	}
	h.structure(&out, best)
	if err := h.hidden(&out, best); err != nil {
		return Found{}, err
	}
	if len(best.clouds) > 0 {
		out.note("the number of clouds was chosen from the data: errors of single clouds hold for %d clouds only", len(best.clouds))
	}
	return out, nil
}

// structure adds to sums the error that the unknown division into clouds makes,
//
//	σ² = Σ p_k (X_k − X)² / Σ p_k,  p_k = exp(−ΔBIC_k/2),
//
// over all other solutions within ΔBIC < 6 of the best.
func (h *hunt) structure(out *Found, best *Solution) {
	spread := func(x float64, of func(r []Range) float64) float64 {
		sum, weight := 0.0, 0.0
		for _, s := range h.all {
			if s == best || s.ranges == nil {
				continue
			}
			p := math.Exp(-(s.BIC - best.BIC) / 2)
			d := of(s.ranges) - x
			if s.Number == 0 {
				d = -x
			}
			sum += p * d * d
			weight += p
		}
		if !(weight > 0) {
			return 0
		}
		return math.Sqrt(sum / weight)
	}
	column := func(n, logN *budget.Number, of func(r []Range) float64) {
		d := spread(n.X, of)
		if !(d > 0) {
			return
		}
		*n = n.Add(budget.Shift{Cause: budget.Structure, D: d})
		if logN.Kind() == "value" {
			*logN = logN.Add(budget.Shift{Cause: budget.Structure, D: d / (n.X * math.Ln10)})
		} else {
			*logN = budget.Log10(limited(*n))
		}
	}
	for i := range out.Totals {
		t := &out.Totals[i]
		column(&t.N, &t.LogN, func(r []Range) float64 { return r[0].Columns[i].N.X })
	}
	out.Ranges = slices.Clone(best.ranges[1:])
	for k := range out.Ranges {
		g := &out.Ranges[k]
		for i := range g.Columns {
			c := &g.Columns[i]
			column(&c.N, &c.LogN, func(r []Range) float64 { return r[k+1].Columns[i].N.X })
		}
		for i := range g.Widths {
			w := &g.Widths[i].W
			if d := spread(w.X, func(r []Range) float64 { return r[k+1].Widths[i].W.X }); d > 0 {
				*w = w.Add(budget.Shift{Cause: budget.Structure, D: d})
			}
		}
	}
}
