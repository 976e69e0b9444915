package voigt

import (
	"fmt"
	"math/rand/v2"
	"slices"
	"testing"
)

// regions are those of bench/wofz.py, run on the same points by the same rule.
var regions = []struct {
	name     string
	aLo, aHi float64
	uMax     float64
}{
	{"core", 1e-2, 1e-2, 5}, {"mid", 1e-3, 1e-3, 20}, {"wing", 1e-4, 1e-4, 1000},
	{"a=1/64", 1. / 64, 1. / 64, 8}, {"a=0.05", 0.05, 0.05, 8}, {"a=1/8", 1. / 8, 1. / 8, 8}, {"a=0.3", 0.3, 0.3, 8}, {"a=1", 1, 1, 8}, {"a=3", 3, 3, 8}, {"a=0.3w", 0.3, 0.3, 100}, {"a=10", 10, 10, 20},
}

func points(uMax float64) []float64 {
	r := rand.New(rand.NewPCG(1, 2))
	u := make([]float64, 4096)
	for i := range u {
		u[i] = (2*r.Float64() - 1) * uMax
	}
	return u
}

func BenchmarkH(b *testing.B) {
	for _, r := range regions {
		b.Run(r.name, func(b *testing.B) {
			u := points(r.uMax)
			s := 0.0
			for b.Loop() {
				for _, x := range u {
					s += H(r.aLo, x)
				}
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N*len(u)), "ns/point")
		})
	}
}

func BenchmarkFill(b *testing.B) {
	for _, r := range regions {
		for _, full := range []bool{false, true} {
			b.Run(fmt.Sprint(r.name, full), func(b *testing.B) {
				u := points(r.uMax)
				slices.Sort(u)
				h := make([]float64, len(u))
				var hu, ha []float64
				if full {
					hu, ha = make([]float64, len(u)), make([]float64, len(u))
				}
				for b.Loop() {
					Fill(h, hu, ha, r.aLo, u)
				}
				b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N*len(u)), "ns/point")
			})
		}
	}
}
