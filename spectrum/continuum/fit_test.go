package continuum

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"lacuna/internal/oops"
	"lacuna/spectrum"
)

// A polynomial with hardly any noise comes back: the identity that the method
// rests on. Powers are turned into values, so no basis of ours is on both sides.
func TestFitReturnsThePolynomial(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 1))
	wave := grid(3900, 0.02, 400)
	for degree := 0; degree <= Ceiling; degree++ {
		flux, err := make([]float64, len(wave)), constant(1e-7, len(wave))
		truth := func(w float64) float64 {
			x, s := (w-3904)/4, 2.0
			for k := 1; k <= degree; k++ {
				s += 0.1 * math.Pow(x, float64(k))
			}
			return s
		}
		for i, w := range wave {
			flux[i] = truth(w) + 1e-7*r.NormFloat64()
		}
		m, e := Fit(wave, flux, err, nil, Options{Degree: degree})
		if e != nil {
			t.Fatal(e)
		}
		got := make([]float64, len(wave))
		m.At(got, wave)
		for i, w := range wave {
			if !(math.Abs(got[i]-truth(w)) < 3e-7) { // 6 coefficients of noise 1e-7 on 400 pixels, end pixels worst
				t.Fatalf("degree %d at %.3f Å: %.9f, want %.9f", degree, w, got[i], truth(w))
			}
		}
	}
}

// The quoted error of the continuum under a line, against the scatter over 1,000
// spectra, with noise as correlated as that of resampled data. 3 % is the error
// of a scatter from 1,000 trials (2.2 %) and that of the quoted error.
func TestCovarianceMatchesScatter(t *testing.T) {
	colours := map[string][]float64{"white": {1}, "moving average of 3": {0.5, 1, 0.5}}
	for _, name := range []string{"white", "moving average of 3"} {
		for degree := 0; degree <= 4; degree++ {
			r := rand.New(rand.NewPCG(2, uint64(degree)))
			wave := grid(5000, 0.01, 900)
			o := Options{Degree: degree, Windows: [][2]float64{{5000, 5003.4}, {5005.6, 5009}}, Target: [2]float64{5003.5, 5005.5}}
			const trials = 1000
			at, quoted := make([]float64, trials), 0.0
			g := make([]float64, degree+1)
			for k := range at {
				flux, err := noisy(r, len(wave), colours[name]...), constant(0.02, len(wave))
				for i := range flux {
					x := (wave[i] - 5004.5) / 4.5
					flux[i] = 1 + 0.1*x - 0.05*x*x + 0.01*flux[i] // the error array says twice the truth
					if degree < 2 {
						flux[i] -= 0.1*x - 0.05*x*x
					}
				}
				m, e := Fit(wave, flux, err, nil, o)
				if e != nil {
					t.Fatal(e)
				}
				c := make([]float64, 1)
				m.At(c, []float64{5004.2})
				at[k] = c[0]
				m.Basis(g, 5004.2)
				for a := range g {
					for b := range g {
						quoted += g[a] * g[b] * m.Cov[a*len(g)+b] / trials
					}
				}
			}
			_, rms := meanRMS(at)
			if ratio := math.Sqrt(quoted) / rms; !(math.Abs(ratio-1) < 0.06) { // 2.7 σ of 1,000 trials
				t.Errorf("%s, degree %d: quoted/scatter = %.3f", name, degree, ratio)
			}
		}
	}
}

