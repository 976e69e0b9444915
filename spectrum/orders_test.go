package spectrum

import (
	"bytes"
	"fmt"
	"math"
	"strings"
	"testing"

	"lacuna/internal/oops"
	"lacuna/spectrum/fits"
	"lacuna/spectrum/frame"
)

// list is two overlapping orders of 20 pixels one after another.
func list(order, pixel, wave func(o, i int) float64) (cols [4][][]float64) {
	for o := range 2 {
		for i := range 20 {
			for k, f := range []func(o, i int) float64{order, pixel, wave, func(o, i int) float64 { return float64(100*o + i + 1) }} {
				cols[k] = append(cols[k], []float64{f(o, i)})
			}
		}
	}
	return cols
}

// Orders in one list are told apart by a column that numbers them or their
// pixels, or by the user's word; else a wavelength that turns back is an error.
func TestListOfOrders(t *testing.T) {
	wave := func(o, i int) float64 { return 5000 + 0.1*float64(i) + float64(o) }
	down := func(o, i int) float64 { return 5000 - 0.1*float64(i) - 5*float64(o) }
	apart := func(o, i int) float64 { return 5000 + 0.1*float64(i) + 2.5*float64(o) } // never turns back
	for name, tc := range map[string]struct {
		order, pixel string
		wave         func(o, i int) float64
		o            Options
		number       int
		fail         bool
	}{
		"order numbers":          {"ORDER", "", wave, Options{}, 61, false},
		"pixels start again":     {"", "col", wave, Options{}, 2, false},
		"also where none turns":  {"", "col", apart, Options{}, 2, false},
		"descending":             {"", "Pixel", down, Options{}, 2, false},
		"by the user":            {"", "", wave, Options{Layout: "orders"}, 2, false},
		"nothing tells":          {"", "", wave, Options{}, 0, true},
		"other columns tell not": {"number", "", wave, Options{}, 0, true},
	} {
		cols := list(func(o, i int) float64 { return float64(60 + o) }, func(o, i int) float64 { return float64(i + 7) }, tc.wave)
		vectors := []fits.Vector{{Name: "wave", Unit: "Angstrom", Type: 'D', Rows: cols[2]}, {Name: "Flux", Type: 'D', Rows: cols[3]}}
		head := "wave,flux"
		if tc.order != "" {
			vectors = append(vectors, fits.Vector{Name: tc.order, Type: 'J', Rows: cols[0]})
			head += "," + tc.order
		}
		if tc.pixel != "" {
			vectors = append(vectors, fits.Vector{Name: tc.pixel, Type: 'J', Rows: cols[1]})
			head += "," + tc.pixel
		}
		var text bytes.Buffer
		fmt.Fprintln(&text, head)
		for i := range cols[0] {
			fmt.Fprintf(&text, "%.4f,%g", cols[2][i][0], cols[3][i][0])
			if tc.order != "" {
				fmt.Fprintf(&text, ",%g", cols[0][i][0])
			}
			if tc.pixel != "" {
				fmt.Fprintf(&text, ",%g", cols[1][i][0])
			}
			fmt.Fprintln(&text)
		}
		for kind, b := range map[string][]byte{"FITS": vectorTable(t, []fits.Entry{e("INSTRUME", "HIRES: High Resolution Echelle Spectrometer")}, vectors...), "CSV": text.Bytes()} {
			s, err := read(fits.FromBytes("a", b), tc.o)
			if tc.fail {
				if !oops.IsInput(err) || !strings.Contains(err.Error(), "monotonic") {
					t.Errorf("%s, %s: %v", name, kind, err)
				}
				continue
			}
			if err != nil {
				t.Errorf("%s, %s: %v", name, kind, err)
				continue
			}
			if len(s.Segments) != 2 {
				t.Errorf("%s, %s: %d segments", name, kind, len(s.Segments))
				continue
			}
			g := &s.Segments[1]
			sum := 0.0
			for _, x := range g.Flux {
				sum += x
			}
			if len(g.Wave) != 20 || sum != 2000+210 || g.Order != tc.number || !(math.Abs(min(g.Wave[0], g.Wave[19])-min(tc.wave(1, 0), tc.wave(1, 19))) < 1e-9) {
				t.Errorf("%s, %s: order %d, %d pixels from %g, sum %g", name, kind, g.Order, len(g.Wave), g.Wave[0], sum)
			}
			// Tables of the Keck archive are vacuum and heliocentric (formats/README §4.12).
			if kind == "FITS" && (g.Medium != frame.Vacuum || g.Frame != frame.Heliocent) {
				t.Errorf("%s: %s (%s), %s", name, g.Medium, g.MediumBy, g.Frame)
			}
			o := tc.o
			o.Row = 2
			if one, err := read(fits.FromBytes("a", b), o); err != nil || len(one.Segments) != 1 || one.Segments[0].Order != tc.number {
				t.Errorf("%s, %s: row 2: %v", name, kind, err)
			}
		}
	}
}

