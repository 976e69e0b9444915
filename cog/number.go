package cog

import (
	"fmt"
	"math"
	"slices"

	"lacuna/budget"
)

// constrained fills N and b where χ² closes on at least one side of b.
func (f *fit) constrained() {
	n := f.d.cols
	y := f.best[n]
	bound := budget.Flag(0)
	if y <= f.valley.ymin+1e-6 || y >= f.valley.ymax-1e-6 {
		bound = budget.AtBound
	}
	g, cov := f.exact.response(f.best, bound == 0)
	f.setCov(cov)
	f.res.BestB = math.Exp(y)
	f.corrections()
	b := f.number(g[n], math.Exp(y)) // ∂b = b ∂ln b
	b.X = math.Exp(y)
	rivals := f.rivals()
	switch {
	case len(rivals) > 0:
		lo, hi := f.lo, f.hi
		for _, r := range rivals {
			lo, hi = math.Min(lo, r.lo), math.Max(hi, r.hi)
		}
		b = between(b, math.Exp(lo), math.Exp(hi))
	case f.loOpen || f.hiOpen:
		dir, flag := 1., budget.Upper
		if f.hiOpen {
			dir, flag = -1, budget.Lower
		}
		for _, k := range []float64{f.o.Sigma, 2, 1} {
			if at, open := f.closing(f.bottom, k*k, dir); !open {
				b = bounded(b, math.Exp(at), k, flag)
				break
			}
		}
		b.Flag |= bound
	default:
		b = asymmetric(b, math.Exp(f.hi)-b.X, b.X-math.Exp(f.lo))
		b.Flag |= bound
	}
	f.res.B = b

	open := f.loOpen
	for _, r := range rivals {
		open = open || r.open
	}
	for c, k := range f.use {
		x := f.number(g[c], 1)
		x.X = f.best[c]
		f.res.BestLogN[k] = f.best[c]
		lo, hi := f.columnRange(c, f.bottom, f.lo, f.hi)
		for _, r := range rivals {
			l, h := f.columnRange(c, r.bottom, r.lo, r.hi)
			lo, hi = math.Min(lo, l), math.Max(hi, h)
		}
		switch {
		case open && f.hang(c) > hangs:
			s := f.o.Sigma * f.o.Sigma
			ylo, _ := f.closing(f.bottom, s, -1)
			yhi, _ := f.closing(f.bottom, s, 1)
			x = bounded(x, f.valley.extreme(c, f.bottom.chi2+s, -1, ylo, yhi, f.bottom), f.o.Sigma, budget.Lower|budget.AtBound)
			f.note("log N(%s) hangs on the lower bound of b, %g km/s: lower limit at %g σ (best fit %.2f)", f.levels[k].Name, f.o.BMin, x.Conf, f.best[c])
		case len(rivals) > 0:
			x = between(x, lo, hi)
		default:
			x = asymmetric(x, hi-x.X, x.X-lo)
			x.Flag |= bound
		}
		if f.saturated(c) {
			x.Flag |= budget.Saturated
		}
		f.res.LogN[k] = x
	}
	switch {
	case f.corrMin > 0.5:
		f.note("every detected line is on the flat part of the curve (corrections %.2f to %.2f dex): log N rests on b and on one cloud being enough", f.corrMin, f.corrMax)
	case f.hiOpen:
		f.note("b has no upper bound in the data: the lines are on or near the linear part (largest correction %.3f dex)", f.corrMax)
	}
}

// A rival is a second solution within 1σ, with the range of ln b around it.
type rival struct {
	bottom
	lo, hi float64
	open   bool // at the lower bound
}

func (f *fit) rivals() []rival {
	var out []rival
	for _, b := range f.others {
		if b.chi2 < f.bottom.chi2+OneSigma && (b.y < f.lo || b.y > f.hi) {
			lo, open := f.closing(b, OneSigma, -1)
			hi, _ := f.closing(b, OneSigma, 1)
			out = append(out, rival{b, lo, hi, open})
		}
	}
	return out
}

// columnRange is where log N of column c lies within Δχ² = 1 for ln b in lo .. hi.
func (f *fit) columnRange(c int, from bottom, lo, hi float64) (least, most float64) {
	target := f.bottom.chi2 + OneSigma
	return f.valley.extreme(c, target, -1, lo, hi, from), f.valley.extreme(c, target, 1, lo, hi, from)
}

// bounded makes a limit: of the shifts those of f stay, which the limit does not
// allow for.
func bounded(n budget.Number, x, conf float64, flag budget.Flag) budget.Number {
	n = fOnly(n)
	n.X, n.Conf = x, conf
	n.Flag |= flag
	return n
}

