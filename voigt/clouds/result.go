package clouds

import (
	"math"
	"slices"

	"lacuna/budget"
)

// A Result is a solution with its errors. Everything in it is finite or a
// budget.Number, so that it can be written as JSON.
type Result struct {
	Clouds  []CloudFit  `json:"clouds"`
	Totals  []Total     `json:"totals"`
	Params  []Param     `json:"params"`
	Windows []WindowFit `json:"windows"`

	Chi2   float64 `json:"chi2"`
	Pixels int     `json:"pixels"`
	NEff   float64 `json:"n_eff"`  // independent pixels: each window's number over 1 + 2Σρ
	Fitted int     `json:"fitted"` // parameters, those of the continuum included, those with a prior not
	DOF    int     `json:"dof"`
	BIC    float64 `json:"bic"`  // χ² + k ln n_eff
	AICc   float64 `json:"aicc"` // χ² + 2k + 2k(k+1)/(n_eff − k − 1); 0 where n_eff ≤ k + 1

	Stop        string `json:"stop"`
	Converged   bool   `json:"converged"`
	Iterations  int    `json:"iterations"`
	Evaluations int    `json:"evaluations"`

	Condition  float64  `json:"condition"` // of the design matrix, columns of unit length
	Degenerate []Pair   `json:"degenerate,omitempty"`
	Whiteness  Tests    `json:"tests"`
	Notes      []string `json:"notes,omitempty"`

	// The number of clouds was chosen from the data: the intervals of single clouds hold
	// for this number only.
	Conditional bool `json:"conditional,omitempty"`

	X   []float64 `json:"x"` // free parameters, in the order of Free
	Cov []float64 `json:"-"` // their covariance, row by row; the undetermined directions left out

	a *analysis
}

// A CloudFit is one cloud.
type CloudFit struct {
	Name    string        `json:"name"`
	V       budget.Number `json:"v"` // km/s
	Species []SpeciesFit  `json:"species"`
	T       *Param        `json:"t,omitempty"`          // K, where b is split
	Turb    *Param        `json:"turbulence,omitempty"` // km/s
}

// A SpeciesFit is one species of a cloud.
type SpeciesFit struct {
	Carrier string        `json:"carrier"`
	V       budget.Number `json:"v"`       // km/s; that of the cloud unless the species has its own
	B       budget.Number `json:"b"`       // km/s; an upper limit where below a third of the instrument's
	LogN    budget.Number `json:"log_n"`   // dex
	N       budget.Number `json:"n"`       // cm⁻²; N ± σ, also where it is no detection
	Tau0    float64       `json:"tau0"`    // optical depth at the centre of its strongest line
	Weakest float64       `json:"weakest"` // and of its weakest
	// Correlation of log N and b, and of b and the width of the instrument's profile.
	CorrNB     float64 `json:"corr_n_b"`
	CorrBWidth float64 `json:"corr_b_width"`
}

// A Total is the column of one carrier over all clouds.
type Total struct {
	Carrier string        `json:"carrier"`
	N       budget.Number `json:"n"`     // cm⁻²
	LogN    budget.Number `json:"log_n"` // dex
	// Naive is the error that the clouds' errors would give in quadrature, as if they
	// were independent (cm⁻²).
	Naive float64 `json:"naive"`
}

// A Param is one parameter by its name.
type Param struct {
	Name         string  `json:"name"`
	X            float64 `json:"x"`
	Err          float64 `json:"err"`                // 1σ; 0 where fixed, at a bound or undetermined
	AtBound      int     `json:"at_bound,omitempty"` // −1 lower, +1 upper
	Undetermined bool    `json:"undetermined,omitempty"`
	Free         bool    `json:"free"`
}

// Free returns the names of the free parameters in the order of X and Cov.
func (r Result) Free() []string {
	var out []string
	for _, p := range r.Params {
		if p.Free {
			out = append(out, p.Name)
		}
	}
	return out
}

// Param returns a parameter by its name.
func (r Result) Param(name string) (Param, bool) {
	for _, p := range r.Params {
		if p.Name == name {
			return p, true
		}
	}
	return Param{}, false
}

// A Pair is two parameters that the data hardly tell apart.
type Pair struct {
	A, B string
	Corr float64
}

// A WindowFit is one window.
type WindowFit struct {
	Name      string     `json:"name"`
	Pixels    int        `json:"pixels"`
	Chi2      float64    `json:"chi2"`                // of its pixels, correlations taken out
	Domain    [2]float64 `json:"domain"`              // Å, −1 and +1 of the continuum's polynomials
	Continuum []float64  `json:"continuum,omitempty"` // Legendre coefficients, unit of the flux
	Zero      float64    `json:"zero"`                // zero level, part of the continuum
	ZeroErr   float64    `json:"zero_err"`
	FWHM      float64    `json:"fwhm"` // km/s, of the instrument, as fitted
	Whiteness Tests      `json:"tests"`
}

// thinTau is the central optical depth up to which a line is thin, to about a tenth
// (F/F_linear = 1 − τ₀/2√2 + …).
const thinTau = 0.3

// limitSigma is the confidence of the limits that Fit itself gives.
const limitSigma = 3

// result works out everything about a solution.
func (f *Fitter) result(s state) Result {
	a := f.analyse(s.x, s.at)
	r := Result{
		Chi2: s.chi2, Stop: s.stop, Converged: s.ok, Iterations: s.its, Evaluations: s.evals,
		Condition: min(a.cond, 1e300), X: s.x, a: a,
	}
	n := len(s.x)
	r.Cov = make([]float64, n*n)
	for i := range n {
		for j := range n {
			r.Cov[i*n+j] = a.cov.At(i, j)
		}
	}
	r.count(f)
	r.params(f, a)
	r.clouds(f, a)
	r.totals(f, a)
	r.windows(f, a)
	r.diagnose(f, a)
	return r
}

