package clouds

import (
	"math/rand/v2"
	"slices"
)

// Bootstrap makes n spectra of the model at r and noise of the measured covariance, with
// the means of all priors moved by their errors as well, refits each from r, and returns
// the points. Residuals are not resampled: those of black cores and of the continuum are
// not alike. The data of the fitter are as before when it returns.
func (f *Fitter) Bootstrap(r Result, n int, seed uint64) (Sample, error) {
	s := Sample{Free: f.Free()}
	for i := range f.comps {
		f.comps[i].set(r.X)
	}
	if err := f.regrid(r.X); err != nil {
		return s, err
	}
	old := make([][]float64, len(f.wins))
	truth := make([][]float64, len(f.wins))
	for k, w := range f.wins {
		old[k] = slices.Clone(w.data)
		w.absorption(f.comps, r.X, false)
		if !w.project(w.resid) {
			return s, w.bad("mask less, or lower the degree of the continuum", "the continuum cannot be found")
		}
		truth[k] = slices.Clone(w.data)
		res := w.residuals() // data − model, whitened
		for i := range res {
			truth[k][i] -= res[i]
		}
		if w.zeroRow { // the prior's row at the fitted zero level
			i := len(w.pix)
			truth[k][i] = 0
			for c, x := range w.lin {
				truth[k][i] += x * w.a.At(i, c)
			}
		}
	}
	priors := slices.Clone(f.priors)
	defer func() {
		for k, w := range f.wins {
			w.data = old[k]
		}
		f.priors = priors
	}()
	for trial := range n {
		rng := rand.New(rand.NewPCG(seed, uint64(trial)))
		for k, w := range f.wins {
			w.data = slices.Clone(truth[k])
			for i := range w.data {
				w.data[i] += rng.NormFloat64()
			}
		}
		f.priors = slices.Clone(priors)
		for i := range f.priors {
			p := &f.priors[i]
			p.mean = p.value.at(r.X) + p.sigma*rng.NormFloat64()
		}
		got, err := f.minimise(r.X, f.lo, f.hi)
		if err != nil || !got.ok {
			s.Failed++
			continue
		}
		s.X = append(s.X, got.x)
	}
	return s, nil
}
