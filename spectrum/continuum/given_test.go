package continuum

import (
	"math"
	"math/rand/v2"
	"testing"
)

func TestGiven(t *testing.T) {
	r := rand.New(rand.NewPCG(51, 1))
	const n, trials = 400, 400
	wave, given, err := grid(5000, 0.02, n), make([]float64, n), constant(0.04, n)
	for i, w := range wave {
		given[i] = 2 + 0.3*math.Sin(w) // no polynomial
	}
	line := [2]float64{5003.5, 5004.5}
	c, g := make([]float64, 1), make([]float64, 1)
	var level []float64
	quoted := 0.0
	for range trials {
		flux := noisy(r, n)
		for i := range flux {
			flux[i] = 1.02*given[i] + 0.02*flux[i]
		}
		m, e := Given(wave, flux, err, given, nil, 0.003, Options{Target: line})
		if e != nil {
			t.Fatal(e)
		}
		m.At(c, []float64{5004})
		m.Basis(g, 5004)
		want := 2 + 0.3*math.Sin(5004)
		if !(math.Abs(c[0]-want) < 1e-4) || !(math.Abs(math.Sqrt(g[0]*g[0]*m.Cov[0])/want-0.003) < 1e-6) {
			t.Fatalf("continuum %.5f (want %.5f), error %.5f", c[0], want, math.Sqrt(m.Cov[0]))
		}
		if len(m.Alt) != 1 || len(m.Notes) == 0 {
			t.Fatalf("2 %% off with an error of 0.3 %%, and no word: %v", m.Notes)
		}
		if !(math.Abs(m.Noise.Ratio-0.5) < 0.08) {
			t.Fatalf("noise ratio %.3f, want 0.5", m.Noise.Ratio)
		}
		f, e := Given(wave, flux, err, given, nil, 0, Options{Target: line, Rescale: true, Degree: 0})
		if e != nil {
			t.Fatal(e)
		}
		level = append(level, f.Coef[0])
		quoted += f.Cov[0] / trials
	}
	mean, rms := meanRMS(level)
	if !(math.Abs(mean-1.02) < 1e-4) || !(math.Abs(math.Sqrt(quoted)/rms-1) < 0.1) { // 400 trials: 3.5 %
		t.Errorf("level %.5f ± %.5f, quoted %.5f", mean, rms, math.Sqrt(quoted))
	}
}

func BenchmarkFit(b *testing.B) {
	r := rand.New(rand.NewPCG(1, 1))
	const n = 500
	wave, flux, err := grid(5000, 0.02, n), noisy(r, n), constant(0.02, n)
	for i := range flux {
		flux[i] = 1 + 0.02*flux[i] - 0.5*math.Exp(-math.Pow((wave[i]-5003)/0.2, 2))
	}
	for b.Loop() {
		if _, e := Fit(wave, flux, err, nil, Options{Degree: -1, Target: [2]float64{5004.5, 5005.5}}); e != nil {
			b.Fatal(e)
		}
	}
}
