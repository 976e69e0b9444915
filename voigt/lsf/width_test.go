package lsf_test

import (
	"math"
	"testing"

	"lacuna/voigt/lsf"
)

// A scaled Gaussian is the Gaussian of the scaled width, whatever the sub-grid.
func TestScaled(t *testing.T) {
	edges := make([]float64, 41)
	for i := range edges {
		edges[i] = 5000 + 0.02*float64(i)
	}
	gauss := lsf.Sum{{Weight: 1, FWHM: lsf.Constant(0.08)}}
	wide, err := lsf.New(edges, lsf.Scaled(gauss, 1.2), 2, 4)
	if err != nil {
		t.Fatal(err)
	}
	same, err := wide.With(edges, gauss)
	if err != nil {
		t.Fatal(err)
	}
	for _, tc := range []struct {
		r    lsf.Response
		fwhm float64
	}{{wide, 0.096}, {same, 0.08}} {
		want, err := lsf.Gaussian(edges, lsf.Constant(tc.fwhm), 2, 6)
		if err != nil {
			t.Fatal(err)
		}
		flux := func(r lsf.Response) []float64 {
			tr, f := make([]float64, len(r.Sub)), make([]float64, len(r.First))
			for j, w := range r.Sub {
				x := (w - 5000.4) / 0.05
				tr[j] = 1 - 0.8*math.Exp(-x*x)
			}
			r.Apply(f, tr)
			return f
		}
		a, b := flux(tc.r), flux(want)
		for i := range a {
			if d := math.Abs(a[i] - b[i]); !(d <= 1e-9) { // both sub-grids have converged
				t.Errorf("FWHM %g, pixel %d: %.12f, want %.12f", tc.fwhm, i, a[i], b[i])
			}
		}
	}
	if _, err := wide.With(edges, lsf.Scaled(gauss, math.NaN())); err == nil {
		t.Error("a width scaled by NaN is accepted")
	}
}