func TestAutomaticRegionsLeaveLinesOut(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 1))
	wave := grid(4200, 0.02, 600)
	const trials = 300
	var off, drop []float64
	for range trials {
		flux, err := noisy(r, len(wave)), constant(0.02, len(wave))
		for i, w := range wave {
			x := (w - 4206) / 6
			depth := 0.9*math.Exp(-math.Pow((w-4203)/0.15, 2)) + 0.25*math.Exp(-math.Pow((w-4204.5)/0.1, 2)) + 0.06*math.Exp(-math.Pow((w-4209)/0.5, 2))
			flux[i] = (3 + 0.3*x) * (1 - depth + 0.02*flux[i])
			err[i] *= 3
		}
		flux[77] += 1 // a cosmic ray
		m, e := Fit(wave, flux, err, nil, Options{Degree: -1, Target: [2]float64{4205.5, 4206.5}})
		if e != nil {
			t.Fatal(e)
		}
		c := make([]float64, 1)
		m.At(c, []float64{4206})
		v := 0.0
		g := make([]float64, len(m.Coef))
		m.Basis(g, 4206)
		for a := range g {
			for b := range g {
				v += g[a] * g[b] * m.Cov[a*len(g)+b]
			}
		}
		off = append(off, (c[0]-3)/math.Sqrt(v))
		drop = append(drop, float64(m.Dropped))
		for i, u := range m.Pixels {
			if u && (wave[i] >= 4205.5 && wave[i] <= 4206.5 || math.Abs(wave[i]-4203) < 0.25 || i == 77) {
				t.Fatalf("pixel at %.2f Å was used", wave[i])
			}
		}
	}
	mean, rms := meanRMS(off)
	// The faint wide line keeps wings below the threshold of detection: a bias of
	// a part of σ is what such lines cost. No source: it is the reason for the
	// placement error.
	if !(math.Abs(mean) < 0.5) || !(rms > 0.85 && rms < 1.25) {
		t.Errorf("continuum off by %.2f ± %.2f σ", mean, rms)
	}
	t.Logf("off by %.2f, scatter %.2f of the quoted error; %v pixels dropped in the first", mean, rms, drop[0])
}

func TestDegreeByCriterion(t *testing.T) {
	// AICc (Hurvich & Tsai 1989): a strong term is always found; each term too many is
	// taken with P(χ²₁ > 2) = 16 % by chance, at most 29 % over all (both asymptotic).
	for _, colour := range [][]float64{{1}, {0.5, 1, 0.5}} {
		r := rand.New(rand.NewPCG(4, uint64(len(colour))))
		wave := grid(4000, 0.02, 500)
		for truth := 0; truth <= 3; truth++ {
			hit, over := 0, 0
			const trials = 100
			for range trials {
				flux, err := noisy(r, len(wave), colour...), constant(0.01, len(wave))
				for i := range flux {
					x := (wave[i] - 4005) / 5
					p := []float64{0, 0.02 * x, 0.03 * x * x, 0.03 * (5*x*x*x - 3*x) / 2}
					flux[i] = 1 + p[truth] + 0.01*flux[i]
				}
				m, e := Fit(wave, flux, err, nil, Options{Degree: -1, Target: [2]float64{4004, 4006}})
				if e != nil {
					t.Fatal(e)
				}
				if m.Degree == truth {
					hit++
				}
				if m.Degree > truth {
					over++
				}
			}
			// 29 % + 3σ of 100 trials; correlation known to 20 %.
			if hit+over < trials || over > 43 {
				t.Errorf("degree %d, colour %v: found %d of %d, too high %d", truth, colour, hit, trials, over)
			}
		}
	}
}

