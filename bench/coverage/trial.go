package main

import (
	"math"
	"math/rand/v2"

	"lacuna/budget"
	"lacuna/voigt/clouds"
)

// The numbers that are scored.
const (
	velocity = iota
	doppler
	column
	total
	width
	quantities
)

var quantityNames = [quantities]string{"v", "b", "log N", "log ΣN", "W"}

// A score is one fitted number against the truth.
type score struct {
	quantity int
	pull     float64 // (fitted − true) over the Cramér–Rao bound
	bound    float64 // that bound
	in68     bool
	in95     bool
	lost     bool    // the fit gives no error: at a bound, not determined
	ratio    float64 // error given by the fit over the bound
}

// The bins of sightlines, by the bounds of their poorest cloud.
const (
	faint  = iota // N/σ_N below 5
	narrow        // N/σ_N above 5, but b/σ_b below 5: b may be anything from 0
	firm          // both above 5
)

func (b bounds) bin(clouds []gas) int {
	least := firm
	for i, n := range b.number {
		switch {
		case 1/(math.Ln10*n[2]) < 5:
			return faint
		case clouds[i].b/n[1] < 5:
			least = narrow
		}
	}
	return least
}

// binOfTotal is the bin where no single cloud counts.
func (b bounds) binOfTotal() int {
	if 1/(math.Ln10*b.total) < 5 {
		return faint
	}
	return firm
}

// A trial is one sightline, simulated and fitted.
type trial struct {
	clouds    int
	bin       int // of its poorest cloud, or of the total where the number is unknown
	scores    []score
	converged bool
	outcome   string // why the fit stopped; "" where it could not be made
	found     int    // clouds found, where the data choose
	pixels    int
}

const z95 = 1.959963984540054

// run simulates one sightline and fits it if want likes its bin.
func (p population) run(seed, index uint64, snr float64, how method, want func(bin int) bool) (trial, error) {
	rng := rand.New(rand.NewPCG(seed, index))
	s := p.draw(rng, snr)
	for _, sc := range s.scenes {
		s.views = append(s.views, sc.look(s.clouds, s.fwhm(1)))
	}
	cr, err := s.fisher()
	if err != nil {
		return trial{}, err
	}
	t := trial{clouds: len(s.clouds), bin: cr.bin(s.clouds)}
	if how == searched {
		t.bin = cr.binOfTotal()
	}
	if !want(t.bin) {
		return t, nil
	}
	pr := s.problem(rng)
	switch how {
	case searched:
		err = s.search(pr, cr, &t, index)
	default:
		err = s.known(pr, cr, &t, how)
	}
	return t, err
}

// A method is how intervals are made.
type method int

const (
	linear   method = iota // from the covariance
	profiled               // by profile likelihood
	sampled                // quantiles of the posterior
	searched               // covariance and structure error, number of clouds from the data
)

// known fits with the true number of clouds.
func (s *sightline) known(pr clouds.Problem, cr bounds, t *trial, how method) error {
	f, err := clouds.New(pr, clouds.Options{})
	if err != nil {
		return err
	}
	r, err := f.Fit()
	if err != nil {
		return err
	}
	t.outcome, t.converged, t.pixels = r.Stop, r.Converged, r.Pixels
	var sample clouds.Sample
	if how == sampled {
		if sample, err = f.Sampler(r, clouds.SamplerOptions{Seed: 1, Most: 6000, Times: 20}); err != nil {
			return err
		}
	}
	for k, g := range s.clouds {
		name := r.Clouds[k].Name
		carrier := r.Clouds[k].Species[0].Carrier
		for q, pn := range []string{name + ": v", name + ": b", name + ": log N(" + carrier + ")"} {
			par, ok := r.Param(pn)
			if !ok {
				panic("no parameter " + pn)
			}
			truth := [...]float64{g.v, g.b, g.logN}[q]
			sc := score{quantity: q, bound: cr.number[k][q]}
			switch how {
			case profiled:
				if err := sc.profile(f, r, pn, truth); err != nil {
					return err
				}
			case sampled:
				sc.sample(sample, sample.Parameter(pn), truth)
				sc.pull = (par.X - truth) / sc.bound
			default:
				sc.interval(par.X, par.Err, par.Err, truth)
				sc.lost = par.Err == 0
			}
			t.scores = append(t.scores, sc)
		}
	}
	sum := 0.0
	for _, g := range s.clouds {
		sum += math.Pow(10, g.logN)
	}
	sc := score{quantity: total, bound: cr.total}
	switch how {
	case profiled:
		if err := sc.profile(f, r, clouds.TotalName(s.carrier), math.Log10(sum)); err != nil {
			return err
		}
	case sampled:
		of := f.Column(s.carrier)
		sc.sample(sample, func(x []float64) float64 { return math.Log10(of(x)) }, math.Log10(sum))
		sc.pull = (math.Log10(r.Totals[0].N.X) - math.Log10(sum)) / sc.bound
	default:
		sc.columns(r.Totals[0].N, sum)
	}
	t.scores = append(t.scores, sc)
	if how == linear {
		s.scoreWidth(t, f.Ranges(r, s.ends())[0].Widths[0].W, cr)
	}
	return nil
}