// count fills the criteria.
func (r *Result) count(f *Fitter) {
	for _, w := range f.wins {
		r.Pixels += len(w.pix)
		r.NEff += float64(len(w.pix)) / max(1, w.noise.tau)
		r.Fitted += w.k
		if w.zeroRow {
			r.Fitted--
		}
	}
	for _, i := range f.params.free {
		if f.params.all[i].par.Sigma == 0 {
			r.Fitted++
		}
	}
	r.DOF = r.Pixels - r.Fitted
	k := float64(r.Fitted)
	r.BIC = r.Chi2 + k*math.Log(r.NEff)
	if d := r.NEff - k - 1; d > 0 {
		r.AICc = r.Chi2 + 2*k + 2*k*(k+1)/d
	}
}

// unit returns the gradient of free parameter j.
func gradient(n int, ts []term) []float64 {
	g := make([]float64, n)
	for _, t := range ts {
		g[t.j] += t.k
	}
	return g
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

// limited returns N ± σ as it is where detected, else the upper limit max(N, 0) + 3σ
// with N ± σ behind it.
func limited(n budget.Number) budget.Number {
	if s := n.Without(budget.FValue); n.X < limitSigma*s {
		l := budget.Limit(n, max(n.X, 0)+limitSigma*n.Without(budget.FValue), limitSigma)
		return l
	}
	return n
}

// corr is the correlation of two linear functions, 0 where one is fixed.
func (a *analysis) corr(g, h []float64) float64 {
	v := a.covariance(g, g) * a.covariance(h, h)
	if !(v > 0) {
		return 0
	}
	return min(max(-1, a.covariance(g, h)/math.Sqrt(v)), 1)
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

// totals sums the columns of each carrier with the full covariance.
func (r *Result) totals(f *Fitter, a *analysis) {
	var carriers []string
	sum := map[string]*Total{}
	grad := map[string][]float64{}
	for i := range f.comps {
		d := &f.comps[i]
		t := sum[d.carrier]
		if t == nil {
			t = &Total{Carrier: d.carrier}
			sum[d.carrier] = t
			grad[d.carrier] = make([]float64, a.n)
			carriers = append(carriers, d.carrier)
		}
		g := d.columnGradient(a.n)
		for j := range g {
			grad[d.carrier][j] += g[j]
		}
		t.N.X += d.N
		t.Naive += a.covariance(g, g)
		for _, c := range r.Clouds {
			for _, s := range c.Species {
				if c.Name == f.in.Clouds[d.cloud].Name && s.Carrier == d.carrier {
					t.N.Flag |= s.N.Flag & (budget.Saturated | budget.AtBound)
				}
			}
		}
	}
	for _, c := range carriers {
		t := sum[c]
		flag := t.N.Flag
		t.N = a.number(t.N.X, grad[c]).With(flag)
		t.LogN = r.logColumn(a, t.N, grad[c], c)
		t.Naive = math.Sqrt(t.Naive)
		r.Totals = append(r.Totals, *t)
	}
}

// logColumn is the logarithm of a sum of columns n with gradient g. While the lines are
// thin, n is what is normally distributed, and may be no detection; else log n is.
func (r *Result) logColumn(a *analysis, n budget.Number, g []float64, carrier string) budget.Number {
	thin := true
	for _, c := range r.Clouds {
		for _, s := range c.Species {
			thin = thin && (s.Carrier != carrier || s.Tau0 < thinTau)
		}
	}
	if thin || !(n.X > 0) || math.IsNaN(n.X) {
		return budget.Log10(limited(n))
	}
	h := make([]float64, len(g))
	for j := range g {
		h[j] = g[j] / (n.X * math.Ln10)
	}
	return a.number(math.Log10(n.X), h).With(n.Flag)
}

// columnGradient returns ∂N/∂x.
func (c *comp) columnGradient(n int) []float64 {
	g := gradient(n, c.dn)
	if !c.linear {
		for j := range g {
			g[j] *= c.N * math.Ln10
		}
	}
	return g
}

func (r *Result) windows(f *Fitter, a *analysis) {
	r.Windows = make([]WindowFit, len(f.wins))
	lin := a.n
	for k, w := range f.wins {
		out := WindowFit{
			Name: w.name, Pixels: len(w.pix), Zero: w.knownZ,
			Domain: [2]float64{w.in.Wave[w.pix[0]], w.in.Wave[w.pix[len(w.pix)-1]]},
			FWHM:   w.grid.fwhm,
		}
		if w.width >= 0 {
			out.FWHM *= math.Exp(r.X[w.cols[w.width]])
		}
		for k := range w.deg + 1 {
			out.Continuum = append(out.Continuum, w.lin[k]*w.unit)
		}
		if w.zeroCol >= 0 {
			z, sigma := w.lin[w.zeroCol], math.Sqrt(a.cov.At(lin+w.zeroCol, lin+w.zeroCol))
			if w.deg >= 0 {
				out.Zero, out.ZeroErr = z/w.lin[0], sigma/w.lin[0]
			} else {
				out.Zero, out.ZeroErr = z/(1-z), sigma/((1-z)*(1-z))
			}
		}
		lin += w.k
		r.Windows[slices.Index(f.place, k)] = out
	}
}