func TestRefusals(t *testing.T) {
	wave := grid(5000, 0.01, 400)
	flux, err := constant(1, 400), constant(0.01, 400)
	r := rand.New(rand.NewPCG(5, 1))
	for i := range flux {
		flux[i] += 0.01 * r.NormFloat64()
	}
	bad := make([]spectrum.Reason, 400)
	for i := range bad {
		bad[i] = spectrum.BadFile
	}
	for name, f := range map[string]func() error{
		"one side": func() error {
			_, e := Fit(wave, flux, err, nil, Options{Degree: 1, Windows: [][2]float64{{5000, 5001}}, Target: [2]float64{5001, 5001.5}})
			return e
		},
		"all masked": func() error { _, e := Fit(wave, flux, err, bad, Options{}); return e },
		"outside": func() error {
			_, e := Fit(wave, flux, err, nil, Options{Windows: [][2]float64{{4000, 4001}}})
			return e
		},
		"empty window": func() error {
			_, e := Fit(wave, flux, err, nil, Options{Windows: [][2]float64{{5001, 5001}}})
			return e
		},
		"degree": func() error { _, e := Fit(wave, flux, err, nil, Options{Degree: 6}); return e },
		"all excluded": func() error {
			_, e := Fit(wave, flux, err, nil, Options{Exclude: [][2]float64{{4999, 5010}}})
			return e
		},
		"dark":            func() error { _, e := Fit(wave, make([]float64, 400), err, nil, Options{}); return e },
		"no error at all": func() error { _, e := Fit(wave, constant(1, 400), nil, nil, Options{}); return e },
		"given without error": func() error {
			_, e := Given(wave, flux, err, constant(1, 400), nil, 0, Options{})
			return e
		},
		"given negative": func() error { _, e := Given(wave, flux, err, constant(-1, 400), nil, 0.01, Options{}); return e },
	} {
		if e := f(); !oops.IsInput(e) {
			t.Errorf("%s: error %v, want one for the user", name, e)
		}
	}
	m, e := Fit(wave, flux, err, nil, Options{Degree: -1, Windows: [][2]float64{{5000, 5001}}, Target: [2]float64{5001, 5001.5}})
	if e != nil || m.Degree != 0 || len(m.Notes) == 0 {
		t.Errorf("automatic degree with one side: degree %d, notes %v, error %v", m.Degree, m.Notes, e)
	}
}

// Counts of 2 a pixel (practice of photon counting; identity: the mean of a
// Poisson variable is its parameter): the zeros belong to it, and weights by a
// pixel's own error would pull the level down.
func TestZeroCountsAreNotOutliers(t *testing.T) {
	r := rand.New(rand.NewPCG(6, 1))
	const trials, n = 1000, 300
	wave := grid(1300, 0.01, n)
	level := make([]float64, trials)
	for k := range level {
		flux, err, mask := make([]float64, n), make([]float64, n), make([]spectrum.Reason, n)
		for i := range flux {
			flux[i] = poisson(r, 2)
			err[i] = math.Sqrt(flux[i])
			if flux[i] == 0 {
				mask[i] = spectrum.ZeroCount
			}
		}
		m, e := Fit(wave, flux, err, mask, Options{Windows: [][2]float64{{1299, 1310}}})
		if e != nil {
			t.Fatal(e)
		}
		level[k] = m.Coef[0]
	}
	mean, rms := meanRMS(level)
	if !(math.Abs(mean-2) < 0.01) { // 3 σ of the mean of 3e5 counts is 0.008
		t.Errorf("continuum at 2 counts: %.4f ± %.4f", mean, rms/math.Sqrt(trials))
	}
}

func poisson(r *rand.Rand, mean float64) float64 {
	k, p, l := 0, 1.0, math.Exp(-mean)
	for {
		if p *= r.Float64(); p <= l {
			return float64(k)
		}
		k++
	}
}

func TestScaleOfFluxDoesNotMatter(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 1))
	n := 500
	wave, flux, err := grid(4000, 0.02, n), noisy(r, n, 1, 0.5), constant(0.01, n)
	for i := range flux {
		flux[i] = 1 + 0.01*flux[i] - 0.5*math.Exp(-math.Pow((wave[i]-4003)/0.1, 2))
	}
	a, e1 := Fit(wave, flux, err, nil, Options{Degree: -1})
	for i := range flux {
		flux[i] *= 1e-16
		err[i] *= 1e-16
	}
	b, e2 := Fit(wave, flux, err, nil, Options{Degree: -1})
	if e1 != nil || e2 != nil {
		t.Fatal(e1, e2)
	}
	for k := range a.Coef {
		if !(math.Abs(b.Coef[k]*1e16-a.Coef[k]) < 1e-12) {
			t.Errorf("coefficient %d: %g, %g", k, a.Coef[k], b.Coef[k])
		}
	}
	if fmt.Sprint(a.Windows) != fmt.Sprint(b.Windows) {
		t.Error("other pixels were chosen")
	}
}
