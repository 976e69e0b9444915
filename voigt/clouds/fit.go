package clouds

import (
	"math"
	"slices"

	"lacuna/internal/lsq"
)

// A state is a solution before its errors are worked out.
type state struct {
	x     []float64
	at    []int
	chi2  float64
	stop  string
	ok    bool
	its   int // iterations and evaluations, all rounds together
	evals int
}

// Fit finds the minimum of χ² from the starts of the problem, by
// Levenberg–Marquardt with analytic derivatives (package internal/lsq), the continuum
// and zero levels projected out, and works out the errors. Where a cloud becomes
// narrower than the sub-grid is good for, the sub-grid is renewed and the fit goes on.
//
// A fit that does not converge is not an error: Result.Stop says why it ended.
func (f *Fitter) Fit() (Result, error) { return f.FitFrom(f.start) }

// FitFrom is Fit from another start: the free parameters in the order of
// Result.Free.
func (f *Fitter) FitFrom(x []float64) (Result, error) {
	if len(x) != len(f.start) {
		panic("clouds: FitFrom: another number of parameters")
	}
	s, err := f.minimise(x, f.lo, f.hi)
	if err != nil {
		return Result{}, err
	}
	return f.result(s), nil
}

// minimise fits from x within bounds.
func (f *Fitter) minimise(x, lo, hi []float64) (state, error) {
	s := state{x: slices.Clone(x)}
	for j := range s.x {
		s.x[j] = min(max(s.x[j], lo[j]), hi[j])
	}
	if !slices.Equal(f.gridX, s.x) {
		if err := f.regrid(s.x); err != nil {
			return s, err
		}
	}
	const rounds = 6
	for round := range rounds {
		if err := f.round(&s, lo, hi); err != nil {
			return s, err
		}
		if round == rounds-1 || !f.stale(s.x) {
			break
		}
		if err := f.regrid(s.x); err != nil {
			return s, err
		}
	}
	return s, nil
}

// A fit ends when 20 iterations lower χ² by less than this: it creeps along a direction
// in which the clouds can hardly be told apart, and no number with an error changes.
const slow = 0.02

// round is one fit on the present sub-grids.
func (f *Fitter) round(s *state, lo, hi []float64) error {
	if len(s.x) == 0 {
		s.chi2 = f.chi2(s.x)
		s.evals++
		s.ok, s.stop = true, "nothing to fit"
		if !finite(s.chi2) {
			return bad(f.wins[0].name, "mask less, or lower the degree of the continuum", "the continuum cannot be found")
		}
		return nil
	}
	o := lsq.Options{NoCovariance: true, Tol: f.tol, Slow: slow, MaxIterations: 400}
	if f.slow > 0 {
		o.Slow = f.slow
	}
	if f.most > 0 {
		o.MaxIterations = f.most
	}
	sol, err := lsq.Fit((*objective)(f), s.x, lo, hi, o, &f.ws)
	if err != nil {
		for _, w := range f.wins {
			if w.lost {
				return w.bad("mask less, or lower the degree of the continuum", "the continuum cannot be found")
			}
		}
		return bad(f.wins[0].name, "start from other clouds", "%v", err)
	}
	s.x, s.at, s.chi2 = sol.X, sol.AtBound, sol.Chi2
	s.stop, s.ok = string(sol.Stop), sol.OK() || sol.Stop == lsq.Creeping
	s.its += sol.Iterations
	s.evals += sol.Evaluations
	return nil
}

// chi2 is χ² at x with the best continuum, priors included; NaN where it cannot be
// computed.
func (f *Fitter) chi2(x []float64) float64 {
	for i := range f.comps {
		f.comps[i].set(x)
	}
	sum := 0.0
	for _, w := range f.wins {
		w.absorption(f.comps, x, false)
		if !w.project(w.resid) {
			return math.NaN()
		}
		for _, v := range w.resid {
			sum += v * v
		}
	}
	for _, p := range f.priors {
		d := (p.value.at(x) - p.mean) / p.sigma
		sum += d * d
	}
	return sum
}

// Chi2 returns χ² at a point (Free) with the best continuum, priors included; NaN
// where it cannot be computed.
func (f *Fitter) Chi2(x []float64) float64 { return f.chi2(x) }
