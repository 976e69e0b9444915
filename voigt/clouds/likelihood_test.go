package clouds_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"lacuna/budget"
	"lacuna/voigt/clouds"
)

// Where the model is linear the profile is a parabola: the ends lie at ±√Δχ² σ.
func TestProfileOfLinearModel(t *testing.T) {
	weak := clouds.Cloud{V: clouds.Fix(3), B: clouds.Fix(2), Species: []clouds.Species{{Carrier: "Na I", Linear: true, LogN: clouds.Start(1e10)}}}
	p := doublet(0.01, weak)
	p.Windows[0].Degree, p.Windows[1].Degree = 1, 1
	observe(t, &p, rand.New(rand.NewPCG(31, 1)))
	f, r := fit(t, p)
	q, _ := r.Param("cloud 1: N(Na I)")
	for _, delta := range []float64{1, 3.84, 9} {
		iv, err := f.Profile(r, q.Name, delta)
		if err != nil {
			t.Fatal(err)
		}
		for _, e := range []float64{iv.Hi - q.X, q.X - iv.Lo} {
			// τ₀ of 0.01 is linear to a per cent; the ends are closed in to 1 %
			if !(math.Abs(e/(math.Sqrt(delta)*q.Err)-1) <= 0.03) {
				t.Errorf("Δχ² = %g: end %.4g away, σ %.4g", delta, e, q.Err)
			}
		}
	}
	// The limit at 3σ: of a value above 0, 3σ above it.
	lim, err := f.UpperLimit(r, "cloud 1", "Na I", 3)
	if err != nil {
		t.Fatal(err)
	}
	want := q.X + 3*q.Err
	if q.X < 0 { // Δχ² is counted from N = 0
		want = q.X + math.Sqrt(9+q.X*q.X/(q.Err*q.Err))*q.Err
	}
	if !(math.Abs(lim.X/want-1) <= 0.03) || lim.Kind() != "upper" || lim.Behind == nil || lim.Behind.X != q.X {
		t.Errorf("limit %.4g (%s), want %.4g", lim.X, lim.Kind(), want)
	}
}

// A saturated line: the interval of log N is lopsided, open or far on the upper side;
// the ends are where the definition says.
func TestProfileOfSaturatedLine(t *testing.T) {
	p := doublet(0.02, one(2, 1.2, 13.2))
	observe(t, &p, rand.New(rand.NewPCG(32, 2)))
	f, r := fit(t, p)
	iv, err := f.Profile(r, "cloud 1: log N(Na I)", 1)
	if err != nil {
		t.Fatal(err)
	}
	tot, err := f.Profile(r, clouds.TotalName("Na I"), 1)
	if err != nil {
		t.Fatal(err)
	}
	// One cloud: its column is the total.
	if !(math.Abs(iv.Hi-tot.Hi) <= 0.02*(iv.Hi-iv.Lo)) || !(math.Abs(iv.Lo-tot.Lo) <= 0.02*(iv.Hi-iv.Lo)) {
		t.Errorf("log N in %.4f … %.4f, the total in %.4f … %.4f", iv.Lo, iv.Hi, tot.Lo, tot.Hi)
	}
	for _, end := range []float64{iv.Lo, iv.Hi} { // a fit with log N held there
		q := p
		q.Clouds = f.Clouds(r.X)
		q.Clouds[0].Species[0].LogN = clouds.Fix(end)
		_, s := fit(t, q)
		if d := s.Chi2 - r.Chi2; !(math.Abs(d-1) <= 0.03) {
			t.Errorf("Δχ² = %.4f at the end %.4f", d, end)
		}
	}
	before := r.Clouds[0].Species[0].LogN
	if !before.Is(budget.Saturated) {
		t.Errorf("τ₀ = %.1f is not flagged saturated", r.Clouds[0].Species[0].Weakest)
	}
	if err := f.Asymmetric(&r); err != nil {
		t.Fatal(err)
	}
	n := r.Clouds[0].Species[0].LogN
	if !(n.Up > 0 && n.Lo > 0) || !(math.Abs(math.Sqrt(n.Up*n.Up-n.ErrBy(budget.FValue)*n.ErrBy(budget.FValue))-(iv.Hi-iv.X)) <= 1e-6) {
		t.Errorf("errors +%.4f −%.4f, profile +%.4f −%.4f", n.Up, n.Lo, iv.Hi-iv.X, iv.X-iv.Lo)
	}
}

// A species that is not there, at the clouds of one that is: columns scatter about 0
// with their errors, v and b follow the other species, and the limit lies where it
// should: below it in all but a few of the trials of a column that is 0.
func TestAbsentSpecies(t *testing.T) {
	k := d1
	k.Name, k.Species, k.Wave = "K I 7698.96", "K I", 7701.0834
	const trials = 200
	below, chi2 := 0, 0.0
	for i := range trials {
		c := one(2, 1.5, 12)
		c.Species = append(c.Species, clouds.Species{Carrier: "K I", Linear: true, LogN: clouds.Start(0)})
		p := clouds.Problem{Clouds: []clouds.Cloud{c}, Windows: []clouds.Window{flat(d2, -30, 30, 1.5, 3.75, 0.01), flat(k, -30, 30, 1.5, 3.75, 0.01)}}
		p.Windows[1].Degree = 1
		observe(t, &p, rand.New(rand.NewPCG(33, uint64(i))))
		f, r := fit(t, p)
		n := r.Clouds[0].Species[0].N // carriers stand in the order of the alphabet
		if r.Clouds[0].Species[0].Carrier != "K I" {
			t.Fatal("order of the species")
		}
		chi2 += n.X * n.X / (n.Err() * n.Err())
		if i < 20 {
			lim, err := f.UpperLimit(r, "cloud 1", "K I", 3)
			if err != nil {
				t.Fatal(err)
			}
			if r.Clouds[0].Species[0].LogN.Kind() != "upper" && n.X < 3*n.Err() {
				t.Errorf("N = %.3g ± %.3g is no limit", n.X, n.Err())
			}
			if lim.X > 0 && lim.X > n.X {
				below++
			}
		}
	}
	if below != 20 {
		t.Errorf("%d of 20 limits above 0 and above N", below)
	}
	d := distuv.ChiSquared{K: trials}
	if !(chi2 >= d.Quantile(1e-4) && chi2 <= d.Quantile(1-1e-4)) {
		t.Errorf("Σ (N/σ)² = %.1f in %d trials", chi2, trials)
	}
}
