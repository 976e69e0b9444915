package cog

import (
	"math"
	"math/rand/v2"
	"testing"

	"lacuna/atomic"
)

var splitLine = atomic.Line{Name: "D2", Wave: 5891.5833, F: 0.6408, Gamma: 6.16e7, Parts: []atomic.Part{
	{Strength: 0.375, DV: 0.66}, {Strength: 0.625, DV: -0.39}}}

// Surfaces stand in for exact widths in intervals: they must keep the accuracy
// their comment states, which the choice of steps in newValley rests on.
func TestSurface(t *testing.T) {
	for _, coarse := range []float64{0.5, 1, 2} {
		for _, l := range []atomic.Line{splitLine, {Name: "K", Wave: 3934.775, F: 0.6267, Gamma: 1.456e8}, {Name: "no damping", Wave: 4301.523, F: 0.005}} {
			s := newSurface(&l, 21, 0.3, 30, coarse)
			rng := rand.New(rand.NewPCG(1, 2))
			worst, worstSlope := 0., 0.
			for range 600 {
				x, y := s.x0-1+rng.Float64()*(22-s.x0), s.y0+rng.Float64()*math.Log(100)
				w, slope := s.width(x, y)
				want, d, _ := WidthGrad(l, x, math.Exp(y))
				worst = math.Max(worst, math.Abs(w/want-1))
				worstSlope = math.Max(worstSlope, math.Abs(slope-d)/d)
			}
			if allowed := 6e-5 * math.Pow(coarse, 4); !(worst <= allowed) {
				t.Errorf("%s, steps × %g: W off by %.1e, allowed %.1e", l.Name, coarse, worst, allowed)
			}
			t.Logf("%s × %g: W %.1e, slope %.1e", l.Name, coarse, worst, worstSlope)
		}
	}
}