func (s *sightline) scoreWidth(t *trial, w budget.Number, cr bounds) {
	lim := s.ends()
	sc := score{quantity: width, bound: cr.width}
	sc.interval(w.X, w.Err(), w.Err(), equivalent(s.scenes[0].line, s.clouds, lim[0], lim[1]))
	t.scores = append(t.scores, sc)
}

// interval scores x + up − lo.
func (sc *score) interval(x, up, lo, truth float64) {
	sc.pull, sc.ratio = (x-truth)/sc.bound, (up+lo)/2/sc.bound
	e := lo
	if truth > x {
		e = up
	}
	d := math.Abs(truth - x)
	sc.in68, sc.in95 = d <= e, d <= z95*e
	sc.lost = !(e > 0)
}

// columns scores a column and its error, in logarithms.
func (sc *score) columns(n budget.Number, truth float64) {
	e := n.Err() / (n.X * math.Ln10)
	sc.interval(math.Log10(n.X), e, e, math.Log10(truth))
}

// profile scores the intervals Δχ² = 1 and 3.84.
func (sc *score) profile(f *clouds.Fitter, r clouds.Result, name string, truth float64) error {
	for i, delta := range []float64{1, z95 * z95} {
		iv, err := f.Profile(r, name, delta)
		if err != nil {
			return err
		}
		in := (truth >= iv.Lo || iv.OpenLo) && (truth <= iv.Hi || iv.OpenHi)
		if i == 0 {
			sc.pull, sc.in68 = (iv.X-truth)/sc.bound, in
			sc.ratio = (iv.Hi - iv.Lo) / 2 / sc.bound
			sc.lost = iv.OpenLo || iv.OpenHi
		} else {
			sc.in95 = in
		}
	}
	return nil
}

// sample scores the central intervals of the posterior.
func (sc *score) sample(s clouds.Sample, of func([]float64) float64, truth float64) {
	_, lo, hi := s.Interval(0.682689492, of)
	sc.in68, sc.ratio = truth >= lo && truth <= hi, (hi-lo)/2/sc.bound
	_, lo, hi = s.Interval(0.95, of)
	sc.in95 = truth >= lo && truth <= hi
	sc.lost = !s.Converged
}

// search lets the data choose the number of clouds, and scores what is promised then.
func (s *sightline) search(pr clouds.Problem, cr bounds, t *trial, seed uint64) error {
	lo, hi := math.Inf(1), math.Inf(-1)
	inst := lightSpeed / s.resolution
	for _, g := range s.clouds {
		m := 2*g.b + inst
		lo, hi = min(lo, g.v-m), max(hi, g.v+m)
	}
	h := clouds.Search{
		Windows: pr.Windows, V: [2]float64{lo, hi}, Seed: seed, Max: 10, Ranges: [][2]float64{s.ends()},
		Like: clouds.Cloud{Species: []clouds.Species{{Carrier: s.carrier}}, B: clouds.Start(1), V: clouds.Start(0)},
	}
	found, err := h.Run()
	if err != nil {
		return err
	}
	t.outcome, t.converged, t.pixels, t.found = found.Stop, found.Converged, found.Pixels, len(found.Clouds)
	sum := 0.0
	for _, g := range s.clouds {
		sum += math.Pow(10, g.logN)
	}
	sc := score{quantity: total, bound: cr.total}
	sw := score{quantity: width, bound: cr.width}
	if len(found.Clouds) == 0 {
		sc.lost, sw.lost = true, true
		t.scores = append(t.scores, sc, sw)
		return nil
	}
	sc.columns(found.Ranges[0].Columns[0].N, sum)
	t.scores = append(t.scores, sc)
	s.scoreWidth(t, found.Ranges[0].Widths[0].W, cr)
	return nil
}
