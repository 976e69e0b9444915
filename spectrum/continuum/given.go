package continuum

import (
	"fmt"
	"math"
	"slices"

	"lacuna/internal/oops"
	"lacuna/spectrum"
)

// Given takes a user's own continuum on the pixels (all 1 for a spectrum that is
// already normalised), known to the relative error relErr: C = continuum × P,
// with P = 1, or, with o.Rescale, a polynomial of o.Degree fitted to flux over
// continuum on line-free pixels. The other placement is the user's continuum with
// its level fitted there (with Rescale: those of Fit).
//
// A continuum has an error even where a file says that it is 1: relErr must be
// positive unless the level is fitted. With both, the two errors add in
// quadrature.
func Given(wave, flux, err, continuum []float64, mask []spectrum.Reason, relErr float64, o Options) (Model, error) {
	if len(continuum) != len(wave) {
		panic("continuum: wave and continuum differ in length")
	}
	if math.IsNaN(relErr) || relErr < 0 || relErr > 1 {
		return Model{}, oops.Input("", "", fmt.Sprintf("relative error %g of the given continuum", relErr), "give a fraction, 0.01 for 1 %")
	}
	if relErr == 0 && !o.Rescale {
		return Model{}, oops.Input("", "", "a continuum that is given needs an error", "give its relative error (0.01 for 1 %), or let the level be fitted")
	}
	n := len(wave)
	y, m := make([]float64, n), make([]spectrum.Reason, n)
	var e []float64
	if err != nil {
		e = make([]float64, n)
	}
	given := slices.Clone(continuum)
	bad := 0
	for i, c := range continuum {
		if mask != nil {
			m[i] = mask[i]
		}
		if !(c > 0) || math.IsInf(c, 0) {
			m[i] |= spectrum.BadFlux
			given[i] = math.NaN()
			bad++
			continue
		}
		y[i] = flux[i] / c
		if err != nil {
			e[i] = err[i] / c
		}
	}
	if bad == n {
		return Model{}, oops.Input("", "", "the given continuum is nowhere above 0", "mend the continuum column")
	}
	bridge(given)
	scan := o
	if !o.Rescale {
		scan.Degree = -1 // for the noise: about the best polynomial
	}
	w, er := prepare(wave, y, e, m, scan)
	if er != nil {
		return Model{}, er
	}
	fit, er := w.fit()
	if er != nil {
		return Model{}, er
	}
	fit.Given, fit.GivenErr = given, relErr
	for i := range fit.Sigma {
		fit.Sigma[i] *= given[i]
	}
	if bad > 0 {
		fit.Notes = append(fit.Notes, fmt.Sprintf("the given continuum is not positive on %d pixels: they are not used", bad))
	}
	over := func(infl []float64) { // ∂/∂flux, not ∂/∂(flux/continuum)
		for k := range len(infl) / n {
			for i := range n {
				infl[k*n+i] /= given[i]
			}
		}
	}
	over(fit.infl)
	for _, a := range fit.altInfl {
		over(a)
	}
	p := len(fit.Coef)
	if o.Rescale {
		fit.By = fmt.Sprintf("given, rescaled by degree %d", fit.Degree)
		for k := range p { // the stated error moves the whole continuum
			for l := range p {
				fit.Cov[k*p+l] += relErr * relErr * fit.Coef[k] * fit.Coef[l]
			}
		}
		return fit, nil
	}
	fit.By = fmt.Sprintf("given, relative error %.3g", relErr)
	level := make([]float64, 1)
	infl, er := w.level(level, fit.Pixels)
	fit.Alt, fit.AltWhat, fit.altInfl = nil, nil, nil
	if er == nil {
		over(infl)
		fit.Alt, fit.AltWhat, fit.altInfl = [][]float64{level}, []string{"given, level fitted"}, [][]float64{infl}
		if off := level[0] - 1; math.Abs(off) > 3*relErr {
			fit.Notes = append(fit.Notes, fmt.Sprintf("the line-free pixels lie %+.2f %% off the given continuum, more than 3 times its stated error", 100*off))
		}
	}
	fit.Degree, fit.Coef, fit.Cov, fit.infl = 0, []float64{1}, []float64{relErr * relErr}, make([]float64, n)
	return fit, nil
}

// level fits a constant to the used pixels.
func (w *work) level(coef []float64, use []bool) ([]float64, error) {
	if err := w.solve(coef, use); err != nil {
		return nil, err
	}
	coef[0] *= w.scale
	return w.b.influence(1, w.w, use)
}

// bridge fills NaN from the neighbours.
func bridge(a []float64) {
	last := math.NaN()
	for i, v := range a {
		if math.IsNaN(v) {
			a[i] = last
		} else {
			last = v
		}
	}
	for i := len(a) - 2; i >= 0; i-- {
		if math.IsNaN(a[i]) {
			a[i] = a[i+1]
		}
	}
}
