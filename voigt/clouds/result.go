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

// corr is the correlation of two linear functions, 0 where one is fixed.
func (a *analysis) corr(g, h []float64) float64 {
	v := a.covariance(g, g) * a.covariance(h, h)
	if !(v > 0) {
		return 0
	}
	return min(max(-1, a.covariance(g, h)/math.Sqrt(v)), 1)
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
