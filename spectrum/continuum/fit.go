package continuum

import (
	"fmt"
	"math"
	"slices"

	"lacuna/internal/oops"
	"lacuna/spectrum"
)

// Fit places a Legendre polynomial on the line-free pixels of a piece of
// spectrum: wave (vacuum Å, ascending), flux, err (nil: none) and mask (nil: all
// good) have equal length.
//
// With o.Windows the pixels inside them are used, save single outliers. Without,
// all pixels are candidates: the search starts from an upper envelope, then
// leaves out single pixels beyond o.Low and o.High σ, and every stretch of 3 to
// 33 pixels whose sum lies 4.5 σ below (5.5 σ above) the continuum, grown to
// where the flux returns. Pixels of count zero (error 0) are kept like others:
// at few counts they are part of the distribution.
//
// Degree −1 takes the degree with the smallest
//
//	AICc = χ²/T + 2k m/(m−k−1),  k = degree+1, m = n/T, T = 1 + 2Σρ,
//
// on the same candidates for every degree, rejected ones counted with χ² = Low²:
// n/T is the number of independent pixels. The covariance of the coefficients is
// M Σ Mᵀ, M = (AᵀWA)⁻¹AᵀW and Σ the noise as measured, so that W need only be
// about right. Alt holds what else could have been chosen: one degree less (unless
// the data exclude it at 3σ) and one more (also two more where the degree was
// chosen here), and windows of 0.8 and 1.2 times the width; automatic regions lose
// the outer or the inner fifth of each side.
//
// Method: Sembach & Savage 1992, ApJS 83, 147 (Legendre polynomials, formal
// errors of the coefficients carried into the widths); Hurvich & Tsai 1989,
// Biometrika 76, 297 (the criterion). Both from memory; here with correlated noise.
func Fit(wave, flux, err []float64, mask []spectrum.Reason, o Options) (Model, error) {
	w, e := prepare(wave, flux, err, mask, o)
	if e != nil {
		return Model{}, e
	}
	return w.fit()
}

func (w *work) fit() (Model, error) {
	degree, by := w.o.Degree, "Legendre, degree by AICc"
	var use []bool
	var err error
	if degree < 0 {
		if use, degree, err = w.choose(); err != nil {
			return Model{}, err
		}
	} else {
		by = "Legendre, degree given"
		if degree > 0 && w.o.hasTarget() {
			if a, b := w.sides(w.adm); a < leastSide || b < leastSide {
				return Model{}, oops.Input("", "", fmt.Sprintf("continuum of degree %d with %d pixels below the line and %d above", degree, a, b),
					"give windows on both sides, or degree 0")
			}
		}
		if use, err = w.sel(degree); err != nil {
			return Model{}, err
		}
	}
	m := Model{Domain: w.dom, Degree: degree, Wave: w.wave, By: by, Pixels: use}
	if w.o.Windows == nil {
		m.By += ", line-free regions found"
	}
	if err := w.finish(&m); err != nil {
		return Model{}, err
	}
	w.alternatives(&m)
	w.unscale(&m)
	return m, nil
}

// penalty is what AICc adds to χ² for k coefficients on m independent pixels. A
// blaze or a stellar wing is no polynomial, so that there is no true degree to be
// found (what BIC is for): BIC took too few terms and left widths 0.3 to 0.6σ low
// in simulated echelle orders, AICc half of that.
func penalty(k int, m float64) float64 {
	return 2 * float64(k) * m / max(m-float64(k)-1, 1)
}

// choose selects pixels for every degree and takes the one with the smallest AICc.
func (w *work) choose() ([]bool, int, error) {
	top := w.highest(w.adm, w.o.MaxDegree)
	if w.o.hasTarget() && top == 0 {
		a, b := w.sides(w.adm)
		w.notes = append(w.notes, fmt.Sprintf("continuum of degree 0: %d pixels below the line, %d above", a, b))
	}
	sets := make([][]bool, top+1)
	res := make([][]float64, top+1)
	highest := -1
	var failed error
	for d := range sets {
		u, err := w.sel(d)
		if err != nil { // a degree far too low can lose every pixel
			failed = err
			continue
		}
		sets[d], res[d], highest = u, slices.Clone(w.r), d
	}
	if highest < 0 {
		return nil, 0, failed
	}
	noise := w.noise(res[highest], sets[highest], highest+1)
	s2, tau := noise.Ratio*noise.Ratio, noise.Tau(0)
	best, least := highest, math.Inf(1)
	n := w.count(w.adm)
	for d := range sets {
		if sets[d] == nil {
			continue
		}
		chi2 := 0.0
		for i, a := range w.adm {
			switch {
			case !a:
			case sets[d][i]:
				chi2 += min(res[d][i]*res[d][i]/s2, w.o.Low*w.o.Low)
			default:
				chi2 += w.o.Low * w.o.Low
			}
		}
		if c := chi2/tau + penalty(d+1, float64(n)/tau); c < least {
			best, least = d, c
		}
	}
	return sets[best], best, nil
}

