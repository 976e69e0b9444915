package main

import (
	"math"
	"math/rand/v2"
	"testing"

	"lacuna/atomic"
	"lacuna/voigt/clouds"
	"lacuna/voigt/lsf"
)

// The model of the fit at the truth, on its own sub-grid with its default steps, against the
// forward model: to 1e-4 of the continuum, 0.05 σ of a pixel at a signal-to-noise ratio of
// 500, where a line is one. Members of a line closer than a tenth of the narrowest b count
// as one in the fit: they narrow their profile by up to s²/b² = (0.05)², which is worth up
// to 1e-3, whatever the step.
func TestFitModel(t *testing.T) {
	worst, n := map[string]float64{}, 0
	for _, c := range populations() {
		for trial := range 20 {
			s := c.draw(rand.New(rand.NewPCG(4, uint64(trial))), 100)
			s.scale = 1
			p := clouds.Problem{}
			for _, g := range s.clouds {
				p.Clouds = append(p.Clouds, clouds.Cloud{V: clouds.Start(g.v), B: clouds.Start(g.b),
					Species: []clouds.Species{{Carrier: s.carrier, LogN: clouds.Start(g.logN)}}})
			}
			var want [][]float64
			for _, sc := range s.scenes {
				sc.continuum, sc.zero = []float64{1}, 0
				want = append(want, sc.look(s.clouds, s.fwhm(1)).flux)
				w := clouds.Window{Lines: []atomic.Line{*sc.line}, Edges: sc.edges, Degree: clouds.NoContinuum,
					Profile: lsf.Sum{{Weight: 1, FWHM: lsf.Resolution(s.resolution)}}}
				for i := range len(sc.edges) - 1 {
					w.Wave = append(w.Wave, (sc.edges[i]+sc.edges[i+1])/2)
					w.Flux, w.Err = append(w.Flux, 1), append(w.Err, 0.002)
				}
				p.Windows = append(p.Windows, w)
			}
			f, err := clouds.New(p, clouds.Options{})
			if err != nil {
				t.Errorf("%v, trial %d: %v", c, trial, err)
				continue
			}
			for k := range want {
				got, err := f.Curves(k, f.Start())
				if err != nil {
					t.Fatal(err)
				}
				for i, x := range want[k] {
					d := math.Abs(got.Model[i] - x)
					worst[s.scenes[k].line.Name] = max(worst[s.scenes[k].line.Name], d)
					tol := 1e-4
					if len(s.scenes[k].line.Parts) > 1 {
						tol = 1e-3
					}
					if n++; !(d <= tol) {
						t.Errorf("%v, trial %d, window %d, pixel %d: the fit has %.6f, truth is %.6f", c, trial, k, i, got.Model[i], x)
						break
					}
				}
			}
		}
	}
	t.Logf("%d pixels, largest differences %v", n, worst)
}
