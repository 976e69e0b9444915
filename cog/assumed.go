package cog

import (
	"math"

	"lacuna/budget"
)

// assumed fills N and b where χ² closes on neither side of b.
func (f *fit) assumed() error {
	n := f.d.cols
	at := func(b float64) ([]float64, float64, error) {
		s, err := f.exact.polish(f.bottom.x, math.Log(b), math.Log(b), math.Log(b), nil)
		if err != nil {
			return nil, 0, err
		}
		return s.X, s.Chi2, nil
	}
	mid, chi2, err := at(f.o.B)
	if err != nil {
		return err
	}
	narrow, _, err := at(f.o.BLow)
	if err != nil {
		return err
	}
	wide, _, err := at(f.o.BHigh)
	if err != nil {
		return err
	}
	widest, _, err := at(f.o.BMax)
	if err != nil {
		return err
	}
	f.best, f.res.Chi2, f.res.BestB = mid, chi2, f.o.B
	f.corrections()
	f.res.B.Flag = 0
	g, cov := f.exact.response(mid, false)
	f.setCov(cov)
	key := "b:" + f.o.Key + ":" + f.species
	for c, k := range f.use {
		x := f.number(g[c], 1)
		x.X = mid[c]
		spread := narrow[c] - wide[c]
		f.res.BestLogN[k] = mid[c]
		if f.saturated(c) {
			x.Flag |= budget.Saturated
		}
		if most := narrow[c] - widest[c]; most > assumedMost {
			// The largest b that is allowed at all gives the least N, less what the widths
			// allow: a limit must not rest on an assumption about b, since clouds side by
			// side are as good as one wide cloud.
			g, _ := f.exact.response(widest, false)
			n := f.number(g[c], 1)
			f.exact.model(f.best)
			x = bounded(x, widest[c]-f.o.Sigma*n.Without(budget.FValue), f.o.Sigma, budget.Lower|budget.Saturated)
			f.note("log N(%s) moves by %.2f dex for b from %g to %g km/s: lower limit at %g σ and b = %g km/s",
				f.levels[k].Name, most, f.o.BLow, f.o.BMax, x.Conf, f.o.BMax)
		} else {
			stat := x.Err()
			x.Shifts = append(x.Shifts, budget.Shift{Cause: budget.Profile, Key: key, D: -spread / 2})
			x = asymmetricTotal(x, math.Hypot(stat, narrow[c]-mid[c]), math.Hypot(stat, mid[c]-wide[c]))
		}
		f.res.LogN[k] = x
	}
	f.note("b is not constrained by the widths (corrections at %g km/s: %.3f to %.3f dex); N is for b = %g km/s, its error for %g .. %g km/s",
		f.o.B, f.corrMin, f.corrMax, f.o.B, f.o.BLow, f.o.BHigh)
	f.best[n] = math.Log(f.o.B)
	return nil
}
