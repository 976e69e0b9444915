package main

import (
	"math"
	"math/rand/v2"
	"slices"
)

// A tally is what many trials say of one quantity in one class.
type tally struct {
	sightlines, values int
	bias               float64 // mean pull, in units of the bound
	biasErr            float64
	middle             float64 // median pull
	scatter            float64 // standard deviation of the pulls: scatter over Cramér–Rao
	scatterErr         float64
	core               float64 // half width of the middle 68.27 % of the pulls: a scatter without outliers
	in68, in95         part
	lost, out          float64 // without an error; beyond 5 of the bound
	ratio              float64 // median of error given over bound
}

// A part is a fraction with its interval: 2.5 and 97.5 % points over resampled sightlines.
type part struct{ x, lo, hi float64 }

// count sums the scores of a quantity in some bins. Values of one sightline are not
// independent: intervals come from drawing sightlines, with all their values, with
// replacement.
func count(trials []trial, quantity int, bins ...int) tally {
	type sums struct{ n, p, p2, in68, in95 float64 }
	var lines []sums
	var pulls, ratios []float64
	var t tally
	for _, tr := range trials {
		var s sums
		if !slices.Contains(bins, tr.bin) {
			continue
		}
		for _, sc := range tr.scores {
			if sc.quantity != quantity {
				continue
			}
			s.n++
			pull := sc.pull
			if sc.lost {
				t.lost++
			}
			if !(math.Abs(pull) <= 5) {
				t.out++
			}
			if pull-pull != 0 {
				pull = 0
			}
			s.p += pull
			s.p2 += pull * pull
			pulls, ratios = append(pulls, pull), append(ratios, sc.ratio)
			if sc.in68 {
				s.in68++
			}
			if sc.in95 {
				s.in95++
			}
		}
		if s.n > 0 {
			lines = append(lines, s)
		}
	}
	t.sightlines, t.values = len(lines), len(pulls)
	if len(lines) < 2 {
		return t
	}
	t.lost /= float64(t.values)
	t.out /= float64(t.values)
	of := func(s sums) (bias, scatter, in68, in95 float64) {
		bias = s.p / s.n
		return bias, math.Sqrt(max(0, s.p2/s.n-bias*bias)), s.in68 / s.n, s.in95 / s.n
	}
	sum := func(pick func(i int) int) sums {
		var all sums
		for i := range lines {
			s := lines[pick(i)]
			all.n, all.p, all.p2 = all.n+s.n, all.p+s.p, all.p2+s.p2
			all.in68, all.in95 = all.in68+s.in68, all.in95+s.in95
		}
		return all
	}
	t.bias, t.scatter, t.in68.x, t.in95.x = of(sum(func(i int) int { return i }))
	rng := rand.New(rand.NewPCG(1, 2))
	const times = 1000
	var b, sd, c68, c95 [times]float64
	for k := range times {
		b[k], sd[k], c68[k], c95[k] = of(sum(func(int) int { return rng.IntN(len(lines)) }))
	}
	t.biasErr, t.scatterErr = deviation(b[:]), deviation(sd[:])
	t.in68.lo, t.in68.hi = ends(c68[:])
	t.in95.lo, t.in95.hi = ends(c95[:])
	slices.Sort(pulls)
	slices.Sort(ratios)
	q := func(v []float64, p float64) float64 { return v[min(int(p*float64(len(v))), len(v)-1)] }
	t.core = (q(pulls, 0.84135) - q(pulls, 0.15865)) / 2
	t.middle, t.ratio = q(pulls, 0.5), q(ratios, 0.5)
	return t
}

func deviation(x []float64) float64 {
	m, v := 0.0, 0.0
	for _, y := range x {
		m += y / float64(len(x))
	}
	for _, y := range x {
		v += (y - m) * (y - m) / float64(len(x))
	}
	return math.Sqrt(v)
}

func ends(x []float64) (lo, hi float64) {
	slices.Sort(x)
	return x[len(x)/40], x[len(x)-1-len(x)/40]
}
