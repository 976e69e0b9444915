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
