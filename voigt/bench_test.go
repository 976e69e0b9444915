package voigt_test

import (
	"math/rand/v2"
	"slices"
	"testing"

	"lacuna/atomic"
	"lacuna/voigt"
)

// regions are those of bench/wofz.py: 4096 points, |u| below uMax.
var regions = []struct {
	name    string
	a, uMax float64
}{
	{"core", 1e-2, 5}, {"mid", 1e-3, 20}, {"wing", 1e-4, 1000}, {"a=1/64", 1. / 64, 8},
	{"a=0.05", 0.05, 8}, {"a=1/8", 1. / 8, 8},
	{"a=0.3", 0.3, 8}, {"a=1", 1, 8}, {"a=3", 3, 8}, {"a=6", 6, 6}, {"a=10", 10, 20},
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

func BenchmarkH(b *testing.B) { // random order, one call a point
	for _, r := range regions {
		b.Run(r.name, func(b *testing.B) {
			u, s := uniform(r.uMax), 0.0
			for b.Loop() {
				for _, x := range u {
					s += voigt.H(r.a, x)
				}
			}
			perPoint(b, len(u))
		})
	}
}

func BenchmarkFill(b *testing.B) { // ascending u, H alone
	for _, r := range regions {
		b.Run(r.name, func(b *testing.B) {
			u := uniform(r.uMax)
			slices.Sort(u)
			h := make([]float64, len(u))
			for b.Loop() {
				voigt.Fill(h, nil, nil, r.a, u)
			}
			perPoint(b, len(u))
		})
	}
}

func BenchmarkFillAll(b *testing.B) { // ascending u, with both derivatives
	for _, r := range regions {
		b.Run(r.name, func(b *testing.B) {
			u := uniform(r.uMax)
			slices.Sort(u)
			h, hu, ha := make([]float64, len(u)), make([]float64, len(u)), make([]float64, len(u))
			for b.Loop() {
				voigt.Fill(h, hu, ha, r.a, u)
			}
			perPoint(b, len(u))
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