// between makes an interval.
func between(n budget.Number, lo, hi float64) budget.Number {
	n = fOnly(n)
	n.X = lo + (hi-lo)/2
	n.Up, n.Lo = (hi-lo)/2, (hi-lo)/2
	n.Conf = 1
	n.Flag |= budget.Interval
	return n
}

func fOnly(n budget.Number) budget.Number {
	n.Shifts = slices.DeleteFunc(n.Shifts, func(s budget.Shift) bool { return s.Cause != budget.FValue })
	return n
}

// number returns the shifts of a parameter that follows the measured widths as
// g: one private to each width (with a key, because the columns of several levels
// and b share it), one for each shared shift, one for each f.
func (f *fit) number(g []float64, scale float64) budget.Number {
	var n budget.Number
	for i := range f.d.pts {
		p := &f.d.pts[i]
		n.From = append(n.From, budget.Ref{Kind: "line", Key: p.Line.Name, Note: p.Line.FSource})
		if i >= f.d.gauss {
			continue
		}
		s := g[i] * scale
		n.Shifts = append(n.Shifts, budget.Shift{Cause: budget.Photon, Key: fmt.Sprintf("W:%s:%s:%d", f.o.Key, p.Line.Name, i), D: s * p.Err})
		for k, c := range p.Common {
			if c.Key == "" {
				c.Key = fmt.Sprintf("W:%s:%s:%d:%d", f.o.Key, p.Line.Name, i, k)
			}
			c.D *= s
			n.Shifts = append(n.Shifts, c)
		}
		if p.Line.FErr > 0 {
			// a larger f makes the model width larger, as a larger N does
			dlogf := p.Line.FErr / (p.Line.F * math.Ln10)
			n.Shifts = append(n.Shifts, budget.Shift{Cause: budget.FValue, Key: "f:" + p.Line.Name, D: -s * f.exact.dx[i] * dlogf})
		}
	}
	return budget.Combine([]float64{1}, n)
}

// asymmetric sets errors from the profile of χ², to which the error of f adds.
// Errors within 3 % of each other and of the linear one stay symmetric.
func asymmetric(n budget.Number, up, lo float64) budget.Number {
	var f float64
	if e := n.ErrBy(budget.FValue); e > 0 {
		f = e
	}
	return asymmetricTotal(n, math.Hypot(up, f), math.Hypot(lo, f))
}

func asymmetricTotal(n budget.Number, up, lo float64) budget.Number {
	e := n.Err()
	if math.Abs(up-e) > 0.03*e || math.Abs(lo-e) > 0.03*e {
		n.Up, n.Lo = up, lo
	}
	return n
}

// hang is by how much log N of column c falls per dex of b at the lower bound.
func (f *fit) hang(c int) float64 {
	v := f.valley
	x := append([]float64(nil), f.bottom.x...)
	const h = 0.1
	v.solve(x, v.ymin, -1)
	low := x[c]
	v.solve(x, v.ymin+h, -1)
	return (low - x[c]) / (h / math.Ln10)
}

// setCov spreads a covariance over all levels; those without a detection keep 0.
func (f *fit) setCov(cov []float64) {
	all, n := len(f.levels)+1, f.d.cols+1
	index := append(append([]int(nil), f.use...), len(f.levels))
	for i, a := range index {
		for j, b := range index {
			f.res.Cov[a*all+b] = cov[i*n+j]
		}
	}
}

// correction is log N − log N(weak-line relation of the model width) of point i.
func (f *fit) correction(i int) float64 {
	x := f.best[f.d.col[i]]
	return math.Max(x-math.Log10(Linear(f.exact.m[i], f.d.pts[i].Line)), 0)
}

func (f *fit) corrections() {
	f.exact.model(f.best)
	f.corrMin, f.corrMax = math.Inf(1), 0
	for i := range f.d.gauss {
		if f.d.pts[i].W >= budget.DetectionSigma*f.d.sigma(i) {
			c := f.correction(i)
			f.corrMin, f.corrMax = math.Min(f.corrMin, c), math.Max(f.corrMax, c)
		}
	}
	if math.IsInf(f.corrMin, 1) {
		f.corrMin = 0
	}
}

// saturated reports whether every detected line of column c is.
func (f *fit) saturated(c int) bool {
	some := false
	for i := range f.d.gauss {
		if f.d.col[i] == c && f.d.pts[i].W >= budget.DetectionSigma*f.d.sigma(i) {
			if f.correction(i) <= SaturatedAbove {
				return false
			}
			some = true
		}
	}
	return some
}
