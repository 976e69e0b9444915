package voigt_test

import (
	"math/rand/v2"
	"slices"
	"testing"
	"time"

	"lacuna/atomic"
	"lacuna/voigt"
)

// regions are those of bench/wofz.py: 4096 points, |u| below uMax.
var regions = []struct {
	name    string
	a, uMax float64
}{
	{"core", 1e-2, 5}, {"mid", 1e-3, 20}, {"wing", 1e-4, 1000}, {"a=0.0156", 1. / 64, 8},
	{"a=0.05", 0.05, 8}, {"a=0.125", 1. / 8, 8},
	{"a=0.3", 0.3, 8}, {"a=1.0", 1, 8}, {"a=3", 3, 8}, {"a=6", 6, 6}, {"a=10", 10, 20},
}

func uniform(uMax float64) []float64 {
	r := rand.New(rand.NewPCG(1, 2))
	u := make([]float64, 4096)
	for i := range u {
		u[i] = (2*r.Float64() - 1) * uMax
	}
	return u
}

func perPoint(b *testing.B, points int) {
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N*points), "ns/point")
}

// shortest reports the mean, and the shortest single pass: passes of a tenth of a
// millisecond find quiet moments on a busy machine.
func shortest(b *testing.B, points int, pass func()) {
	best := time.Hour
	for b.Loop() {
		start := time.Now()
		pass()
		best = min(best, time.Since(start))
	}
	perPoint(b, points)
	b.ReportMetric(float64(best.Nanoseconds())/float64(points), "best-ns/point")
}

func BenchmarkH(b *testing.B) { // random order, one call a point
	for _, r := range regions {
		b.Run(r.name, func(b *testing.B) {
			u, s := uniform(r.uMax), 0.0
			shortest(b, len(u), func() {
				for _, x := range u {
					s += voigt.H(r.a, x)
				}
			})
		})
	}
}

func BenchmarkFill(b *testing.B) { // ascending u, H alone
	for _, r := range regions {
		b.Run(r.name, func(b *testing.B) {
			u := uniform(r.uMax)
			slices.Sort(u)
			h := make([]float64, len(u))
			shortest(b, len(u), func() { voigt.Fill(h, nil, nil, r.a, u) })
		})
	}
}

func BenchmarkFillAll(b *testing.B) { // ascending u, with both derivatives
	for _, r := range regions {
		b.Run(r.name, func(b *testing.B) {
			u := uniform(r.uMax)
			slices.Sort(u)
			h, hu, ha := make([]float64, len(u)), make([]float64, len(u)), make([]float64, len(u))
			shortest(b, len(u), func() { voigt.Fill(h, hu, ha, r.a, u) })
		})
	}
}

var lyA = atomic.Line{Wave: 1215.67, F: 0.4164, Gamma: 6.265e8}

func BenchmarkAddTau(b *testing.B) {
	wave, tau := grid(1210, 1220, 4096), make([]float64, 4096)
	for b.Loop() {
		voigt.AddTau(tau, wave, lyA, voigt.Cloud{LogN: 13, B: 10})
	}
	perPoint(b, len(wave))
}

func BenchmarkAddTauGrad(b *testing.B) {
	wave, tau := grid(1210, 1220, 4096), make([]float64, 4096)
	g := voigt.Gradient{LogN: make([]float64, 4096), V: make([]float64, 4096), B: make([]float64, 4096)}
	for b.Loop() {
		voigt.AddTauGrad(tau, g, wave, lyA, voigt.Cloud{LogN: 13, B: 10})
	}
	perPoint(b, len(wave))
}
