package cog_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"lacuna/budget"
	"lacuna/cog"
)

const trials = 2400 // 68.27 % ± 0.95 %

// simulate scatters the exact widths by their errors, seeded.
func simulate(rng *rand.Rand, pts []cog.Point) []cog.Point {
	out := append([]cog.Point(nil), pts...)
	for i := range out {
		out[i].W += out[i].Err * rng.NormFloat64()
	}
	return out
}

// Of 68.27 % intervals 68.27 % hold the truth, in N and in b, whether the lines are
// weak, saturated or mixed; 3σ of the binomial and 1 % for what a profile
// likelihood of few points is not exact in.
func TestFitCoverage(t *testing.T) {
	if testing.Short() {
		t.Skip("2400 fits a class")
	}
	for _, c := range []struct {
		name      string
		f         []float64
		logN, b   float64
		err       float64
		tolerance float64
	}{
		{"mixed", []float64{0.3, 0.05, 0.006}, 14, 3, 0.03, 0.039},
		{"pair", []float64{0.3, 0.03}, 13.2, 4, 0.02, 0.039},
	} {
		pts := widths(ladder(c.f...), c.logN, c.b, c.err)
		rng := rand.New(rand.NewPCG(20240229, 7))
		var inN, inB, values float64
		for range trials {
			r := mustFit(t, simulate(rng, pts), cog.Options{NoContours: true})
			n := r.LogN[0]
			if n.Kind() != "value" || r.B.Kind() != "value" {
				continue
			}
			values++
			if c.logN >= n.X-n.ErrLo() && c.logN <= n.X+n.ErrUp() {
				inN++
			}
			if c.b >= r.B.X-r.B.ErrLo() && c.b <= r.B.X+r.B.ErrUp() {
				inB++
			}
		}
		if !(values >= 0.99*trials) {
			t.Errorf("%s: only %g of %d fits gave values", c.name, values, trials)
		}
		for _, q := range []struct {
			what string
			in   float64
		}{{"log N", inN}, {"b", inB}} {
			if got := q.in / values; !(math.Abs(got-0.6827) <= c.tolerance) {
				t.Errorf("%s: %.1f %% of the intervals of %s hold the truth, want 68.3 ± %.1f %%", c.name, 100*got, q.what, 100*c.tolerance)
			} else {
				t.Logf("%s: %s %.1f %%", c.name, q.what, 100*got)
			}
		}
	}
}

// Limits at 3σ hold in all but 1 of 741 cases (one-sided Gaussian 0.135 %); 5 of
// 1000 allows for b being assumed right.
func TestLimitCoverage(t *testing.T) {
	const n = 1000
	rng := rand.New(rand.NewPCG(11, 3))
	// A weak line, W = σ: upper limits.
	l := ladder(0.3)
	w := cog.Width(l[0], 11, 2)
	wrong := 0
	for range n {
		r := mustFit(t, simulate(rng, []cog.Point{{Line: l[0], W: w, Err: w}}), cog.Options{NoContours: true})
		if x := r.LogN[0]; x.Kind() == "upper" && x.X < 11 {
			wrong++
		}
	}
	if wrong > 5 {
		t.Errorf("%d of %d upper limits lie below the truth", wrong, n)
	}
	// Saturated lines whose b is only known to lie in the assumed range: lower limits.
	wrong = 0
	strong := widths(ladder(0.3), 14.3, 2.5, 0.05)
	for range n / 4 {
		r := mustFit(t, simulate(rng, strong), cog.Options{NoContours: true})
		x := r.LogN[0]
		if x.Kind() != "lower" || !x.Is(budget.Saturated) {
			t.Fatalf("a saturated line gave a %s", x.Kind())
		}
		if x.X > 14.3 {
			wrong++
		}
	}
	if wrong > 2 {
		t.Errorf("%d of %d lower limits lie above the truth", wrong, n/4)
	}
}
