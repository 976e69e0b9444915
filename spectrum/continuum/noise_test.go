package continuum

import (
	"math"
	"math/rand/v2"
	"testing"
)

// A moving average with weights a has ρ_k = Σ aᵢaᵢ₊ₖ/Σ aᵢ²: exact.
func TestNoiseIsMeasured(t *testing.T) {
	for _, tc := range []struct {
		name string
		a    []float64
		rho  []float64
	}{
		{"white", []float64{1}, []float64{0, 0, 0, 0, 0}},
		{"two pixels", []float64{1, 0.5}, []float64{0.4, 0, 0, 0, 0}},
		{"three pixels", []float64{0.5, 1, 0.5}, []float64{2.0 / 3, 1.0 / 6, 0, 0, 0}},
	} {
		r := rand.New(rand.NewPCG(8, 1))
		const trials, n = 400, 400
		wave, err := grid(5000, 0.01, n), constant(0.02, n)
		ratio, tau := make([]float64, trials), make([]float64, trials)
		rho := make([][]float64, Lags)
		truth := 1.0
		for _, v := range tc.rho {
			truth += 2 * v
		}
		for k := range ratio {
			flux := noisy(r, n, tc.a...)
			for i := range flux {
				flux[i] = 1 + 0.0124*flux[i]
			}
			m, e := Fit(wave, flux, err, nil, Options{Degree: 3})
			if e != nil {
				t.Fatal(e)
			}
			ratio[k], tau[k] = m.Noise.Ratio, m.Noise.Tau(0)
			for l := range rho {
				rho[l] = append(rho[l], m.Noise.Rho[l])
			}
		}
		mean, _ := meanRMS(ratio)
		if !(math.Abs(mean-0.62) < 0.004) {
			t.Errorf("%s: ratio %.4f, want 0.62", tc.name, mean)
		}
		for l := range rho {
			// shrinking takes 1/(nρ) = 0.006 off a ρ of 0.4; a ρ of 0 stays 0 on average.
			// The spectrum of 0.5, 1, 0.5 touches 0, where positive() has to act on
			// half of all samples: 4 % of ρ.
			if m, _ := meanRMS(rho[l]); !(math.Abs(m-tc.rho[l]) < 0.03) {
				t.Errorf("%s: ρ at lag %d is %.3f, want %.3f", tc.name, l+1, m, tc.rho[l])
			}
		}
		mt, st := meanRMS(tau)
		if !(math.Abs(mt/truth-1) < 0.04) {
			t.Errorf("%s: T = %.3f, want %.3f", tc.name, mt, truth)
		}
		t.Logf("%s: ratio %.4f, T %.3f ± %.3f (truth %.3f)", tc.name, mean, mt, st, truth)
	}
}

func TestVarianceIsTheDoubleSum(t *testing.T) {
	r := rand.New(rand.NewPCG(9, 1))
	n := Noise{Ratio: 1, Rho: []float64{0.3, -0.1, 0.05}}
	g, s := make([]float64, 40), make([]float64, 40)
	for i := range g {
		g[i], s[i] = r.NormFloat64(), 0.5+r.Float64()
	}
	g[7] = 0
	want := 0.0
	for i := range g {
		for j := range g {
			rho := 0.0
			switch d := max(i-j, j-i); {
			case d == 0:
				rho = 1
			case d <= 3:
				rho = n.Rho[d-1]
			}
			want += g[i] * g[j] * s[i] * s[j] * rho
		}
	}
	if got := n.Variance(g, s); !(math.Abs(got/want-1) < 1e-12) {
		t.Errorf("variance %.15g, want %.15g", got, want)
	}
	odd := Noise{Rho: []float64{0.9}} // no noise has this correlation
	for i := range g {
		g[i], s[i] = float64(1-2*(i%2)), 1
	}
	if got := odd.Variance(g, s); !(got > 0) {
		t.Errorf("variance of an impossible noise: %g", got)
	}
}

func TestPositive(t *testing.T) {
	rho := []float64{0.7, 0.1}
	if !positive(rho) {
		t.Fatal("was taken for a noise")
	}
	low := math.Inf(1)
	for w := 0.0; w <= math.Pi; w += 0.001 {
		low = min(low, 1+2*rho[0]*math.Cos(w)+2*rho[1]*math.Cos(2*w))
	}
	if !(low > 0.019) {
		t.Errorf("power spectrum down to %g", low)
	}
}

func TestTruncatedVariance(t *testing.T) {
	// Direct sum over the density, an independent way to the same moment.
	for _, c := range [][2]float64{{3.5, 4}, {5, 5}, {1, 2}} {
		m0, m1, m2 := 0.0, 0.0, 0.0
		h := (c[0] + c[1]) / 200000
		for i := range 200000 {
			x := -c[0] + (float64(i)+0.5)*h
			p := math.Exp(-x * x / 2)
			m0, m1, m2 = m0+p, m1+p*x, m2+p*x*x
		}
		want := m2/m0 - m1*m1/m0/m0
		if got := truncated(c); !(math.Abs(got-want) < 1e-8) {
			t.Errorf("cut %v: %.9f, want %.9f", c, got, want)
		}
	}
}

func TestSmoothedErrors(t *testing.T) {
	n := 200
	err, good := constant(2, n), make([]bool, n)
	for i := range good {
		good[i] = i < 120 || i > 150
	}
	err[10], err[50], err[60] = 0, 20, 2.5
	for i := 120; i <= 150; i++ {
		err[i] = math.NaN()
	}
	s := smooth(err, good)
	for i, v := range s {
		want := 2.0
		if i == 50 {
			want = 20
		}
		if !(v == want) {
			t.Errorf("pixel %d: %g, want %g", i, v, want)
		}
	}
}
