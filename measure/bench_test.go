package measure

import (
	"math/rand/v2"
	"testing"

	"lacuna/spectrum/continuum"
)

func BenchmarkMeasure(b *testing.B) {
	r := rand.New(rand.NewPCG(1, 1))
	const n = 500
	wave, err := velocities(nad, 1, n), constant(0.02, n)
	flux := absorbed(nad, wave, gaussTau(0.8, 5, 0))
	for i, e := range noisy(r, n) {
		flux[i] += 0.02 * e
	}
	p := windowed(b, nad, wave, flux, err, 30, continuum.Options{Degree: 2})
	p.FWHM = 6
	for b.Loop() {
		if _, e := Measure(p); e != nil {
			b.Fatal(e)
		}
	}
}
