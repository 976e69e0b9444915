package clouds

import (
	"math"

	"lacuna/budget"
)

// thinTau is the central optical depth up to which a line is thin, to about a tenth
// (F/F_linear = 1 − τ₀/2√2 + …).
const thinTau = 0.3

// limitSigma is the confidence of the limits that Fit itself gives.
const limitSigma = 3

// unit returns the gradient of free parameter j.
func gradient(n int, ts []term) []float64 {
	g := make([]float64, n)
	for _, t := range ts {
		g[t.j] += t.k
	}
	return g
}

// number makes a Number of a function of the parameters p with value x and gradient g:
// NaN if the data do not determine it.
func (a *analysis) number(x float64, g []float64, p ...Param) budget.Number {
	n := budget.Number{X: x}
	lost := !a.determined(g)
	for _, q := range p {
		if q.AtBound != 0 {
			n.Flag |= budget.AtBound
		}
		lost = lost || q.Undetermined
	}
	if lost {
		n.X = math.NaN()
		return n
	}
	n.Shifts = a.shifts(g)
	return n
}

// limited returns N ± σ as it is where detected, else the upper limit max(N, 0) + 3σ
// with N ± σ behind it.
func limited(n budget.Number) budget.Number {
	if s := n.Without(budget.FValue); n.X < limitSigma*s {
		l := budget.Limit(n, max(n.X, 0)+limitSigma*n.Without(budget.FValue), limitSigma)
		return l
	}
	return n
}

func (r *Result) params(f *Fitter, a *analysis) {
	for i := range f.params.all {
		p := &f.params.all[i]
		q := Param{Name: p.name, X: p.value.at(r.X), Free: p.free >= 0}
		g := gradient(a.n, p.value.terms)
		if p.free >= 0 && a.at != nil {
			q.AtBound = a.at[p.free]
		}
		if len(p.value.terms) > 0 {
			if a.determined(g) {
				q.Err = math.Sqrt(max(0, a.covariance(g, g)))
			}
			q.Undetermined = !a.determined(g) || p.free >= 0 && q.Err > p.hi-p.lo
			if q.Undetermined {
				q.Err = 0
			}
		}
		r.Params = append(r.Params, q)
	}
}

func (r *Result) clouds(f *Fitter, a *analysis) {
	for _, i := range f.clouds {
		c := f.in.Clouds[i]
		out := CloudFit{Name: c.Name}
		if c.Thermal {
			t, _ := r.Param(out.Name + ": T")
			turb, _ := r.Param(out.Name + ": turbulence")
			out.T, out.Turb = &t, &turb
		}
		v, _ := r.Param(out.Name + ": v")
		vg := gradient(a.n, f.params.all[f.params.byName[out.Name+": v"]].value.terms)
		out.V = a.number(v.X, vg, v)
		for k := range f.comps {
			if d := &f.comps[k]; d.cloud == i {
				out.Species = append(out.Species, r.species(f, a, d))
			}
		}
		r.Clouds = append(r.Clouds, out)
	}
}

// species works out one comp; its values are those at the solution.
func (r *Result) species(f *Fitter, a *analysis, d *comp) SpeciesFit {
	out := SpeciesFit{Carrier: d.carrier}
	pv, _ := r.Param(d.names[0])
	pb, _ := r.Param(d.names[1])
	pn, _ := r.Param(d.names[2])
	gv, gb, gn := gradient(a.n, d.dv), gradient(a.n, d.db), gradient(a.n, d.dn)
	out.V = a.number(d.V, gv, pv)
	out.B = a.number(d.B, gb, pb)
	f.depths(d, &out)
	inst := f.instrument(d)
	bErr := out.B.Err()
	if len(d.db) > 0 && d.B < inst/3 {
		// The profile's width decides: only how wide the cloud can be at most is known.
		if math.IsNaN(out.B.X) {
			out.B.X = d.B
		}
		out.B = budget.Limit(out.B, d.B+limitSigma*bErr, limitSigma)
	}
	// A column that is not detected is N ± σ with a limit, whichever of N and log N was the
	// parameter: while the line is thin, flux is linear in N, not in log N.
	pn.Undetermined = false
	out.N = a.number(d.N, d.columnGradient(a.n), pn)
	if faint := out.N.X < limitSigma*out.N.Without(budget.FValue) && out.Tau0 < thinTau; d.linear || faint {
		out.LogN = budget.Log10(limited(out.N))
	} else {
		out.LogN = a.number(d.logN(), gn, pn)
		out.N = budget.Pow10(out.LogN)
	}
	if pb.AtBound != 0 { // the error of N is that for this b
		out.N, out.LogN = out.N.With(budget.AtBound), out.LogN.With(budget.AtBound)
	}
	if out.Weakest > saturatedTau {
		out.N, out.LogN = out.N.With(budget.Saturated), out.LogN.With(budget.Saturated)
	}
	out.CorrNB = a.corr(gn, gb)
	for _, w := range f.wins {
		if w.width >= 0 && w.has(d, f) {
			g := make([]float64, a.n)
			g[w.cols[w.width]] = 1
			if c := a.corr(gb, g); math.Abs(c) > math.Abs(out.CorrBWidth) {
				out.CorrBWidth = c
			}
		}
	}
	return out
}

// has reports whether the comp absorbs in the window.
func (w *window) has(d *comp, f *Fitter) bool {
	for _, b := range w.absorb {
		if &f.comps[b.comp] == d {
			return true
		}
	}
	return false
}

// instrument returns the Doppler parameter of the sharpest instrument that sees a comp,
// FWHM/(2√ln 2), km/s.
func (f *Fitter) instrument(d *comp) float64 {
	b := math.Inf(1)
	for _, w := range f.wins {
		if w.has(d, f) {
			b = min(b, w.grid.fwhm/(2*math.Sqrt(math.Ln2)))
		}
	}
	return b
}
