package clouds

import (
	"math"
	"math/rand/v2"
	"slices"
)

// FitBest is Fit from the start of the problem and from n more, moved at random: 0.4
// times the instrument's b in velocity, 40 % in b and turbulence, 0.3 dex in columns,
// 50 % in temperature. It returns the lowest minimum and says how many starts led to it.
// Deterministic with the seed.
func (f *Fitter) FitBest(n int, seed uint64) (Result, error) {
	best, err := f.minimise(f.start, f.lo, f.hi)
	if err != nil {
		return Result{}, err
	}
	inst := math.Inf(1)
	for _, w := range f.wins {
		inst = min(inst, w.grid.fwhm/(2*math.Sqrt(math.Ln2)))
	}
	rng := rand.New(rand.NewPCG(seed, 0x57a7))
	same := 1
	for range n {
		x := slices.Clone(f.start)
		for j, i := range f.params.free {
			d := rng.NormFloat64()
			switch f.params.all[i].kind {
			case Velocity:
				x[j] += 0.4 * inst * d
			case Doppler, Turbulence:
				x[j] *= math.Exp(0.4 * d)
			case LogColumn:
				x[j] += 0.3 * d
			case Column:
				x[j] *= math.Exp(0.7 * d)
			case Temperature:
				x[j] *= math.Exp(0.5 * d)
			}
		}
		s, err := f.minimise(x, f.lo, f.hi)
		switch {
		case err != nil: // a start from which nothing can be computed
		case s.chi2 < best.chi2-0.01:
			best, same = s, 1
		case s.chi2 < best.chi2+0.01:
			same++
		}
	}
	if err := f.regrid(best.x); err != nil {
		return Result{}, err
	}
	r := f.result(best)
	if n > 0 {
		r.note("the lowest minimum was reached from %d of %d starts", same, n+1)
	}
	return r, nil
}
