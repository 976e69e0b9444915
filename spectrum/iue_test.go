package spectrum

import (
	"math"
	"strings"
	"testing"

	"lacuna/internal/oops"
	"lacuna/spectrum/fits"
	"lacuna/spectrum/frame"
)

// iueTable is an extracted spectrum of rows of 6 values.
func iueTable(t *testing.T, high bool, start, points []float64, step float64) []byte {
	n := len(points)
	one := func(name string, v []float64, kind byte) fits.Vector {
		c := fits.Vector{Name: name, Type: kind}
		for _, x := range v {
			c.Rows = append(c.Rows, []float64{x})
		}
		return c
	}
	same := func(name, unit string, kind byte, v ...float64) fits.Vector {
		c := fits.Vector{Name: name, Unit: unit, Type: kind}
		for range n {
			c.Rows = append(c.Rows, v)
		}
		return c
	}
	constant := func(x float64) []float64 {
		v := make([]float64, n)
		for i := range v {
			v[i] = x
		}
		return v
	}
	cols := []fits.Vector{one("NPOINTS", points, 'I'), one("WAVELENGTH", constant(2600), 'D'), one("DELTAW", constant(step), 'D')}
	quality := same("QUALITY", "", 'I', 0, 0, -2, 0, -1, 0)
	if high {
		cols = append(cols, one("ORDER", []float64{88, 89}[:n], 'I'), one("STARTPIX", start, 'I'), same("NET", "FN", 'E', 9, 9, 9, 9, 9, 9), same("NOISE", "FN", 'E', 3, 3, 3, 3, 3, 3),
			quality, same("ABS_CAL", "ERG/CM2/S/A", 'E', 1, 2, 3, 4, 5, 6))
	} else {
		cols = append(cols, fits.Vector{Name: "APERTURE", Type: 'A', Text: []string{"LARGE", "SMALL"}[:n]}, same("NET", "FN", 'E', 9, 9, 9, 9, 9, 9),
			same("SIGMA", "ERG/CM2/S/A", 'E', .1, .1, -1, .1, .1, .1), quality, same("FLUX", "ERG/CM2/S/A", 'E', 1, 2, 3, 4, 5, 6))
	}
	return vectorTable(t, []fits.Entry{e("TELESCOP", "IUE")}, cols...)
}

// formats/README §4.10: the wavelength belongs to pixel STARTPIX, and only NPOINTS
// pixels from there count.
func TestIUEHigh(t *testing.T) {
	s, err := read(fits.FromBytes("a.mxhi", iueTable(t, true, []float64{3, 1}, []float64{3, 6}, 0.05)), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if len(s.Segments) != 2 || s.Layout != layoutMXHI {
		t.Fatalf("%d segments of %s", len(s.Segments), s.Layout)
	}
	g := &s.Segments[0]
	if len(g.Wave) != 3 || g.Wave[0] != 2600 || !(math.Abs(g.Wave[2]-2600.1) < 1e-9) || g.Flux[0] != 3 || g.Err != nil || g.Order != 88 {
		t.Errorf("order %d: %v %v %v", g.Order, g.Wave, g.Flux, g.Err)
	}
	if g.Mask[1].Bad() || !g.Mask[0].Bad() || !g.Mask[2].Bad() || g.Medium != frame.Vacuum || g.Frame != frame.Heliocent {
		t.Errorf("masks %v, %s, %s", g.Mask, g.Medium, g.Frame)
	}
	if s, err := read(fits.FromBytes("a.mxhi", iueTable(t, true, []float64{3, 1}, []float64{3, 6}, 0.05)), Options{Row: 2, FluxCol: "NET"}); err != nil || len(s.Segments) != 1 || s.Segments[0].Flux[0] != 9 {
		t.Errorf("row 2, NET: %v", err)
	}
}

func TestIUELow(t *testing.T) {
	s, err := read(fits.FromBytes("a.mxlo", iueTable(t, false, nil, []float64{5, 6}, 2.5)), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if len(s.Segments) != 2 || s.Layout != layoutMXLO || s.Segments[1].Label != "aperture SMALL" {
		t.Fatalf("%d segments of %s, %q", len(s.Segments), s.Layout, s.Segments[len(s.Segments)-1].Label)
	}
	if g := &s.Segments[0]; len(g.Wave) != 5 || g.Wave[4] != 2610 || !(math.Abs(g.Err[0]-0.1) < 1e-7) || !g.Mask[2].Bad() || !strings.Contains(strings.Join(g.Notes, ""), "low dispersion") {
		t.Errorf("%v %v %v %q", g.Wave, g.Err, g.Mask, g.Notes)
	}
}

func TestIUERefused(t *testing.T) {
	for want, b := range map[string][]byte{
		"STARTPIX = 0":     iueTable(t, true, []float64{0}, []float64{3}, 0.05),
		"NPOINTS = 5":      iueTable(t, true, []float64{3}, []float64{5}, 0.05),
		"NPOINTS = -3":     iueTable(t, true, []float64{3}, []float64{-3}, 0.05),
		"DELTAW = 0":       iueTable(t, true, []float64{1}, []float64{3}, 0),
		"DELTAW = -900":    iueTable(t, true, []float64{1}, []float64{6}, -900),
		"DELTAW = +Inf":    iueTable(t, true, []float64{1}, []float64{6}, math.Inf(1)),
		"holds a spectrum": iueTable(t, true, []float64{1}, []float64{0}, 0.05),
	} {
		if _, err := read(fits.FromBytes("a.mxhi", b), Options{}); !oops.IsInput(err) || !strings.Contains(err.Error(), want) {
			t.Errorf("%v; want %q", err, want)
		}
	}
}

func FuzzIUE(f *testing.F) {
	f.Add(3.0, 3.0, 0.05, true)
	f.Add(1.0, 6.0, -2.5, false)
	f.Add(-32768.0, 32767.0, 1e300, true)
	f.Fuzz(func(t *testing.T, start, points, step float64, high bool) {
		fuzzRead(t, iueTable(t, high, []float64{math.Round(start)}, []float64{math.Round(points)}, step), Options{})
	})
}
