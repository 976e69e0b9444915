package cog_test

import (
	"math"
	"testing"

	"lacuna/atomic"
	"lacuna/cog"
	"lacuna/internal/check"
)

// The check tables were made with π e²/(mₑ c) = 0.026540088560 cm² Hz (CODATA
// 2018); ours is π rₑ c of CODATA 2022, smaller by 2e-9. N is scaled by the ratio
// so that both integrate the same τ₀.
var constants = math.Log10(0.026540088560 / (math.Pi * atomic.ElectronRadius * atomic.C * 1e5))

// Width promises 1e-11; the tables are good to 1e-10 (their README: an independent
// recomputation), and print ten digits or more.
const tableTol = 1e-9

func rel(got, want float64) float64 { return math.Abs(got/want - 1) }

// ../shared/checks/curve_of_growth.csv: 600 widths by Gauss–Legendre panels to
// |u| > 1e7, mpmath and numpy.
func TestWidthAgainstTable(t *testing.T) {
	worst, id := 0., ""
	for _, r := range check.CSV(t, check.Shared(t, "checks/curve_of_growth.csv")) {
		l := atomic.Line{Wave: check.F(t, r, "lambda_vac_A"), F: check.F(t, r, "f"), Gamma: check.F(t, r, "gamma_s")}
		w := cog.Width(l, check.F(t, r, "logN")+constants, check.F(t, r, "b_kms"))
		d := rel(w*1e3, check.F(t, r, "W_mA"))
		if !(d <= tableTol) {
			t.Errorf("%s %s: %.14g mÅ, want %s (off by %.1e)", r["id"], r["line"], w*1e3, r["W_mA"], d)
		}
		if !(d <= worst) {
			worst, id = d, r["id"]
		}
	}
	t.Logf("worst relative difference %.2e at %s", worst, id)
}

var sinkW float64

var benchLines = []struct {
	name    string
	line    atomic.Line
	logN, b float64
}{
	{"thin", atomic.Line{Wave: 4301.523, F: 0.00506, Gamma: 1.85e6}, 12.5, 1.5},
	{"flat", atomic.Line{Wave: 3934.775, F: 0.6267, Gamma: 1.456e8}, 13.5, 1.5},
	{"damped", atomic.Line{Wave: 1215.67, F: 0.4164, Gamma: 6.265e8}, 20.5, 10},
	{"six parts", atomic.Line{Wave: 5891.5833, F: 0.6408, Gamma: 6.16e7, Parts: []atomic.Part{
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
