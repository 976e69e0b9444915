package lsq

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
)

// A Problem is a set of residuals with their derivatives.
type Problem interface {
	// Points returns the number of residuals.
	Points() int
	// Eval sets r (one element a residual) to the residuals at x, and the matrix jac
	// (a row a residual, a column a parameter) to ∂r_i/∂x_j. jac is not nil, and
	// holds zeros or the numbers of an earlier point: set every element. A point
	// where the residuals cannot be computed is answered with a NaN among them.
	Eval(x, r []float64, jac *mat.Dense)
}

// Options steer the iteration; the zero value is good for residuals in units of
// their errors.
type Options struct {
	Tol           float64 // converged when an iteration changes, or is sure to change, χ² by less; 0: 1e-6
	MaxIterations int     // 0: 200
	Lambda        float64 // damping at the start, relative to the columns of the Jacobian; 0: 1e-3
	Slow          float64 // stop as Creeping when 20 iterations together lower χ² by less; 0: never
	NoCovariance  bool    // leave Cov and Undetermined empty: for callers who make their own
}

// A Stop is the reason why a fit ended.
type Stop string

// The reasons to stop. Only after Converged is X a minimum; after Creeping it is near
// one in χ², but may be far in X.
const (
	Converged Stop = "converged"
	Cornered  Stop = "converged with every parameter at a bound"
	Stuck     Stop = "no step lowers χ², though the model predicts one"
	Limit     Stop = "iteration limit reached"
	Creeping  Stop = "χ² hardly falls any more, along a valley that the points do not close"
)

// A Solution is the end of a fit.
type Solution struct {
	X []float64
	// Cov is the covariance (JᵀJ)⁻¹ at X, row by row, n × n. It is not scaled by χ².
	// A parameter at a bound (AtBound) counts as fixed: its row and column are 0. One
	// that the points do not determine (Undetermined) has the variance +Inf, and
	// its covariances leave out the undetermined direction.
	Cov          []float64
	Chi2         float64
	Points       int
	Stop         Stop
	Iterations   int   // accepted steps, and the last
	Evaluations  int   // calls of Eval
	AtBound      []int // per parameter: −1 held by its lower bound, +1 by its upper, 0 free
	Undetermined []int // indices, ascending
}

// Err returns the standard error of parameter j, √Cov_jj.
func (s Solution) Err(j int) float64 {
	return math.Sqrt(s.Cov[j*len(s.X)+j])
}

// OK reports whether the fit converged.
func (s Solution) OK() bool { return s.Stop == Converged || s.Stop == Cornered }

// Changes of χ² below this part of it are rounding.
const rounding = 1e-14

// A step that is predicted to gain more than this many Tol, and gains nothing at any
// damping, tells of derivatives that do not belong to the residuals.
const unkept = 1e4

// Fit makes Σ r_i(x)² small from the start x, each parameter within lo … hi (nil:
// no bounds). x is not changed. A Workspace, kept by one goroutine and given again,
// saves the memory of the iteration; nil makes a new one.
//
// Method: Levenberg 1944 and Marquardt 1963, in the QR form of Moré 1978 (Lect.
// Notes in Mathematics 630, 105; from memory): J = QR once an iteration, each
// damping λ solves the small problem min |R p + Qᵀr|² + λ |D p|², D the largest
// norms of the columns so far. λ follows the gain ratio (Nielsen 1999, IMM-REP-1999-05; from
// memory). A step is clipped at the bounds and its gain predicted as clipped;
// a parameter at a bound that χ² pushes against is held there for the iteration.
//
// Errors: fewer points than parameters, bounds in the wrong order, NaN in x, and
// residuals or derivatives that are not finite at the start.
func Fit(p Problem, x, lo, hi []float64, o Options, ws *Workspace) (Solution, error) {
	m, n := p.Points(), len(x)
	if err := check(m, x, lo, hi); err != nil {
		return Solution{}, err
	}
	if o.Tol == 0 {
		o.Tol = 1e-6
	}
	if o.MaxIterations == 0 {
		o.MaxIterations = 200
	}
	if o.Lambda == 0 {
		o.Lambda = 1e-3
	}
	if ws == nil {
		ws = new(Workspace)
	}
	ws.fit(m, n)
	w := &ws.now
	clip(w.x, x, lo, hi)
	p.Eval(w.x, w.r, w.jac)
	w.chi2 = floats.Dot(w.r, w.r)
	s := Solution{Points: m, Evaluations: 1}
	if !finite(w.chi2) || !finite(floats.Sum(w.jac.RawMatrix().Data)) {
		return Solution{}, errors.New("least squares: the residuals or their derivatives are not finite at the start")
	}
	s.Stop = ws.iterate(p, lo, hi, o, &s)
	s.X = append([]float64(nil), ws.now.x...)
	s.Chi2 = ws.now.chi2
	ws.hold(lo, hi)
	s.AtBound = append([]int(nil), ws.at...)
	if !o.NoCovariance {
		s.covariance(ws)
	}
	return s, nil
}

