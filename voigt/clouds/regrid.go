package clouds

import (
	"math"
)

// regrid makes the sub-grids for the clouds at x.
func (f *Fitter) regrid(x []float64) error {
	f.gridX = append(f.gridX[:0], x...)
	for i := range f.comps {
		f.comps[i].set(x)
	}
	for _, w := range f.wins {
		w.place(x)
		tau := 0.0
		for _, a := range w.absorb {
			if c := &f.comps[a.comp]; c.B > 0 {
				tau = max(tau, math.Abs(peakTau(a.line, c.N, c.B)))
			}
		}
		q := f.q
		if q == 0 {
			q = 4
			if tau > 100 {
				q = 6
			}
		}
		w0, h := 0.0, 0.0
		if w.width >= 0 {
			k := f.params.free[w.cols[w.width]]
			w0 = x[w.cols[w.width]]
			h = min(max(2*f.params.all[k].par.Sigma, 0.02), 0.15)
		}
		if err := w.regrid(f.comps, q, w0, h); err != nil {
			return err
		}
	}
	return nil
}

// The sub-grid is made for clouds this much narrower than they are, so that they may
// become narrower during a fit; and renewed when one has fewer than gridLimit times the
// points that were asked for.
const (
	gridPart  = 0.7
	gridLimit = 0.8
)

// stale reports whether a sub-grid no longer suits the clouds at x.
func (f *Fitter) stale(x []float64) bool {
	for i := range f.comps {
		f.comps[i].set(x)
	}
	for _, w := range f.wins {
		w.place(x)
		for _, c := range w.cores(f.comps) {
			if !w.grid.density.covers(c, w.grid.q) {
				return true
			}
		}
		if w.width >= 0 && math.Abs(x[w.cols[w.width]]-w.grid.at) > 0.1 {
			return true
		}
	}
	return false
}
