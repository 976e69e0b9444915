package spectrum

import (
	"bytes"
	"fmt"
	"math"
	"strings"
	"testing"

	"lacuna/spectrum/fits"
)

// gapped is a ramp of n pixels of 0.01 Å without the pixels from[k] ≤ i < to[k].
func gapped(n int, cut ...[2]int) pixels {
	var p pixels
	for i := range n {
		out := false
		for _, c := range cut {
			out = out || i >= c[0] && i < c[1]
		}
		if !out {
			p.wave, p.flux, p.err = append(p.wave, 5000+0.01*float64(i)), append(p.flux, float64(i+1)), append(p.err, 0.1)
			p.errLow, p.cont = append(p.errLow, 0.05), append(p.cont, 2*float64(i+1))
		}
	}
	return p
}

func TestGaps(t *testing.T) {
	for name, tc := range map[string]struct {
		cut  [][2]int
		size []int // pixels of each part
		good []int
	}{
		"none":                       {nil, []int{1000}, []int{1000}},
		"one pixel":                  {[][2]int{{500, 501}}, []int{999}, []int{999}}, // let be
		"two pixels":                 {[][2]int{{500, 502}}, []int{1000}, []int{998}},
		"thirty":                     {[][2]int{{500, 530}}, []int{1000}, []int{970}},
		"detectors":                  {[][2]int{{500, 531}}, []int{500, 469}, []int{500, 469}},
		"detectors and a deleted":    {[][2]int{{100, 104}, {500, 700}}, []int{500, 300}, []int{496, 300}},
		"two next to each other":     {[][2]int{{500, 600}, {601, 700}}, []int{500, 2, 300}, []int{500, 1, 300}}, // one pixel needs a neighbour
		"close to the start and end": {[][2]int{{2, 60}, {950, 998}}, []int{2, 890, 2}, []int{2, 890, 2}},
	} {
		r := &reader{s: &Spectrum{}}
		s := Segment{Order: 7, Label: "order 7"}
		if err := s.fill(gapped(1000, tc.cut...)); err != nil {
			t.Fatal(err)
		}
		r.keep(s)
		if len(r.s.Segments) != len(tc.size) {
			t.Errorf("%s: %d parts, want %d", name, len(r.s.Segments), len(tc.size))
			continue
		}
		for k := range r.s.Segments {
			g := &r.s.Segments[k]
			if err := g.Check(); err != nil {
				t.Errorf("%s: %v", name, err)
			}
			if len(g.Wave) != tc.size[k] || g.Good() != tc.good[k] || g.Order != 7 || g.Label != "order 7" {
				t.Errorf("%s: part %d has %d pixels, %d good, order %d, %q; want %d, %d, 7", name, k+1, len(g.Wave), g.Good(), g.Order, g.Label, tc.size[k], tc.good[k])
			}
			for i := range g.Wave {
				// Flux, errors and continuum stay with their wavelengths, and no step is longer than two.
				if !g.Mask[i].Bad() && (math.Abs(g.Flux[i]-1-(g.Wave[i]-5000)/0.01) > 1e-6 || g.Continuum[i] != 2*g.Flux[i] || g.Err[i] != 0.1 || g.ErrLow[i] != 0.05) {
					t.Fatalf("%s: pixel %d of part %d: λ %g, flux %g, continuum %g", name, i, k+1, g.Wave[i], g.Flux[i], g.Continuum[i])
				}
				if i > 0 && g.Wave[i]-g.Wave[i-1] > 0.0201 {
					t.Fatalf("%s: a step of %g Å is left", name, g.Wave[i]-g.Wave[i-1])
				}
			}
			if len(tc.size) > 1 && !strings.Contains(strings.Join(g.Notes, "; "), "of what the file gives as one") {
				t.Errorf("%s: notes %q", name, g.Notes)
			}
		}
	}
}

// Wavelengths that descend in a text, a list of very uneven steps, and wavelengths
// rounded to a hundredth where a step is 0.0123 Å: no false gaps.
func TestGapsOfOddSamplings(t *testing.T) {
	for name, wave := range map[string]func(i int) float64{
		"rounded":                   func(i int) float64 { return math.Round(100*(5000+0.0123*float64(i))) / 100 },
		"single precision":          func(i int) float64 { return float64(float32(5000 + 0.0006*float64(i))) },
		"logarithmic":               func(i int) float64 { return 3000 * math.Exp(1e-3*float64(i)) },
		"two samplings joined":      func(i int) float64 { return 5000 + 0.01*float64(i) + 0.09*math.Max(0, float64(i-500)) },
		"the coarse sampling first": func(i int) float64 { return 5000 + 0.1*float64(i) - 0.09*math.Max(0, float64(i-500)) },
	} {
		var p pixels
		for i := range 1000 {
			p.wave, p.flux = append(p.wave, wave(i)), append(p.flux, 1)
		}
		r := &reader{s: &Spectrum{}}
		var s Segment
		if err := s.fill(p); err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		r.keep(s)
		if len(r.s.Segments) != 1 || len(r.s.Segments[0].Wave) != 1000 {
			t.Errorf("%s: %d parts, %d pixels in the first; %q", name, len(r.s.Segments), len(r.s.Segments[0].Wave), r.s.Segments[0].Notes)
		}
	}
	var b bytes.Buffer
	for i := range 60 { // pairs of points far apart
		fmt.Fprintf(&b, "%d.0 1\n%d.1 1\n", 5000+10*i, 5000+10*i)
	}
	s, err := read(fits.FromBytes("a.txt", b.Bytes()), Options{WaveUnit: "Angstrom"})
	if err != nil || len(s.Segments) != 1 || !strings.Contains(strings.Join(s.Segments[0].Notes, "; "), "uneven") {
		t.Errorf("pairs: %v, %+v", err, s)
	}
}

// Two errors of HST/COS tables: the lower one is kept beside the upper; where it
// is 0 or missing the upper one stands in.
func TestLowerErrors(t *testing.T) {
	col := func(name string, v ...float64) fits.Vector {
		return fits.Vector{Name: name, Unit: "Angstrom", Type: 'D', Rows: [][]float64{v}}
	}
	b := vectorTable(t, []fits.Entry{e("TELESCOP", "HST")}, col("NELEM", 4), col("WAVELENGTH", 1203, 1202, 1201, 1200, 0), col("FLUX", 4, 3, 2, 1, 0),
		col("ERROR", .4, .3, .2, .1, 0), col("ERROR_LOWER", .04, .03, 0, math.NaN(), 0))
	s, err := read(fits.FromBytes("a.fits", b), Options{})
	if err != nil {
		t.Fatal(err)
	}
	g := &s.Segments[0]
	want := []float64{.1, .2, .03, .04} // turned round with the wavelengths
	for i := range want {
		if g.ErrLow[i] != want[i] {
			t.Fatalf("lower errors %v, want %v", g.ErrLow, want)
		}
	}
	if notes := strings.Join(g.Notes, "; "); !strings.Contains(notes, "ERROR_LOWER") || !strings.Contains(notes, "2 pixels without a lower error") {
		t.Errorf("notes %q", notes)
	}
	if c := g.Cut(1201, 1202); len(c.ErrLow) != 2 || c.ErrLow[1] != 0.03 {
		t.Errorf("cut: %v", c.ErrLow)
	}
	g.ErrLow[0] = 0
	if g.Check() == nil {
		t.Error("a lower error of 0 passed")
	}
}
