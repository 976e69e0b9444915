package spectrum

import (
	"math"
	"strings"
	"testing"

	"lacuna/internal/oops"
)

func TestWavelengthsOfNoLight(t *testing.T) {
	for name, tc := range map[string]struct {
		from      float64
		fail, say bool
	}{"log10 taken for Å": {3.5, true, false}, "optical": {5000, false, false}, "extreme ultraviolet": {300, false, true}, "radio": {1e7, false, true}} {
		r := &reader{s: &Spectrum{}}
		var p pixels
		for i := range 20 {
			p.wave, p.flux = append(p.wave, tc.from*(1+1e-5*float64(i))), append(p.flux, 1)
		}
		err := r.finish(Segment{}, p)
		if oops.IsInput(err) != tc.fail {
			t.Errorf("%s: %v", name, err)
		}
		if err == nil && strings.Contains(strings.Join(r.s.Segments[0].Notes, ""), "check the unit") != tc.say {
			t.Errorf("%s: notes %q", name, r.s.Segments[0].Notes)
		}
	}
}

// One wavelength moved by part of a step is seen; smooth scales, rounded ones and
// a change of step are not taken for it.
func TestOutOfLine(t *testing.T) {
	scale := map[string]func(x float64) float64{
		"linear":           func(x float64) float64 { return 5000 + 0.01*x },
		"logarithmic":      func(x float64) float64 { return 5000 * math.Exp(3e-6*x) },
		"cubic":            func(x float64) float64 { return 5000 + 0.03*x - 4e-6*x*x + 1e-10*x*x*x },
		"single precision": func(x float64) float64 { return float64(float32(5000 + 0.02*x)) },
		"rounded":          func(x float64) float64 { return math.Round(1e4*(5000+0.0123*x)) / 1e4 },
		"coarsely rounded": func(x float64) float64 { return math.Round(100*(5000+0.0123*x)) / 100 },
		"change of step":   func(x float64) float64 { return 5000 + 0.01*x + 0.004*math.Max(0, x-500) },
		"short":            func(x float64) float64 { return 5000 + x },
	}
	for name, f := range scale {
		n := 1000
		if name == "short" {
			n = 7
		}
		var s Segment
		for i := range n {
			s.Wave = append(s.Wave, f(float64(i)))
		}
		if off := s.outOfLine(); len(off) > 0 {
			t.Errorf("%s: %v", name, off)
		}
		if name == "coarsely rounded" || name == "short" {
			continue // nothing can be seen there
		}
		for _, at := range []int{0, 1, 2, 77, 500, 501, 998, 999} {
			if name == "change of step" && at >= 499 && at <= 502 {
				continue
			}
			for _, part := range []float64{0.3, -0.3, 0.8} {
				w := s.Wave[at]
				step := f(400) - f(399)
				s.Wave[at] += part * step
				if at == 0 && part > 0 || at == 999 && part < 0 {
					s.Wave[at] = w - part*step // outwards too
				}
				if off := s.outOfLine(); len(off) != 1 || off[0] != at {
					t.Errorf("%s: pixel %d moved by %g steps: found %v", name, at, part, off)
				}
				s.Wave[at] = w
			}
		}
	}
}
