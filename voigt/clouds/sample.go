package clouds

import (
	"math"
	"math/rand/v2"
	"slices"

	"lacuna/internal/oops"
)

// A Sample is a set of parameter points: of the posterior (Sampler) or of refits
// (Bootstrap).
type Sample struct {
	Free   []string    // names of the parameters
	X      [][]float64 // points
	Failed int         // refits that did not converge, left out

	// Of a Sampler:
	Steps     int       // moves of each walker
	Burn      int       // of them left out at the beginning
	Tau       []float64 // integrated autocorrelation time of each parameter, in moves
	Accepted  float64   // part of the moves
	Converged bool      // the chain is longer than SamplerOptions.Times autocorrelation times
}

// Interval returns the median and the ends between which the middle part of the sample
// lies (part 0.6827: 1σ) for any function of a point.
func (s Sample) Interval(part float64, of func(x []float64) float64) (median, lo, hi float64) {
	v := make([]float64, len(s.X))
	for i, x := range s.X {
		v[i] = of(x)
	}
	slices.Sort(v)
	q := func(p float64) float64 {
		if len(v) == 0 {
			return math.NaN()
		}
		t := p*float64(len(v)) - 0.5
		i := min(max(int(math.Floor(t)), 0), len(v)-1)
		j := min(i+1, len(v)-1)
		return v[i] + min(max(t-float64(i), 0), 1)*(v[j]-v[i])
	}
	return q(0.5), q((1 - part) / 2), q((1 + part) / 2)
}

// Parameter returns the function that takes parameter name, for Interval; it returns NaN
// for a name that is not in Free.
func (s Sample) Parameter(name string) func(x []float64) float64 {
	j := slices.Index(s.Free, name)
	return func(x []float64) float64 {
		if j < 0 {
			return math.NaN()
		}
		return x[j]
	}
}

// Column returns the function that is the column (cm⁻²) of a carrier over all clouds,
// for Sample.Interval.
func (f *Fitter) Column(carrier string) func(x []float64) float64 {
	t := target{free: -1, carrier: carrier, in: everything}
	return func(x []float64) float64 {
		for i := range f.comps {
			f.comps[i].set(x)
		}
		return f.value(t, x, nil)
	}
}

// SamplerOptions steer a Sampler; zero values are the defaults.
type SamplerOptions struct {
	Seed    uint64
	Walkers int     // even; 0: four a parameter, at least 16
	Most    int     // moves of each walker at most; 0: 20 000
	Times   float64 // stop after so many autocorrelation times; 0: 50
}

// Sampler draws from the posterior of the free parameters about r: the likelihood
// exp(−χ²/2) with continuum and zero levels integrated out (their priors and a flat one,
// a factor |AᵀA|^−½ for the columns A), the Gaussian priors, and flat ones between the
// bounds. For saturated and blended lines, where the covariance says little.
//
// Method: the affine-invariant ensemble sampler of Goodman & Weare 2010 (Comm. App. Math.
// Comp. Sci. 5, 65), stretch moves with a = 2, half of the walkers against the other
// half. Every 50 moves the integrated autocorrelation times of the ensemble means are
// estimated (window of 5 τ; Sokal 1997, from memory); the chain ends when it is Times as
// long as the longest, and the first 5 τ are left out. Deterministic with the seed.
func (f *Fitter) Sampler(r Result, o SamplerOptions) (Sample, error) {
	n := len(r.X)
	if n == 0 {
		return Sample{}, bad("sampler", "free something", "no free parameter")
	}
	if o.Walkers == 0 {
		o.Walkers = max(16, 4*n)
	}
	if o.Most == 0 {
		o.Most = 20_000
	}
	if o.Times == 0 {
		o.Times = 50
	}
	if o.Walkers%2 != 0 || o.Walkers < n+2 {
		return Sample{}, oops.Inputf("", "sampler", "give an even number above that of the parameters", "%d walkers for %d parameters", o.Walkers, n)
	}
	if err := f.finer(r); err != nil {
		return Sample{}, err
	}
	e := newEnsemble(f, r, o)
	s := Sample{Free: f.Free(), Tau: make([]float64, n)}
	const lap = 50
	for s.Steps < o.Most {
		for range lap {
			e.move()
		}
		s.Steps += lap
		longest := 0.0
		for j := range n {
			s.Tau[j] = e.tau(j)
			longest = max(longest, s.Tau[j])
		}
		if float64(s.Steps) > o.Times*longest && s.Steps >= 4*lap {
			s.Converged = true
			break
		}
	}
	s.Burn = s.Steps / 2
	for j := range n {
		if b := int(5*s.Tau[j]) + 1; s.Converged {
			if j == 0 {
				s.Burn = 0
			}
			s.Burn = min(max(s.Burn, b), s.Steps/2)
		}
	}
	s.Accepted = float64(e.taken) / float64(s.Steps*o.Walkers)
	s.X = append(s.X, e.chain[s.Burn*o.Walkers:]...)
	return s, nil
}