// FITS paper III, section 6: wavelengths between the entries of a table lie on a
// straight line, and half an entry beyond the ends.
func TestLookupAxis(t *testing.T) {
	lookup := func(wave, index []float64) []byte {
		cols := []fits.Vector{{Name: "lambda", Unit: "nm", Type: 'D', Rows: [][]float64{wave}}}
		if index != nil {
			cols = append(cols, fits.Vector{Name: "idx", Type: 'D', Rows: [][]float64{index}})
		}
		var b bytes.Buffer
		if err := fits.WriteTable(&b, nil, "WCS-TABLE", cols, []fits.Entry{e("EXTVER", 1)}); err != nil {
			t.Fatal(err)
		}
		return b.Bytes()[2880:] // without its empty primary
	}
	file := func(table []byte, cards ...string) []byte {
		head := []string{"CTYPE1  = 'AWAV-TAB'", "CUNIT1  = 'nm'", "CRVAL1  = 1", "CDELT1  = 0.5", "CRPIX1  = 1", "PS1_0   = 'WCS-TABLE'", "PS1_1   = 'lambda'"}
		return append(rawImage([]int{5}, func(i int) float64 { return 1 }, append(head, cards...)...), table...)
	}
	for name, tc := range map[string]struct {
		b    []byte
		want []float64 // Å
	}{
		"by number": {file(lookup([]float64{500, 510, 530}, nil)), []float64{5000, 5050, 5100, 5200, 5300}},
		"by index":  {file(lookup([]float64{500, 510, 530}, []float64{1, 2, 2.5}), "PS1_2   = 'idx'"), []float64{5000, 5050, 5100, 5300, math.NaN()}},
		"beyond":    {file(lookup([]float64{500, 510}, nil), "CRPIX1  = 1"), []float64{5000, 5050, 5100, 5150, math.NaN()}},
	} {
		if name != "by number" {
			tc.b = bytes.Replace(tc.b, []byte("NAXIS1  =                    5"), []byte("NAXIS1  =                    4"), 1)
			tc.want = tc.want[:4]
		}
		s, err := read(fits.FromBytes("a.fits", tc.b), Options{})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		for i, w := range tc.want {
			if !(math.Abs(s.Segments[0].Wave[i]-w) < 1e-9) {
				t.Errorf("%s: %v, want %v", name, s.Segments[0].Wave, tc.want)
				break
			}
		}
		if s.Segments[0].Medium != frame.Air {
			t.Errorf("%s: %s", name, s.Segments[0].Medium)
		}
	}
	table := lookup([]float64{500, 510}, nil)
	for want, b := range map[string][]byte{
		"no such table":       file(nil),
		"no column":           file(table, "PS1_2   = 'other'"),
		"wavelength NaN":      file(table), // five pixels, two and a half are there
		"PS1_1":               bytes.Replace(file(table), []byte("PS1_1"), []byte("PX1_1"), 1),
		"table of 2 axes":     file(table, "PV1_3   = 2"),
		"is not a unit":       bytes.Replace(file(table), []byte("CUNIT1  = 'nm'"), []byte("CUNIT1  = 'ab'"), 1),
		"index 1, wavelength": file(lookup([]float64{500, 510}, []float64{1, 1}), "PS1_2   = 'idx'"),
	} {
		if _, err := read(fits.FromBytes("a.fits", b), Options{}); !oops.IsInput(err) || !strings.Contains(err.Error(), want) {
			t.Errorf("%v; want %q", err, want)
		}
	}
}

func FuzzListOfOrders(f *testing.F) {
	f.Add("wave,flux,order\n5000,1,1\n5001,2,1\n5000.5,1,2\n5001.5,2,2\n", "")
	f.Add("wave flux col\n5000 1 1\n5001 2 2\n5000.5 1 1\n5001.5 2 2\n", "")
	f.Add("5000 1\n5001 2\n5000.5 1\n5001.5 2\n", "orders")
	f.Fuzz(func(t *testing.T, text, layout string) {
		fuzzRead(t, []byte(text), Options{Layout: layout})
	})
}
