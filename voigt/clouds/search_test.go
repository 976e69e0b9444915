package clouds_test

import (
	"encoding/json"
	"math"
	"math/rand/v2"
	"testing"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/voigt/clouds"
)

func like() clouds.Cloud {
	return clouds.Cloud{B: clouds.Start(1).Within(0.3, 15), Species: []clouds.Species{{Carrier: "Na I", LogN: clouds.Start(11)}}}
}

// Three clouds apart by 1.5 FWHM and more are found, without a hint, and twice alike.
func TestSearchFindsClouds(t *testing.T) {
	truth := []clouds.Cloud{one(-12, 1.8, 11.7), one(-5, 1.2, 12.1), one(6, 2.5, 11.5)}
	p := doublet(0.01, truth...)
	for i := range p.Windows {
		p.Windows[i].Degree = 2
	}
	observe(t, &p, rand.New(rand.NewPCG(11, 12)))
	s := clouds.Search{Windows: p.Windows, Like: like(), V: [2]float64{-40, 40}, Seed: 1, Ranges: [][2]float64{{-20, -8.5}, {-8.5, 20}}}
	got, err := s.Run()
	if err != nil {
		t.Fatal(err)
	}
	for _, o := range got.Solutions {
		t.Logf("%d clouds %.1f: χ² %.1f, BIC %.1f, AICc %.1f %s", o.Number, o.V, o.Chi2, o.BIC, o.AICc, o.Refused)
	}
	if len(got.Clouds) != 3 || !got.Conditional {
		t.Fatalf("%d clouds", len(got.Clouds))
	}
	for i, c := range got.Clouds {
		for _, q := range []struct{ x, e, want float64 }{
			{c.V.X, c.V.Err(), truth[i].V.Start}, {c.Species[0].B.X, c.Species[0].B.Err(), truth[i].B.Start},
			{c.Species[0].LogN.X, c.Species[0].LogN.Err(), truth[i].Species[0].LogN.Start},
		} {
			if !(math.Abs(q.x-q.want) <= 4*q.e) {
				t.Errorf("cloud %d: %.4f ± %.4f, was %.4f", i+1, q.x, q.e, q.want)
			}
		}
	}
	n := 0.0
	for _, c := range got.Ranges[1].Columns {
		n += c.N.X
	}
	want := math.Pow(10, 12.1) + math.Pow(10, 11.5)
	if e := got.Ranges[1].Columns[0].N.Err(); !(math.Abs(n-want) <= 4*e) {
		t.Errorf("column from −8.5 to 20 km/s %.4g ± %.2g, was %.4g", n, e, want)
	}
	again, err := s.Run()
	if err != nil {
		t.Fatal(err)
	}
	a, err := json.Marshal(got)
	if err != nil {
		t.Fatal(err)
	}
	b, err := json.Marshal(again)
	if err != nil {
		t.Fatal(err)
	}
	if string(a) != string(b) {
		t.Error("the same search gave another answer")
	}
}

// Noise alone holds no cloud. BIC adds three parameters for 3 ln n; over some hundred
// places and widths a spectrum of noise in a hundred or so passes that.
func TestSearchInNoise(t *testing.T) {
	found := 0
	const trials = 12
	for k := range trials {
		p := doublet(0.01, one(0, 1, 9))
		rng := rand.New(rand.NewPCG(20, uint64(k)))
		for i := range p.Windows {
			p.Windows[i].Degree = 1
			for j := range p.Windows[i].Flux {
				p.Windows[i].Flux[j] = 1 + 0.01*rng.NormFloat64()
			}
		}
		s := clouds.Search{Windows: p.Windows, Like: like(), V: [2]float64{-40, 40}}
		got, err := s.Run()
		if err != nil {
			t.Fatal(err)
		}
		if len(got.Clouds) > 0 {
			found++
			t.Logf("trial %d: %d clouds, BIC %.1f, without %.1f", k, len(got.Clouds), got.BIC, got.Solutions[len(got.Solutions)-1].BIC)
		}
	}
	if found > 1 {
		t.Errorf("clouds in %d of %d spectra of noise", found, trials)
	}
}

// Three clouds hidden in one (b 0.6, 0.8 and 3 km/s at FWHM 7.5): the fewest clouds give a
// column that is low by 0.07 to 0.1 dex, whatever their own error says (0.07 in the practice
// notes of the project, computed apart from this code, for equal columns). What a second
// cloud could hide is in the structure error, and with it the intervals hold the truth.
func TestHiddenStructure(t *testing.T) {
	truth := []clouds.Cloud{one(-1.2, 0.6, 12), one(1.5, 0.8, 12.1), one(0.2, 3, 11.8)}
	p := clouds.Problem{Clouds: truth}
	for _, l := range []atomic.Line{d2, d1} {
		l.FErr = 0
		w := flat(l, -60, 60, 2.5, 7.5, 0.01)
		w.Degree = 1
		p.Windows = append(p.Windows, w)
	}
	n := math.Log10(math.Pow(10, 12) + math.Pow(10, 12.1) + math.Pow(10, 11.8))
	low, covered := 0.0, 0
	const trials = 8
	for k := range trials {
		observe(t, &p, rand.New(rand.NewPCG(61, uint64(k))))
		s := clouds.Search{Windows: p.Windows, Like: like(), V: [2]float64{-20, 20}, Max: 4}
		got, err := s.Run()
		if err != nil {
			t.Fatal(err)
		}
		c := got.Ranges[0].Columns[0]
		low += (c.LogN.X - n) / trials
		if n < c.LogN.X+c.LogN.ErrUp() && n > c.LogN.X-c.LogN.ErrLo() {
			covered++
		}
		t.Logf("%d clouds, log ΣN %.3f +%.3f −%.3f %s (structure %.3f), was %.3f", len(got.Clouds), c.LogN.X, c.LogN.ErrUp(), c.LogN.ErrLo(), c.LogN.Kind(), c.LogN.ErrBy(budget.Structure), n)
	}
	t.Logf("mean %.3f dex off; %d of %d within the interval", low, covered, trials)
	if !(low < -0.05) {
		t.Errorf("one cloud is off by %.3f dex only: the test tests nothing", low)
	}
	if covered < 3 { // binomial with 0.68: less than 3 of 8 in 1 % of cases
		t.Errorf("%d of %d intervals hold the truth", covered, trials)
	}
}
