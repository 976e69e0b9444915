package clouds_test

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"lacuna/budget"
	"lacuna/voigt/clouds"
)

// resolved is a problem whose likelihood is nearly Gaussian, with all kinds of linear
// parameters and priors in it.
func resolved(t *testing.T, seed uint64) clouds.Problem {
	p := clouds.Problem{
		Clouds:  []clouds.Cloud{one(-6, 3.5, 11.6), one(4, 4.5, 11.8)},
		Windows: []clouds.Window{flat(d1, -35, 35, 1.5, 3.75, 0.002)},
	}
	for i := range p.Windows {
		w := &p.Windows[i]
		w.Degree, w.ZeroErr, w.WidthErr, w.Rho = 1, 0.01, 0.02, []float64{0.3}
	}
	observe(t, &p, nil)
	// Noise of correlation 0.3 at lag 1: y_i = (e_i + θ e_{i−1})/√(1+θ²), θ/(1+θ²) = 0.3
	const theta = 1.0 / 3
	rng := rand.New(rand.NewPCG(seed, 77))
	for i := range p.Windows {
		w := &p.Windows[i]
		last := rng.NormFloat64()
		for j := range w.Flux {
			e := rng.NormFloat64()
			w.Flux[j] += w.Err[j] * (e + theta*last) / math.Sqrt(1+theta*theta)
			last = e
		}
	}
	return p
}

// The posterior of a nearly Gaussian likelihood has the mean and the covariance of the
// fit; so have refits of simulated spectra. Errors of a standard deviation from n
// independent points: 1/√(2n).
func TestSamplesAgreeWithCovariance(t *testing.T) {
	f, r := fit(t, resolved(t, 1))
	post, err := f.Sampler(r, clouds.SamplerOptions{Seed: 5, Times: 30})
	if err != nil {
		t.Fatal(err)
	}
	boot, err := f.Bootstrap(r, 400, 6)
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("sampler: %d moves, %d burnt, accepted %.2f, τ %.0f … %.0f, converged %v; bootstrap: %d failed",
		post.Steps, post.Burn, post.Accepted, slices.Min(post.Tau), slices.Max(post.Tau), post.Converged, boot.Failed)
	if !post.Converged {
		t.Errorf("the chain is too short")
	}
	if boot.Failed > 2 {
		t.Errorf("%d of 400 refits failed", boot.Failed)
	}
	for _, s := range []struct {
		name string
		s    clouds.Sample
		n    float64 // independent points
	}{{"posterior", post, float64(len(post.X)) / slices.Max(post.Tau)}, {"bootstrap", boot, 400}} {
		for _, name := range s.s.Free {
			q, _ := r.Param(name)
			med, lo, hi := s.s.Interval(0.6827, s.s.Parameter(name))
			sd := (hi - lo) / 2
			tol := 5/math.Sqrt(2*s.n) + 0.03 // and the likelihood is not quite Gaussian
			if !(math.Abs(sd/q.Err-1) <= tol) {
				t.Errorf("%s: %s has σ %.4g, covariance %.4g (allowed %.0f %%)", s.name, name, sd, q.Err, 100*tol)
			}
			if !(math.Abs(med-q.X) <= q.Err*(6/math.Sqrt(s.n)+0.08)) {
				t.Errorf("%s: median of %s %.5g, best %.5g ± %.4g", s.name, name, med, q.X, q.Err)
			}
		}
	}
	_, lo, hi := post.Interval(0.6827, f.Column("Na I"))
	if n := r.Totals[0].N.Without(budget.FValue); !(math.Abs((hi-lo)/2/n-1) <= 0.15) {
		t.Errorf("total: posterior ± %.4g, covariance ± %.4g", (hi-lo)/2, n)
	}
	var twice [2]clouds.Sample
	for i := range twice {
		if twice[i], err = f.Sampler(r, clouds.SamplerOptions{Seed: 5, Most: 50}); err != nil {
			t.Fatal(err)
		}
	}
	if !slices.EqualFunc(twice[0].X, twice[1].X, slices.Equal) || twice[0].Converged {
		t.Error("the same seed gave another chain")
	}
	back, err := f.Fit()
	if err != nil {
		t.Fatal(err)
	}
	if !slices.Equal(back.X, r.X) {
		t.Error("a fit after the samples differs from that before")
	}
}

// The sum of clouds that trade their columns has an error far below the quadrature sum,
// and the bootstrap agrees with it.
func TestTotalHasCovariance(t *testing.T) {
	p := doublet(0.005, one(-0.9, 1.6, 11.6), one(1.2, 1.8, 11.7))
	observe(t, &p, rand.New(rand.NewPCG(41, 3)))
	f, r := fit(t, p)
	n := r.Totals[0].N
	own := n.Err()
	if !(n.Err() < 0.5*r.Totals[0].Naive) {
		t.Errorf("total ± %.3g, in quadrature %.3g", own, r.Totals[0].Naive)
	}
	boot, err := f.Bootstrap(r, 300, 2)
	if err != nil {
		t.Fatal(err)
	}
	_, lo, hi := boot.Interval(0.6827, f.Column("Na I"))
	want := n.ErrBy(1)                        // photon noise; the f-values are no part of the bootstrap
	if !(math.Abs((hi-lo)/2/want-1) <= 0.2) { // 1/√600 = 4 %, five of them
		t.Errorf("bootstrap ± %.4g, covariance ± %.4g", (hi-lo)/2, want)
	}
}
