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

// An uneven sub-grid that crowds about a narrow line gives the flux of a fine even one.
func TestOn(t *testing.T) {
	edges := make([]float64, 61)
	for i := range edges {
		edges[i] = 5000 + 0.04*float64(i)
	}
	gauss := lsf.Sum{{Weight: 1, FWHM: lsf.Constant(0.12)}}
	line := func(w float64) float64 { // τ₀ = 3, b = 0.01 Å
		x := (w - 5001.213) / 0.01
		return math.Exp(-3 * math.Exp(-x*x))
	}
	flux := func(r lsf.Response) []float64 {
		tr, f := make([]float64, len(r.Sub)), make([]float64, len(r.First))
		for j, w := range r.Sub {
			tr[j] = line(w)
		}
		r.Apply(f, tr)
		return f
	}
	fine, err := lsf.Gaussian(edges, lsf.Constant(0.12), 0.6, 6)
	if err != nil {
		t.Fatal(err)
	}
	// s(λ) = (λ − λ₀)/0.025 Å + (0.05 Å/0.0025 Å) atan((λ − λ₀)/0.05 Å), inverted by Newton
	const centre, far, near, zone = 5001.213, 0.025, 0.0025, 0.05
	var sub, step []float64
	x := -2.2
	for s := -122.0; x < 2.2; s++ {
		for range 50 {
			at := x/far + zone/near*math.Atan(x/zone)
			slope := 1/far + 1/near/(1+x*x/zone/zone)
			x -= (at - s) / slope
		}
		sub = append(sub, centre+x)
		step = append(step, 1/(1/far+1/near/(1+x*x/zone/zone)))
	}
	uneven, err := lsf.On(edges, gauss, sub, step)
	if err != nil {
		t.Fatal(err)
	}
	f, g := flux(uneven), flux(fine)
	for i := range f {
		if d := math.Abs(f[i] - g[i]); !(d <= 1e-8) {
			t.Errorf("pixel %d: %.10f, even and fine %.10f", i, f[i], g[i])
		}
	}
	if len(sub) > len(fine.Sub)/2 {
		t.Errorf("%d uneven points, %d even ones", len(sub), len(fine.Sub))
	}
	if _, err := lsf.On(edges, gauss, sub[:100], step[:100]); err == nil {
		t.Error("a sub-grid that ends too early is accepted")
	}
}
