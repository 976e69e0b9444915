package cog_test

import (
	"fmt"
	"testing"

	"lacuna/atomic"
	"lacuna/cog"
)

func milli(w float64) string { return fmt.Sprintf("%.1f mÅ", 1e3*w) }

var sinkW float64

// One line for each part of the curve. The six parts are invented, about as far
// apart as those of Na I D2.
var benchLines = []struct {
	name    string
	line    atomic.Line
	logN, b float64
}{
	{"thin", atomic.Line{Name: "thin", Wave: 4301.523, F: 0.00506, Gamma: 1.85e6}, 12.5, 1.5},
	{"flat", atomic.Line{Name: "flat", Wave: 3934.775, F: 0.6267, Gamma: 1.456e8}, 13.5, 1.5},
	{"damped", atomic.Line{Name: "damped", Wave: 1215.67, F: 0.4164, Gamma: 6.265e8}, 20.5, 10},
	{"six parts", atomic.Line{Name: "six parts", Wave: 5891.5833, F: 0.6408, Gamma: 6.16e7, Parts: []atomic.Part{
		{Strength: 5. / 32, DV: 0.65}, {Strength: 5. / 32, DV: 0.63}, {Strength: 2. / 32, DV: 0.61},
		{Strength: 14. / 32, DV: -0.36}, {Strength: 5. / 32, DV: -0.39}, {Strength: 1. / 32, DV: -0.41}}}, 12, 0.8},
}

func BenchmarkWidth(b *testing.B) {
	for _, c := range benchLines {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				sinkW = cog.Width(c.line, c.logN, c.b)
			}
		})
	}
}

func BenchmarkWidthGrad(b *testing.B) {
	for _, c := range benchLines {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				sinkW, _, _ = cog.WidthGrad(c.line, c.logN, c.b)
			}
		})
	}
}

// BenchmarkFit is one sightline of a batch: a resolved pair, a pair with hyperfine
// structure, six Fe II lines; the last without contours.
func BenchmarkFit(b *testing.B) {
	table := atomic.Default()
	named := func(logN, bKms float64, names ...string) []cog.Point {
		var lines []atomic.Line
		for _, s := range names {
			l, err := table.Find(s)
			if err != nil {
				b.Fatal(err)
			}
			lines = append(lines, l)
		}
		return widths(lines, logN, bKms, 0.02)
	}
	iron := named(14.2, 4, "Fe II 2600.17", "Fe II 2586.65", "Fe II 2382.76", "Fe II 2374.46", "Fe II 2344.21", "Fe II 2260.78")
	for _, c := range []struct {
		name string
		pts  []cog.Point
		o    cog.Options
	}{
		{"Ca II pair", named(12, 2.5, "Ca II 3933.66", "Ca II 3968.47"), cog.Options{}},
		{"Na I pair, structure", named(12, 1.5, "Na I 5889.95", "Na I 5895.92"), cog.Options{}},
		{"Fe II six lines", iron, cog.Options{}},
		{"Fe II six lines, no contours", iron, cog.Options{NoContours: true}},
	} {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				mustFit(b, c.pts, c.o)
			}
			b.ReportMetric(float64(b.Elapsed().Milliseconds())/float64(b.N), "ms/fit")
		})
	}
}
