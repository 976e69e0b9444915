package report

import (
	"math"

	"lacuna/budget"
	"lacuna/cog"
)

// growth is an invented fit of Fe II with an ellipse for each contour.
func growth() cog.Result {
	g := cog.Result{Species: "Fe II", Levels: []string{"Fe II"}, B: budget.Number{X: 5.2, Shifts: []budget.Shift{{Cause: budget.Photon, D: 0.4}}},
		LogN: []budget.Number{{X: 14.52, Shifts: []budget.Shift{{Cause: budget.Photon, D: 0.06}}, Up: 0.07, Lo: 0.05}}, Chi2: 4.1, DOF: 5, Stop: "converged"}
	for _, d := range []float64{2.30, 6.17} {
		c := cog.Contour{Delta: d}
		for k := 0; k <= 72; k++ {
			s, co := math.Sincos(2 * math.Pi * float64(k) / 72)
			c.LogN = append(c.LogN, 14.52+math.Sqrt(d)*(0.06*co))
			c.B = append(c.B, 5.2+math.Sqrt(d)*(0.4*(0.8*s-0.6*co)))
		}
		g.Contours = append(g.Contours, c)
	}
	return g
}
