package clouds

import (
	"math"
	"strings"
)

// An Interval is where χ², minimised over all else, lies less than Delta above its
// minimum: with Delta 1 the 68.27 % interval of one number, with 3.84 that of 95 %
// (Wilks 1938, Ann. Math. Stat. 9, 60; from memory), whether or not the errors are
// symmetric.
type Interval struct {
	Name   string  `json:"name"`
	X      float64 `json:"x"` // at the minimum
	Lo, Hi float64
	// No end was found before the bounds of the parameter, or before the fit could
	// follow no further: Lo and Hi are then as far as it came.
	OpenLo bool    `json:"open_lo,omitempty"`
	OpenHi bool    `json:"open_hi,omitempty"`
	Delta  float64 `json:"delta"`
	// Lower is by how much χ² fell below the minimum on the way: above 0.1 the fit was in a
	// local minimum, and BestX is the place of the lower one.
	Lower float64   `json:"lower,omitempty"`
	BestX []float64 `json:"-"`
}

// A target is a function of the parameters that a profile runs along: a parameter, or
// the column of a carrier over all clouds.
type target struct {
	free    int        // index of the free parameter; −1
	carrier string     // of a column
	in      [2]float64 // km/s, of the column
	logs    bool       // in log₁₀
}

// A hold is the row that keeps a target in its place during a fit.
type hold struct {
	of     target
	at     float64
	weight float64
	grad   []float64
}

// TotalName is the name by which Profile knows the column of a carrier over all clouds
// ("log N total(Na I)").
func TotalName(carrier string) string { return "log N total(" + carrier + ")" }

// find returns the target of a name.
func (f *Fitter) target(name string) (target, error) {
	if i, ok := f.params.byName[name]; ok {
		if f.params.all[i].free < 0 {
			return target{}, bad(name, "take the parameter that it follows", "not a free parameter")
		}
		return target{free: f.params.all[i].free}, nil
	}
	if c, ok := strings.CutPrefix(name, "log N total("); ok {
		c = strings.TrimSuffix(c, ")")
		for i := range f.comps {
			if f.comps[i].carrier == c {
				return target{free: -1, carrier: c, in: everything, logs: true}, nil
			}
		}
	}
	_, err := f.params.find(name, -1, "profile")
	return target{}, err
}

// value returns the target at the current point of the comps; grad, if not nil, gets
// its gradient.
func (f *Fitter) value(t target, x, grad []float64) float64 {
	if t.free >= 0 {
		return x[t.free]
	}
	sum := f.columnIn(t.carrier, t.in, grad)
	if !t.logs {
		return sum
	}
	for j := range grad {
		grad[j] /= sum * math.Ln10
	}
	return math.Log10(sum)
}

// Profile finds the interval of a free parameter, or of a total (TotalName), about the
// result r of this fitter.
func (f *Fitter) Profile(r Result, name string, delta float64) (Interval, error) {
	if !(delta > 0) {
		return Interval{}, bad(name, "give a Δχ² such as 1, 3.84 or 9", "Δχ² of %g", delta)
	}
	t, err := f.target(name)
	if err != nil {
		return Interval{}, err
	}
	for i := range f.comps {
		f.comps[i].set(r.X)
	}
	p := profile{f: f, t: t, base: r.Chi2, best: r.X}
	out := Interval{Name: name, X: f.value(t, r.X, nil), Delta: delta}
	p.sigma = f.sigma(r, t)
	out.Hi, out.OpenHi, err = p.edge(out.X, r.X, delta, +1)
	if err != nil {
		return out, err
	}
	out.Lo, out.OpenLo, err = p.edge(out.X, r.X, delta, -1)
	if err != nil {
		return out, err
	}
	if d := r.Chi2 - p.base; d > 0.1 {
		out.Lower, out.BestX = d, p.best
	}
	return out, nil
}

// sigma is the linear error of a target, or a guess where there is none.
func (f *Fitter) sigma(r Result, t target) float64 {
	g := make([]float64, r.a.n)
	guess := 0.1
	if t.free >= 0 {
		g[t.free] = 1
		if w := f.hi[t.free] - f.lo[t.free]; finite(w) {
			guess = w / 50
		} else {
			guess = 0.1 * max(math.Abs(r.X[t.free]), 1e-3)
		}
	} else {
		f.value(t, r.X, g)
	}
	s := math.Sqrt(max(0, r.a.covariance(g, g)))
	if s == 0 || !r.a.determined(g) {
		return guess
	}
	return s
}
