package clouds

import (
	"fmt"
	"math"
	"slices"

	"lacuna/atomic"
	"lacuna/voigt"
)

// saturatedTau is the central optical depth of the weakest line of a species above
// which its column rests on the shape of black cores, or on structure that the
// instrument hides (Jenkins 1986, ApJ 304, 739: safe while τ₀ stays below about 2; from
// memory).
const saturatedTau = 2

// Tests say whether the residuals look like noise. They are taken with the
// measured correlation removed, so that independent residuals are the null.
type Tests struct {
	// DurbinWatson is Σ(r_i − r_{i−1})²/Σr², 2 for independent residuals; WatsonZ is its
	// distance from what is expected, in standard errors, negative where neighbours
	// are alike. The expectation allows for the parameters fitted, which tie neighbours.
	DurbinWatson float64 `json:"durbin_watson"`
	WatsonZ      float64 `json:"watson_z"`
	// RunsZ is the number of runs of equal sign, less its expectation, in standard
	// errors (Wald & Wolfowitz 1940, Ann. Math. Stat. 11, 147; from memory).
	RunsZ float64 `json:"runs_z"`
}

// residuals fills w.resid with (data − model)/σ of each pixel, correlations taken out.
func (w *window) residuals() []float64 {
	n := len(w.pix)
	p := w.deg + 1
	r := w.resid[:n]
	for i, t := range w.flux {
		var m float64
		switch {
		case p > 0:
			m = (t + w.knownZ) * w.continuum(i)
			if w.zeroCol >= 0 {
				m += w.lin[w.zeroCol] * w.inv[i]
			}
		case w.zeroCol >= 0:
			z := w.lin[w.zeroCol]
			m = (t + z*(1-t)) * w.inv[i]
		default:
			m = w.fixedPart(t) * w.inv[i]
		}
		r[i] = m
	}
	w.noise.whiten(r, 1)
	for i := range r {
		r[i] = w.data[i] - r[i]
	}
	return r
}

// series gathers what the tests need.
type series struct {
	n                         int
	sum2, lag, runs, em, var_ float64
}

func (s *series) add(r []float64) {
	plus, minus, runs := 0.0, 0.0, 0.0
	for i, x := range r {
		s.sum2 += x * x
		if x >= 0 {
			plus++
		} else {
			minus++
		}
		if i > 0 {
			s.lag += x * r[i-1]
		}
		if i == 0 || (x >= 0) != (r[i-1] >= 0) {
			runs++
		}
	}
	n := plus + minus
	s.n += len(r)
	s.runs += runs
	if n > 1 {
		e := 2*plus*minus/n + 1
		s.em += e
		s.var_ += (e - 1) * (e - 2) / (n - 1)
	} else {
		s.em += runs
	}
}

// tests compares with the null; tied is the expectation of −Σ r_i r_{i−1}, dof the
// degrees of freedom.
func (s series) tests(tied float64, dof float64) Tests {
	var t Tests
	if !(s.sum2 > 0) || dof < 2 {
		return t
	}
	t.DurbinWatson = 2 * (1 - s.lag/s.sum2)
	t.WatsonZ = (s.lag/s.sum2*dof + tied) / math.Sqrt(dof)
	if s.var_ > 0 {
		t.RunsZ = (s.runs - s.em) / math.Sqrt(s.var_)
	}
	return t
}

// diagnose fills tests, pairs and notes.
func (r *Result) diagnose(f *Fitter, a *analysis) {
	var all series
	for k, w := range f.wins {
		var one series
		res := w.residuals()
		one.add(res)
		all.add(res)
		out := &r.Windows[slices.Index(f.place, k)]
		out.Chi2 = one.sum2
		share := float64(one.n) / float64(r.Pixels)
		out.Whiteness = one.tests(a.tied*share, float64(r.DOF)*share)
		if w.noise.share < 1 {
			r.note("%s: the correlations of the noise were scaled by %.2f to belong to any noise at all", w.name, w.noise.share)
		}
	}
	r.Whiteness = all.tests(a.tied, float64(r.DOF))
	if !r.Converged {
		r.note("the fit did not converge: %s", r.Stop)
	}
	for _, w := range r.Windows {
		if dof := float64(r.DOF) * float64(w.Pixels) / float64(r.Pixels); dof > 0 && w.Chi2 > dof+5*math.Sqrt(2*dof) {
			r.note("%s: χ² = %.0f for %.0f degrees of freedom: the model does not describe this window", w.Name, w.Chi2, dof)
		}
	}
	for _, p := range f.priors {
		if d := (p.value.at(r.X) - p.mean) / p.sigma; math.Abs(d) > 3 {
			r.note("%s: %.3g, %.1fσ from its prior %.3g ± %.3g", p.name, p.value.at(r.X), d, p.mean, p.sigma)
		}
	}
	free := r.Free()
	for i := range free {
		for j := range i {
			gi, gj := make([]float64, a.n), make([]float64, a.n)
			gi[i], gj[j] = 1, 1
			if c := a.corr(gi, gj); math.Abs(c) > 0.95 {
				r.Degenerate = append(r.Degenerate, Pair{free[j], free[i], c})
			}
		}
	}
	for _, dir := range a.null { // by name those that share an undetermined direction
		last := -1
		for j := range a.n {
			if math.Abs(dir[j]) > 0.1 {
				if last >= 0 {
					r.Degenerate = append(r.Degenerate, Pair{free[last], free[j], -sign(dir[last] * dir[j])})
				}
				last = j
			}
		}
	}
	for _, p := range r.Params {
		switch {
		case p.Undetermined:
			r.note("%s: not determined by the data", p.Name)
		case p.AtBound < 0:
			r.note("%s: at its lower bound", p.Name)
		case p.AtBound > 0:
			r.note("%s: at its upper bound", p.Name)
		}
	}
}

func sign(x float64) float64 { return math.Copysign(1, x) }

func (r *Result) note(format string, a ...any) {
	s := fmt.Sprintf(format, a...)
	for _, n := range r.Notes {
		if n == s {
			return
		}
	}
	r.Notes = append(r.Notes, s)
}

// depths fills the central optical depths of the strongest and the weakest line of a
// comp, hyperfine and isotopic structure included.
func (f *Fitter) depths(d *comp, out *SpeciesFit) {
	if !(d.N > 0) {
		return
	}
	out.Weakest = math.Inf(1)
	for _, w := range f.wins {
		for _, b := range w.absorb {
			if &f.comps[b.comp] != d {
				continue
			}
			parts := b.line.Within(0)
			wave, tau := make([]float64, len(parts)), make([]float64, len(parts))
			for i, p := range parts {
				wave[i] = b.line.Wave * (1 + p.DV/atomic.C)
			}
			voigt.AddTau(tau, wave, *b.line, voigt.Cloud{B: d.B, LogN: d.logN()})
			peak := 0.0
			for _, t := range tau {
				peak = max(peak, t)
			}
			out.Tau0, out.Weakest = max(out.Tau0, peak), min(out.Weakest, peak)
		}
	}
	if math.IsInf(out.Weakest, 1) {
		out.Weakest = 0
	}
}
