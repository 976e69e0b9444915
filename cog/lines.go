package cog

import (
	"math"

	"gonum.org/v1/gonum/mathext"

	"lacuna/voigt"
)

// lines fills the table of points against the fitted curve, in the order given.
func (f *fit) lines() {
	b := f.res.BestB
	for k, l := range f.levels {
		x := f.res.BestLogN[k]
		for _, p := range l.Points {
			r := LineResult{Line: p.Line.Name, Column: k, Wave: p.Line.Wave, F: p.Line.F, W: p.W, Err: total(p), Limit: p.Limit,
				Model: Width(p.Line, x, b), Tau0: voigt.Tau0(math.Pow(10, x), p.Line.F, p.Line.Wave, b),
				LogNLinear: math.NaN(), LogWL: math.NaN(), LogFNL: x + logFL(&p.Line)}
			r.Correction = math.Max(x-math.Log10(Linear(r.Model, p.Line)), 0)
			if p.W > 0 {
				r.LogNLinear = math.Log10(Linear(p.W, p.Line))
				r.LogWL = math.Log10(p.W / p.Line.Wave)
			}
			f.res.Lines = append(f.res.Lines, r)
		}
	}
}

// contradictions names what no cloud gives: a χ² that 1 in 370 fits exceeds, and
// pairs of lines of one level whose ratio lies outside what any N and b allow.
func (f *fit) contradictions() {
	for i := range f.d.gauss {
		for j := range i {
			f.contradict(j, i)
		}
	}
	excess := f.chi2
	if f.res.DOF > 0 {
		if p := chi2Tail(excess, f.res.DOF); p < 0.0027 {
			f.note("χ² = %.1f for %d degrees of freedom: the widths and their errors do not fit one curve (probability %.1g)", excess, f.res.DOF, p)
		}
	} else if excess > 4 {
		f.note("χ² = %.1f without a degree of freedom: the widths contradict every curve of growth", excess)
	}
}

// contradict compares W/λ of two lines of one level.
func (f *fit) contradict(i, j int) {
	d := f.d
	if d.col[i] != d.col[j] {
		return
	}
	fl := func(k int) float64 { return d.pts[k].Line.F * d.pts[k].Line.Wave }
	if fl(i) < fl(j) {
		i, j = j, i
	}
	a, b := &d.pts[i], &d.pts[j]
	most := fl(i) / fl(j)
	if most < 1.02 || !(a.W > 0 && b.W > 0) {
		return
	}
	ratio := a.W / a.Line.Wave / (b.W / b.Line.Wave)
	// signed distances in σ of W_i/λ_i − R W_j/λ_j from R = 1 and R = most
	distance := func(r float64) float64 {
		u, v := 1/a.Line.Wave, -r/b.Line.Wave
		s := u*u*d.covariance(i, i) + v*v*d.covariance(j, j) + 2*u*v*d.covariance(i, j)
		return (u*a.W + v*b.W) / math.Sqrt(s)
	}
	const much = 2 // σ
	switch {
	case distance(1) < -much:
		f.note("%s is weaker than %s (ratio %.2f, %.1f σ below 1) though its fλ is larger by %.2f: a blend, a continuum or an error is wrong",
			a.Line.Name, b.Line.Name, ratio, -distance(1), most)
	case distance(most) > much:
		f.note("%s over %s is %.2f, %.1f σ above the %.2f of thin lines: a blend, a continuum, an f-value or an error is wrong",
			a.Line.Name, b.Line.Name, ratio, distance(most), most)
	}
}

// chi2Tail is the probability that χ² of n degrees of freedom exceeds x.
func chi2Tail(x float64, n int) float64 {
	return mathext.GammaIncRegComp(float64(n)/2, x/2)
}
