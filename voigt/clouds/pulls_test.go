package clouds_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/voigt/clouds"
	"lacuna/voigt/lsf"
)

// Noise resampled linearly is correlated: white noise moved by half a pixel has the
// variance ½ and correlation ½ at lag 1. With both given, errors are those of the scatter;
// taken as independent they are too small.
func TestCorrelatedNoise(t *testing.T) {
	const trials = 400
	var with, without float64
	chi2, dof := 0.0, 0.0
	for k := range trials {
		rng := rand.New(rand.NewPCG(57, uint64(k)))
		p := clouds.Problem{Clouds: []clouds.Cloud{one(0, 3, 11.8)}, Windows: []clouds.Window{flat(d1, -30, 30, 1, 2, 0.01*math.Sqrt2/2)}}
		w := &p.Windows[0]
		w.Degree = 1
		observe(t, &p, nil)
		last := rng.NormFloat64()
		for j := range w.Flux {
			e := rng.NormFloat64()
			w.Flux[j] += 0.01 * (e + last) / 2
			last = e
		}
		_, r := fit(t, p)
		d := (r.Clouds[0].Species[0].LogN.X - 11.8) / r.Clouds[0].Species[0].LogN.Without(budget.FValue)
		without += d * d / trials
		w.Rho = []float64{0.499} // at ½ the matrix of a long stretch is singular
		_, r = fit(t, p)
		d = (r.Clouds[0].Species[0].LogN.X - 11.8) / r.Clouds[0].Species[0].LogN.Without(budget.FValue)
		with += d * d / trials
		chi2 += r.Chi2
		dof += float64(r.DOF)
	}
	// variance of pulls from n trials: 1 ± √(2/n) = 0.07
	if !(math.Abs(with-1) <= 0.25) {
		t.Errorf("variance of the pulls %.3f with the correlation", with)
	}
	if !(without > 1.5) {
		t.Errorf("variance of the pulls %.3f without the correlation: the test tests nothing", without)
	}
	t.Logf("variance of the pulls: with the correlation %.3f, without %.3f; χ²/dof %.3f", with, without, chi2/dof)
}

// Coverage at a known number of clouds, small: pulls of v, b and log N of two clouds with
// free continuum and a width of the instrument known to 2 %, drawn anew each time.
func TestPulls(t *testing.T) {
	const trials = 300
	sum := map[string]float64{}
	inside := map[string]int{}
	for k := range trials {
		rng := rand.New(rand.NewPCG(58, uint64(k)))
		truth := map[string]float64{"a: v": -5, "a: b": 2, "a: log N(Na I)": 11.8, "b: v": 4, "b: b": 3, "b: log N(Na I)": 11.5}
		a, b := one(-5, 2, 11.8), one(4, 3, 11.5)
		a.Name, b.Name = "a", "b"
		p := clouds.Problem{Clouds: []clouds.Cloud{a, b}}
		scale := 1 + 0.02*rng.NormFloat64()
		for _, l := range []atomic.Line{d2, d1} {
			w := flat(l, -40, 40, 1.3, 3.5, 0.01)
			w.Profile = lsf.Scaled(w.Profile, scale)
			p.Windows = append(p.Windows, w)
		}
		observe(t, &p, rng)
		for i := range p.Windows {
			w := &p.Windows[i]
			w.Profile, w.WidthErr, w.Degree = gauss(3.5, w.Lines[0]), 0.02, 2
		}
		_, r := fit(t, p)
		for name, x := range truth {
			q, _ := r.Param(name)
			d := (q.X - x) / q.Err
			sum[name] += d * d
			if math.Abs(d) < 1 {
				inside[name]++
			}
		}
	}
	chi := distuv.ChiSquared{K: trials}
	for name := range sum {
		t.Logf("%s: variance of the pulls %.3f, inside 1σ %.3f", name, sum[name]/trials, float64(inside[name])/trials)
		if lo, hi := chi.Quantile(1e-4), chi.Quantile(1-1e-4); !(sum[name] >= lo-0.05*trials && sum[name] <= hi+0.05*trials) {
			t.Errorf("%s: Σ pull² = %.1f, expected %.0f to %.0f", name, sum[name], lo, hi)
		}
		// binomial: 0.6827 ± 0.027 at 300
		if f := float64(inside[name]) / trials; !(math.Abs(f-0.6827) <= 0.11) {
			t.Errorf("%s: %.3f of the intervals hold the truth", name, f)
		}
	}
}

// From starts that lead elsewhere the lowest of many minima is found, and twice the same.
func TestFitBest(t *testing.T) {
	p := doublet(0.01, one(-6, 1.2, 12), one(5, 2, 11.7))
	observe(t, &p, rand.New(rand.NewPCG(59, 1)))
	_, truth := fit(t, p)
	p.Clouds = []clouds.Cloud{one(-1.5, 6, 12), one(8, 0.5, 11)}
	f, single := fit(t, p)
	best, err := f.FitBest(12, 3)
	if err != nil {
		t.Fatal(err)
	}
	if !(best.Chi2 <= single.Chi2+1e-9) || !(math.Abs(best.Chi2-truth.Chi2) <= 1e-3) {
		t.Errorf("χ² %.3f from many starts, %.3f from one, %.3f from the truth", best.Chi2, single.Chi2, truth.Chi2)
	}
	again, err := f.FitBest(12, 3)
	if err != nil || again.Chi2 != best.Chi2 {
		t.Errorf("χ² %.9f, again %.9f, %v", best.Chi2, again.Chi2, err)
	}
	t.Logf("χ² %.3f from one start, %.3f from 13: %q", single.Chi2, best.Chi2, best.Notes)
}