func check(m int, x, lo, hi []float64) error {
	n := len(x)
	if lo != nil && len(lo) != n || hi != nil && len(hi) != n {
		panic("lsq: Fit: x and its bounds differ in length")
	}
	if m < n || n == 0 {
		return fmt.Errorf("least squares: %d points cannot determine %d parameters", m, n)
	}
	for j := range x {
		if !finite(x[j]) {
			return fmt.Errorf("least squares: parameter %d starts at %g", j, x[j])
		}
		if lo != nil && !(lo[j] < math.Inf(1)) || hi != nil && !(hi[j] > math.Inf(-1)) ||
			lo != nil && hi != nil && !(lo[j] <= hi[j]) {
			return fmt.Errorf("least squares: parameter %d has no room between its bounds", j)
		}
	}
	return nil
}

// iterate moves ws.now to the minimum.
func (ws *Workspace) iterate(p Problem, lo, hi []float64, o Options, s *Solution) Stop {
	lambda, nu := o.Lambda, 2.0
	again := math.Inf(1)         // χ² when the damping was last set back,
	back, promised := false, 0.0 // and what the step after that was predicted to gain
	// The last step kept what was predicted, within 30 %: near the minimum, where the
	// next prediction can be believed as well and need not be tried.
	trusted := false
	const lap = 20
	before := ws.now.chi2 // χ² at the last lap
	for s.Iterations < o.MaxIterations {
		if s.Iterations > 0 && s.Iterations%lap == 0 {
			if before-ws.now.chi2 < o.Slow {
				return Creeping
			}
			before = ws.now.chi2
		}
		s.Iterations++
		ws.hold(lo, hi)
		if len(ws.free) == 0 {
			return Cornered
		}
		ws.factor()
		for {
			now, next := &ws.now, &ws.next
			ws.step(lambda)
			if ws.holdOutward(lo, hi) {
				ws.factor()
				ws.step(lambda)
			}
			copy(next.x, now.x)
			for k, j := range ws.free {
				next.x[j] += ws.p[k]
			}
			clip(next.x, next.x, lo, hi)
			predicted := ws.gain()
			if back {
				back, promised = false, predicted
			}
			if trusted && len(ws.free) == len(now.x) && predicted <= max(o.Tol, rounding*now.chi2) && lambda <= o.Lambda {
				return Converged
			}
			p.Eval(next.x, next.r, next.jac)
			s.Evaluations++
			next.chi2 = floats.Dot(next.r, next.r)
			if !finite(next.chi2) || !finite(floats.Sum(next.jac.RawMatrix().Data)) {
				next.chi2 = math.Inf(1)
			}
			actual, tol := now.chi2-next.chi2, max(o.Tol, rounding*now.chi2)
			done := math.Abs(actual) <= tol && math.Abs(predicted) <= tol
			accept := predicted > 0 && actual > 1e-4*predicted
			trusted = accept && math.Abs(actual-predicted) <= 0.3*predicted
			if accept {
				*now, *next = *next, *now
				f := 2*actual/predicted - 1
				lambda *= max(1.0/3, 1-f*f*f)
				nu = 2
			} else {
				lambda *= nu
				nu *= 2
			}
			if done {
				// A short step may only mean strong damping: try once more without.
				strong := lambda > 10*o.Lambda
				if strong && now.chi2 < again-10*tol {
					again, lambda, nu, back = now.chi2, o.Lambda, 2, true
				} else if strong && promised > unkept*tol {
					return Stuck
				} else {
					return Converged
				}
			}
			if accept {
				break
			}
			if !(lambda < 1e20) {
				return Stuck
			}
		}
	}
	return Limit
}

// hold lists the parameters that are free to move in this iteration: all but
// those at a bound against which the gradient pushes.
func (ws *Workspace) hold(lo, hi []float64) {
	now := &ws.now
	n := len(now.x)
	ws.free = ws.free[:0]
	clear(ws.at)
	g := ws.p[:n]
	blas64.Gemv(blasTrans, 1, now.jac.RawMatrix(), vec(now.r), 0, vec(g))
	for j, x := range now.x {
		switch {
		case lo != nil && x <= lo[j] && g[j] >= 0:
			ws.at[j] = -1
		case hi != nil && x >= hi[j] && g[j] <= 0:
			ws.at[j] = 1
		default:
			ws.free = append(ws.free, j)
		}
	}
}

// holdOutward also holds the parameters at a bound that the step would take
// across it, unless none would be left, and reports whether there were any.
func (ws *Workspace) holdOutward(lo, hi []float64) bool {
	keep := 0
	for k, j := range ws.free {
		if !outward(ws.now.x[j], ws.p[k], j, lo, hi) {
			keep++
		}
	}
	if keep == 0 || keep == len(ws.free) {
		return false
	}
	free := ws.free
	ws.free = ws.free[:0]
	for k, j := range free {
		if !outward(ws.now.x[j], ws.p[k], j, lo, hi) {
			ws.free = append(ws.free, j)
		}
	}
	return true
}

func outward(x, p float64, j int, lo, hi []float64) bool {
	return lo != nil && x <= lo[j] && p < 0 || hi != nil && x >= hi[j] && p > 0
}

func clip(dst, x, lo, hi []float64) {
	for j, v := range x {
		if lo != nil {
			v = max(v, lo[j])
		}
		if hi != nil {
			v = min(v, hi[j])
		}
		dst[j] = v
	}
}

func finite(x float64) bool { return x-x == 0 }
