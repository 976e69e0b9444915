package clouds_test

import (
	"encoding/json"
	"math"
	"math/rand/v2"
	"testing"

	"lacuna/atomic"
	"lacuna/voigt"
	"lacuna/voigt/clouds"
)

// A range without ends holds the total, two halves of it add up, and JSON brings it back.
func TestRanges(t *testing.T) {
	p := doublet(0.01, one(-6, 1.5, 11.8), one(3, 2.5, 12.3))
	observe(t, &p, rand.New(rand.NewPCG(8, 9)))
	f, r := fit(t, p)
	inf := math.Inf(1)
	all := f.Ranges(r, [2]float64{-inf, inf}, [2]float64{-inf, -2}, [2]float64{-2, inf})
	whole, left, right := all[0], all[1], all[2]
	n := r.Totals[0].N
	if c := whole.Columns[0].N; c.X != n.X || !(math.Abs(c.Err()/n.Err()-1) <= 1e-12) {
		t.Errorf("everything: %.6g ± %.3g, total %.6g ± %.3g", c.X, c.Err(), n.X, n.Err())
	}
	if d := left.Columns[0].N.X + right.Columns[0].N.X; !(math.Abs(d/n.X-1) <= 1e-12) {
		t.Errorf("halves %.6g, total %.6g", d, n.X)
	}
	for i, w := range whole.Widths {
		l := []atomic.Line{d2, d1}[i]
		two := []voigt.Cloud{}
		for _, c := range r.Clouds {
			two = append(two, voigt.Cloud{V: c.V.X, B: c.Species[0].B.X, LogN: c.Species[0].LogN.X})
		}
		want := widthOf(l, two)
		if !(math.Abs(w.W.X/want-1) <= 5e-6) { // the wings beyond 2000 km/s, 1e-6 of W
			t.Errorf("%s: W = %.9f Å, by a plain sum %.9f", l.Name, w.W.X, want)
		}
		// The cut at −2 km/s is sharp: midpoints of steps of a fifth of b
		if d := left.Widths[i].W.X + right.Widths[i].W.X; !(math.Abs(d/want-1) <= 1e-3) {
			t.Errorf("%s: halves %.6f Å, whole %.6f", l.Name, d, want)
		}
		if !(w.W.Err() > 0 && w.W.Err() < 0.05*w.W.X) {
			t.Errorf("%s: W = %.5f ± %.5f", l.Name, w.W.X, w.W.Err())
		}
	}
	b, err := json.Marshal(all)
	if err != nil {
		t.Fatal(err)
	}
	var back []clouds.Range
	if err := json.Unmarshal(b, &back); err != nil {
		t.Fatal(err)
	}
	if back[0].V != whole.V || back[1].V != left.V || back[2].Columns[0].N.X != right.Columns[0].N.X {
		t.Errorf("%+v came back as %+v", all, back)
	}
}

// widthOf sums 1 − e^−τ over ±2000 km/s in steps of 0.02 km/s.
func widthOf(l atomic.Line, cs []voigt.Cloud) float64 {
	const n, h = 200_000, 0.02
	wave, tau := make([]float64, n), make([]float64, n)
	for i := range wave {
		wave[i] = l.Wave * (1 + (float64(i)-n/2)*h/atomic.C)
	}
	for _, c := range cs {
		voigt.AddTau(tau, wave, l, c)
	}
	sum := 0.0
	for _, x := range tau {
		sum += 1 - math.Exp(-x)
	}
	return sum * h * l.Wave / atomic.C
}
