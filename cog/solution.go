package cog

import (
	"errors"
	"math"

	"lacuna/internal/lsq"
)

// A solution is a polished minimum of χ².
type solution struct {
	x    []float64 // log₁₀N of the used levels, ln b
	chi2 float64
	stop lsq.Stop
}

// minimum finds the lowest χ²: scan, polish of every local minimum that may be the
// lowest, choice (of equals, as of two lines that a flat and a damped curve fit
// exactly, the one with the larger b, which needs less gas). The valley's own χ²
// there is the reference for intervals.
func (f *fit) minimum() error {
	v, n := f.valley, f.d.cols
	floor := v.scan(scanSteps)
	low := math.Inf(1)
	for _, b := range floor {
		low = math.Min(low, b.chi2)
	}
	var all []solution
	var ws lsq.Workspace
	for i, b := range floor {
		if i > 0 && floor[i-1].chi2 < b.chi2 || i < len(floor)-1 && floor[i+1].chi2 <= b.chi2 || !(b.chi2 <= low*(1+1e-9)+20) {
			continue
		}
		s, err := f.exact.polish(b.x, b.y, v.ymin, v.ymax, &ws)
		if err != nil {
			return err
		}
		next := solution{s.X, s.Chi2, s.Stop}
		if k := len(all) - 1; k >= 0 && !apart(floor, all[k], next, n) {
			if next.chi2 <= all[k].chi2+equal {
				all[k] = next
			}
			continue
		}
		all = append(all, next)
	}
	if len(all) == 0 {
		return errors.New("curve of growth: χ² cannot be computed for these widths and errors")
	}
	best := 0
	for i, a := range all {
		if a.chi2 <= all[best].chi2+equal {
			best = i
		}
	}
	f.best, f.chi2, f.res.Stop = all[best].x, all[best].chi2, string(all[best].stop)
	if all[best].stop != lsq.Converged {
		f.note("the fit ended before it converged: %s", all[best].stop)
	}
	f.first = 0.1
	if _, cov := f.exact.response(f.best, true); cov[len(cov)-1] > 0 {
		f.first = math.Max(1e-3, math.Min(math.Sqrt(cov[len(cov)-1]), 0.3))
	}
	f.bottom = f.bottomAt(f.best)
	for i, a := range all {
		if i == best || !(a.chi2 < f.chi2+TwoInTwo) {
			continue
		}
		f.others = append(f.others, f.bottomAt(a.x))
		f.note("a second solution: b = %.2f km/s and log N(%s) = %.2f, χ² = %.2f against %.2f",
			math.Exp(a.x[n]), f.levels[f.use[0]].Name, a.x[0], a.chi2, f.chi2)
	}
	return nil
}

const (
	equal   = 0.01 // solutions that differ by less in χ² are equals
	barrier = 0.5  // two minima are two solutions where χ² rises by more between them
)

// apart reports whether χ² rises between two solutions, the first at smaller b.
func apart(floor []bottom, a, b solution, n int) bool {
	ridge := math.Inf(-1)
	for _, f := range floor {
		if f.y > a.x[n] && f.y < b.x[n] {
			ridge = math.Max(ridge, f.chi2)
		}
	}
	return ridge > math.Max(a.chi2, b.chi2)+barrier
}

func (f *fit) bottomAt(best []float64) bottom {
	n := f.d.cols
	x := append([]float64(nil), best[:n]...)
	return bottom{best[n], f.valley.solve(x, best[n], -1), x}
}

// closing returns ln b at which χ² has risen to delta above the best, on one side of
// from, or the bound and true (open).
func (f *fit) closing(from bottom, delta, dir float64) (float64, bool) {
	y, ok := f.valley.crossing(from, f.bottom.chi2+delta, dir, f.first)
	return y, !ok
}
