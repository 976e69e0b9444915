package measure

import (
	"math"
	"math/rand/v2"
	"testing"

	"lacuna/spectrum/continuum"
)

// Black cores with added light: z comes back with its quoted error, from noise as
// correlated as that of real spectra.
func TestZeroLevel(t *testing.T) {
	r := rand.New(rand.NewPCG(41, 1))
	const n, z = 400, 0.012
	wave := velocities(nad, 1.3, n)
	trans := absorbed(nad, wave, gaussTau(300, 6, 0))
	noise := continuum.Noise{Ratio: 1, Rho: []float64{0.4}}
	cont := constant(5, n)
	var pull []float64
	for range 500 {
		flux, sigma := noisy(r, n, 1, 0.5), make([]float64, n) // ρ₁ = 0.4
		for i := range flux {
			sigma[i] = 5 * (0.004 + 0.012*trans[i])
			flux[i] = 5*(trans[i]+z)/(1+z) + sigma[i]*flux[i]
		}
		got, ok := ZeroLevel(wave, flux, cont, sigma, noise, nil)
		if !ok || got.Pixels < 8 || got.By != "black cores" {
			t.Fatalf("no black core seen: %+v", got)
		}
		pull = append(pull, (got.Level-z)/got.Err)
	}
	mean, rms := meanRMS(pull)
	t.Logf("pull %.2f ± %.2f", mean, rms)
	// Pixels are kept or cut by what they show, which biases by a part of σ.
	if !(math.Abs(mean) < 0.4) || !(math.Abs(rms-1) < 0.2) {
		t.Errorf("zero level off by %.2f ± %.2f σ", mean, rms)
	}
}

// A line that is not black gives no zero level, at least not often.
func TestZeroLevelNeedsABlackCore(t *testing.T) {
	r := rand.New(rand.NewPCG(42, 1))
	const n = 400
	wave := velocities(nad, 1.3, n)
	for _, tau := range []float64{0, 1, 2.5, 3.3} {
		trans := absorbed(nad, wave, gaussTau(tau, 6, 0))
		found := 0
		for range 100 {
			flux, sigma := noisy(r, n), constant(0.006, n)
			for i := range flux {
				flux[i] = trans[i] + 0.006*flux[i]
			}
			if _, ok := ZeroLevel(wave, flux, constant(1, n), sigma, continuum.Noise{Ratio: 1}, nil); ok {
				found++
			}
		}
		if found > 5 {
			t.Errorf("τ₀ = %g: a black core in %d of 100", tau, found)
		}
	}
}