// finer makes sub-grids that also serve narrower clouds than those of r: by 4σ, at most
// a third as wide.
func (f *Fitter) finer(r Result) error {
	y := slices.Clone(r.X)
	for j, i := range f.params.free {
		if p := &f.params.all[i]; p.kind == Doppler {
			e := math.Sqrt(r.a.cov.At(j, j))
			if e == 0 {
				e = r.X[j]
			}
			y[j] = max(p.lo, r.X[j]/3, r.X[j]-4*e)
		}
	}
	err := f.regrid(y)
	f.gridX = f.gridX[:0] // not the grid of any start
	return err
}

// logPosterior is that of x, −Inf outside the bounds.
func (f *Fitter) logPosterior(x []float64) float64 {
	for j, v := range x {
		if !(v >= f.lo[j] && v <= f.hi[j]) {
			return math.Inf(-1)
		}
	}
	l := -f.chi2(x) / 2
	for _, w := range f.wins {
		if w.k > 0 {
			l -= w.proj.LogDet()
		}
	}
	if math.IsNaN(l) {
		return math.Inf(-1)
	}
	return l
}

// An ensemble is the walkers and their past.
type ensemble struct {
	f     *Fitter
	rng   *rand.Rand
	x     [][]float64
	l     []float64
	chain [][]float64 // walker by walker, move by move
	mean  [][]float64 // of each parameter, by move
	taken int
}

func newEnsemble(f *Fitter, r Result, o SamplerOptions) *ensemble {
	e := &ensemble{f: f, rng: rand.New(rand.NewPCG(o.Seed, 0x5a11)), mean: make([][]float64, len(r.X))}
	for range o.Walkers {
		var x []float64
		l := math.Inf(-1)
		for try := 0; math.IsInf(l, -1) && try < 100; try++ {
			x = e.draw(r, math.Pow(0.8, float64(try)))
			l = f.logPosterior(x)
		}
		if math.IsInf(l, -1) {
			x, l = slices.Clone(r.X), f.logPosterior(r.X)
		}
		e.x, e.l = append(e.x, x), append(e.l, l)
	}
	return e
}

// draw makes a start about the best point: Gaussian with the covariance, scaled, and
// kept inside the bounds.
func (e *ensemble) draw(r Result, scale float64) []float64 {
	a, n := r.a, len(r.X)
	x := slices.Clone(r.X)
	xi := make([]float64, len(a.order))
	for i := range xi {
		xi[i] = e.rng.NormFloat64() * scale
	}
	for row, j := range a.order {
		if j >= n {
			continue
		}
		for i, c := range a.chol[row] {
			x[j] += c * xi[i]
		}
	}
	for j := range x {
		lo, hi := e.f.lo[j], e.f.hi[j]
		if finite(hi - lo) {
			if a.cov.At(j, j) == 0 || !(math.Abs(x[j]-r.X[j]) <= (hi-lo)/4) { // at a bound, or not determined
				x[j] = r.X[j] + 0.02*(hi-lo)*e.rng.NormFloat64()
			}
		}
		for i := 0; !(x[j] > lo && x[j] < hi) && i < 20; i++ { // mirror
			if x[j] <= lo {
				x[j] = lo + (lo - x[j]) + 1e-6*max(1, math.Abs(lo))*e.rng.Float64()
			} else {
				x[j] = hi - (x[j] - hi) - 1e-6*max(1, math.Abs(hi))*e.rng.Float64()
			}
		}
	}
	return x
}

// move moves every walker once.
func (e *ensemble) move() {
	w := len(e.x)
	n := len(e.x[0])
	for half := range 2 {
		for k := half * w / 2; k < (half+1)*w/2; k++ {
			other := e.x[(1-half)*w/2+e.rng.IntN(w/2)]
			// g(z) ∝ 1/√z between ½ and 2
			z := math.Sqrt2/2 + e.rng.Float64()*math.Sqrt2/2
			z *= z
			y := make([]float64, n)
			for j := range y {
				y[j] = other[j] + z*(e.x[k][j]-other[j])
			}
			l := e.f.logPosterior(y)
			if math.Log(e.rng.Float64()) < float64(n-1)*math.Log(z)+l-e.l[k] {
				e.x[k], e.l[k] = y, l
				e.taken++
			}
		}
	}
	for j := range n {
		sum := 0.0
		for k := range w {
			sum += e.x[k][j]
		}
		e.mean[j] = append(e.mean[j], sum/float64(w))
	}
	e.chain = append(e.chain, e.x...)
}

// tau estimates the integrated autocorrelation time of the ensemble mean of parameter j.
func (e *ensemble) tau(j int) float64 {
	y := e.mean[j]
	y = y[len(y)/4:] // the way in is no part of it
	n := len(y)
	mean := 0.0
	for _, v := range y {
		mean += v / float64(n)
	}
	cov := func(lag int) float64 {
		s := 0.0
		for i := 0; i+lag < n; i++ {
			s += (y[i] - mean) * (y[i+lag] - mean)
		}
		return s / float64(n)
	}
	c0 := cov(0)
	if !(c0 > 0) {
		return 1
	}
	tau := 1.0
	for lag := 1; lag < n; lag++ {
		tau += 2 * cov(lag) / c0
		if float64(lag) > 5*tau {
			break
		}
	}
	return max(tau, 1)
}