// noise measures the noise of residuals r as far as it is not known.
func (w *work) noise(r []float64, use []bool, p int) Noise {
	m := measure(r, use, p, [2]float64{w.o.Low, w.o.High})
	if k := w.o.Noise; k != nil {
		m.Rho, m.raw, m.Pixels = k.Rho, nil, k.Pixels
		if w.knownRatio() {
			m.Ratio = k.Ratio
		}
	}
	return m
}

// knownRatio: without an error array the scatter is always measured here.
func (w *work) knownRatio() bool { return w.o.Noise != nil && w.o.Noise.Ratio > 0 && w.tab != nil }

// finish fits m.Degree to m.Pixels and fills in errors and noise.
func (w *work) finish(m *Model) error {
	p := m.Degree + 1
	m.Coef = make([]float64, p)
	if err := w.solve(m.Coef, m.Pixels); err != nil {
		return w.tooFew(m.Pixels, m.Degree)
	}
	m.Noise = w.noise(w.r, m.Pixels, p)
	if math.IsNaN(m.Noise.Ratio) {
		return w.tooFew(m.Pixels, m.Degree)
	}
	m.Noise.Range = w.dom
	m.Sigma = make([]float64, len(w.wave))
	base := w.tab
	if base == nil {
		m.Noise.FromData = true
		base = w.sig
		if !(m.Noise.Ratio > 1e-9) {
			return oops.Input("", "", "the flux shows no scatter and there is no error column: no error can be given", "give an error column")
		}
	} else if !(m.Noise.Ratio > 0.02) {
		w.notes = append(w.notes, fmt.Sprintf("the residuals scatter by only %.2g of the error array, as in a model without noise: the error array is used as it is", m.Noise.Ratio))
		m.Noise.Ratio = 1
		m.Noise.Rho = nil
	}
	for i := range m.Sigma {
		m.Sigma[i] = base[i] * m.Noise.Ratio
	}
	if m.Noise.FromData {
		m.Noise.Ratio = 1
	}
	var err error
	if m.infl, err = w.b.influence(p, w.w, m.Pixels); err != nil {
		return w.tooFew(m.Pixels, m.Degree)
	}
	m.Cov = sandwich(m.infl, m.Sigma, p, m.Noise)
	for i, u := range m.Pixels {
		if u {
			m.Used++
		} else if w.adm[i] {
			m.Dropped++
		}
	}
	if w.o.Windows != nil {
		m.Windows = w.o.Windows
	} else {
		m.Windows = runs(w.wave, m.Pixels)
	}
	if f := float64(m.Dropped) / float64(m.Used+m.Dropped); f > 0.4 {
		w.notes = append(w.notes, fmt.Sprintf("%.0f %% of the candidate pixels were rejected: look at the continuum", 100*f))
	}
	return nil
}

func (w *work) tooFew(use []bool, degree int) error {
	return oops.Input("", "", fmt.Sprintf("%d line-free pixels between %.3f and %.3f Å are too few for a continuum of degree %d", w.count(use), w.dom[0], w.dom[1], degree),
		"give continuum windows, or a lower degree")
}

// unscale puts the model back into the unit of the flux.
func (w *work) unscale(m *Model) {
	mul := func(a []float64, f float64) {
		for i := range a {
			a[i] *= f
		}
	}
	mul(m.Coef, w.scale)
	for _, a := range m.Alt {
		mul(a, w.scale)
	}
	mul(m.Cov, w.scale*w.scale)
	mul(m.Sigma, w.scale)
	m.Notes = w.notes
}

// runs lists the ranges (Å) of consecutive true pixels.
func runs(wave []float64, use []bool) [][2]float64 {
	var out [][2]float64
	for i := 0; i < len(use); i++ {
		if !use[i] {
			continue
		}
		j := i
		for j+1 < len(use) && use[j+1] {
			j++
		}
		out = append(out, [2]float64{wave[i], wave[j]})
		i = j
	}
	return out
}
