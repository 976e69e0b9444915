package report

import (
	"math"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/cog"
)

// growth is an invented fit of Fe II: widths from the exact curve with scatter,
// and an ellipse for each contour.
func growth() cog.Result {
	const logN, b = 14.52, 5.2
	g := cog.Result{Species: "Fe II", Levels: []string{"Fe II"}, B: budget.Number{X: b, Shifts: []budget.Shift{{Cause: budget.Photon, D: 0.4}}},
		LogN: []budget.Number{{X: logN, Shifts: []budget.Shift{{Cause: budget.Photon, D: 0.06}}, Up: 0.07, Lo: 0.05}}, Chi2: 4.1, DOF: 5, Stop: "converged"}
	for i, l := range []struct {
		name string
		wave float64
		f    float64
		pull float64 // of the width, in σ
	}{
		{"Fe II 1608.45", 1608.4508, 0.0577, 0.4}, {"Fe II 1611.20", 1611.2003, 0.00138, 0.9}, {"Fe II 2249.88", 2249.8768, 0.00182, -1.2},
		{"Fe II 2260.78", 2260.7805, 0.00244, 0.3}, {"Fe II 2344.21", 2344.2139, 0.114, -0.6}, {"Fe II 2374.46", 2374.4603, 0.0313, 1.4},
		{"Fe II 2382.76", 2382.7642, 0.320, 0.1}, {"Fe II 2586.65", 2586.65, 0.0691, -0.3}, {"Fe II 2600.17", 2600.1729, 0.239, 0.5},
	} {
		model := cog.Width(atomic.Line{Wave: l.wave, F: l.f, Gamma: 2.7e8}, logN, b)
		err := 0.0015
		r := cog.LineResult{Line: l.name, Wave: l.wave, F: l.f, W: model + l.pull*err, Err: err, Model: model, Tau0: 1.497e-15 * l.f * l.wave * math.Pow(10, logN) / b}
		r.LogNLinear = math.Log10(1.13e20 * r.W / (l.f * l.wave * l.wave))
		r.Correction = logN - r.LogNLinear
		if i == 1 {
			r.Limit, r.W = true, 0.006
		}
		g.Lines = append(g.Lines, r)
	}
	for _, d := range []float64{2.30, 6.17} {
		c := cog.Contour{Delta: d}
		for k := 0; k <= 72; k++ {
			s, co := math.Sincos(2 * math.Pi * float64(k) / 72)
			c.LogN = append(c.LogN, logN+math.Sqrt(d)*(0.06*co))
			c.B = append(c.B, b+math.Sqrt(d)*(0.4*(0.8*s-0.6*co)))
		}
		g.Contours = append(g.Contours, c)
	}
	return g
}
