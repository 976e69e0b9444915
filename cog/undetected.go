package cog

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"lacuna/budget"
)

// thin returns the column N ± σ (cm⁻²) that the measured widths of a level give on
// the linear part, by generalized least squares; false if none is measured.
func thin(l Level) (budget.Number, bool) {
	d, err := newData([]Level{l}, []int{0})
	if err != nil || d.gauss == 0 {
		return budget.Number{}, false
	}
	a, w := make([]float64, d.gauss), make([]float64, d.gauss)
	for i := range d.gauss {
		a[i] = 1 / Linear(1, d.pts[i].Line)
		w[i] = d.pts[i].W
	}
	d.whiten(a)
	d.whiten(w)
	aa := mat.Dot(mat.NewVecDense(len(a), a), mat.NewVecDense(len(a), a))
	aw := mat.Dot(mat.NewVecDense(len(a), a), mat.NewVecDense(len(w), w))
	return budget.Number{X: aw / aa, Shifts: []budget.Shift{{Cause: budget.Photon, D: 1 / math.Sqrt(aa)}}}, true
}

// limit fills a level without a detection: N at the fitted b, or the assumed one,
// where χ² lies Sigma² above its lowest value for N ≥ 0; or the lowest of other
// people's limits, where nothing else is known.
func (f *fit) limit(k int) error {
	l := f.levels[k]
	b := f.res.BestB
	var n budget.Number
	for _, p := range l.Points {
		n.From = append(n.From, budget.Ref{Kind: "line", Key: p.Line.Name, Note: p.Line.FSource})
	}
	own, measured := thin(l)
	if !measured {
		best := math.Inf(1)
		for _, p := range l.Points {
			x, err := Invert(p.Line, p.W, b)
			if err != nil {
				return err
			}
			if x < best {
				best = x
				n.Conf = p.Sigma
			}
		}
		n.X = best
		n.Flag |= budget.Upper
		f.res.LogN[k], f.res.BestLogN[k] = n, best
		f.note("log N(%s): upper limits only, the lowest at b = %.3g km/s", l.Name, b)
		return nil
	}
	d, err := newData([]Level{l}, []int{0})
	if err != nil {
		return err
	}
	m, r := make([]float64, len(d.pts)), make([]float64, len(d.pts))
	chi2 := func(x float64) float64 {
		for i := range d.pts {
			m[i] = Width(d.pts[i].Line, x, b)
		}
		d.residuals(r, m)
		var s float64
		for _, v := range r {
			s += v * v
		}
		return s
	}
	// χ² over N ≥ 0 has one minimum, at 0 or near the thin solution.
	top := math.Log10(own.Err())
	low := chi2(math.Inf(-1))
	for x := top - 2; x < top+2; x += 0.05 {
		low = math.Min(low, chi2(x))
	}
	target := low + f.o.Sigma*f.o.Sigma
	a := math.Max(top, math.Log10(math.Max(own.X, own.Err())))
	for chi2(a) > target { // a width far below 0
		a -= 0.3
	}
	c := a + 0.1
	for chi2(c) <= target {
		a = c
		if c += 0.1; c > mostN {
			break
		}
	}
	g := func(x float64) float64 { return chi2(x) - target }
	x := root(g, a, g(a), c, g(c), 1e-9)
	n = budget.Limit(budget.Number{X: own.X, Shifts: own.Shifts, From: n.From}, x, f.o.Sigma)
	if own.X >= 2*own.Err() {
		n.Flag |= budget.Marginal
	}
	f.res.LogN[k], f.res.BestLogN[k] = n, x
	f.note("log N(%s): not detected (linear N = %.2g ± %.2g cm⁻²); upper limit at %g σ for b = %.3g km/s", l.Name, own.X, own.Err(), f.o.Sigma, b)
	return nil
}
