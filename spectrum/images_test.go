package spectrum

import (
	"bytes"
	"encoding/binary"
	"math"
	"strconv"
	"strings"
	"testing"

	"lacuna/internal/oops"
	"lacuna/spectrum/fits"
	"lacuna/spectrum/frame"
)

// image makes a FITS image of 5 pixels a line with these cards.
func image(t *testing.T, lines int, cards ...fits.Entry) []byte {
	t.Helper()
	var px [][]float64
	for i := range lines {
		px = append(px, []float64{10 / float64(1+9*i), 11, 12, 13, 14})
		for j := range px[i] {
			px[i][j] /= float64(1 + 99*i)
		}
	}
	var b bytes.Buffer
	if err := fits.WriteImage(&b, px, cards); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func e(key string, value any) fits.Entry { return fits.Entry{Key: key, Value: value} }

// Wanted wavelengths follow from the formulas of FITS paper III (Greisen et al.
// 2006, A&A 446, 747) and of formats/README §4, worked out beside each case.
func TestImageAxis(t *testing.T) {
	c := 299792.458
	for name, tc := range map[string]struct {
		cards       []fits.Entry
		o           Options
		first, last float64
		medium      frame.Medium
	}{
		"linear":             {[]fits.Entry{e("CRVAL1", 5000.0), e("CDELT1", 0.5), e("CRPIX1", 1.0), e("CTYPE1", "AWAV"), e("CUNIT1", "Angstrom")}, Options{}, 5000, 5002, frame.Air},
		"CD1_1 wins":         {[]fits.Entry{e("CRVAL1", 5000.0), e("CDELT1", 1.0), e("CD1_1", 0.5), e("CTYPE1", "WAVE"), e("CUNIT1", "Angstrom")}, Options{}, 5000, 5002, frame.Vacuum},
		"PC1_1":              {[]fits.Entry{e("CRVAL1", 5000.0), e("CDELT1", 1.0), e("PC1_1", 0.5), e("CTYPE1", "WAVE"), e("CUNIT1", "Angstrom")}, Options{}, 5000, 5002, frame.Vacuum},
		"CRPIX1 outside":     {[]fits.Entry{e("CRVAL1", 500.0), e("CDELT1", 0.1), e("CRPIX1", -9.5), e("CTYPE1", "WAVE"), e("CUNIT1", "nm")}, Options{}, 5010.5, 5014.5, frame.Vacuum},
		"metres, no unit":    {[]fits.Entry{e("CRVAL1", 5e-7), e("CDELT1", 1e-10), e("CTYPE1", "WAVE")}, Options{}, 5000, 5004, frame.Vacuum},
		"unit in brackets":   {[]fits.Entry{e("CRVAL1", 500.0), e("CDELT1", 0.1), e("CTYPE1", "WAVELENGTH [nm]")}, Options{}, 5000, 5004, frame.UnknownMedium},
		"descending":         {[]fits.Entry{e("CRVAL1", 5004.0), e("CDELT1", -1.0), e("CTYPE1", "LINEAR")}, Options{}, 5000, 5004, frame.UnknownMedium},
		"DC-FLAG":            {[]fits.Entry{e("CRVAL1", 3.7), e("CDELT1", 1e-4), e("CTYPE1", "LINEAR"), e("DC-FLAG", 1)}, Options{}, math.Pow(10, 3.7), math.Pow(10, 3.7004), frame.UnknownMedium},
		"COEFF":              {[]fits.Entry{e("COEFF0", 3.7), e("COEFF1", 1e-4)}, Options{}, math.Pow(10, 3.7), math.Pow(10, 3.7004), frame.UnknownMedium},
		"WAVE-LOG":           {[]fits.Entry{e("CRVAL1", 5000.0), e("CDELT1", 1.0), e("CTYPE1", "WAVE-LOG"), e("CUNIT1", "Angstrom")}, Options{}, 5000, 5000 * math.Exp(4.0/5000), frame.Vacuum},
		"layout by the user": {[]fits.Entry{e("CRVAL1", 5000.0), e("CDELT1", 1.0), e("CTYPE1", "LINEAR"), e("DC-FLAG", 1)}, Options{Layout: "linear"}, 5000, 5004, frame.UnknownMedium},
		"unit by the user":   {[]fits.Entry{e("CRVAL1", 500.0), e("CDELT1", 1.0), e("CTYPE1", "FURLONG")}, Options{WaveUnit: "nm"}, 5000, 5040, frame.UnknownMedium},
		// λ = c/ν: 5000 Å is 599.584916 THz; frequency ascends, wavelength descends
		"frequency": {[]fits.Entry{e("CRVAL1", 5.99584916e14), e("CDELT1", 1e11), e("CTYPE1", "FREQ"), e("CUNIT1", "Hz")}, Options{}, c * 1e13 / 5.99984916e14, 5000, frame.Vacuum},
		// λ = λ₀(1 + v/c); the axis in m/s
		"optical velocity": {[]fits.Entry{e("CRVAL1", -1000.0), e("CDELT1", 1000.0), e("CTYPE1", "VOPT"), e("RESTWAV", 5e-7)}, Options{}, 5000 * (1 - 1/c), 5000 * (1 + 3/c), frame.UnknownMedium},
		// ν = ν₀(1 − v/c)
		"radio velocity": {[]fits.Entry{e("CRVAL1", 0.0), e("CDELT1", 10.0), e("CTYPE1", "VRAD"), e("CUNIT1", "km/s"), e("RESTFRQ", 5.99584916e14)}, Options{}, 5000, 5000 / (1 - 40/c), frame.UnknownMedium},
		// λ = λ₀ √((1+β)/(1−β))
		"velocity": {[]fits.Entry{e("CRVAL1", 0.0), e("CDELT1", 10.0), e("CTYPE1", "VELO"), e("CUNIT1", "km/s"), e("RESTWAV", 5e-7)}, Options{}, 5000, 5000 * math.Sqrt((1+40/c)/(1-40/c)), frame.UnknownMedium},
	} {
		s, err := read(fits.FromBytes("a.fits", image(t, 1, tc.cards...)), tc.o)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		g := &s.Segments[0]
		if !(math.Abs(g.Wave[0]-tc.first) < 1e-6) || !(math.Abs(g.Wave[4]-tc.last) < 1e-6) || g.Medium != tc.medium {
			t.Errorf("%s: %.7f to %.7f Å, %q; want %.7f to %.7f, %q", name, g.Wave[0], g.Wave[4], g.Medium, tc.first, tc.last, tc.medium)
		}
	}
}

func TestImageRefuses(t *testing.T) {
	for name, tc := range map[string]struct {
		lines int
		want  string
		cards []fits.Entry
	}{
		"pixels":        {1, "calibration", []fits.Entry{e("CRVAL1", 1.0), e("CDELT1", 1.0), e("CTYPE1", "PIXEL")}},
		"lookup":        {1, "TAB", []fits.Entry{e("CRVAL1", 1.0), e("CDELT1", 1.0), e("CTYPE1", "WAVE-TAB")}},
		"no unit":       {1, "unit = ", []fits.Entry{e("CRVAL1", 300.0), e("CDELT1", 1.0), e("CTYPE1", "LINEAR")}},
		"unit":          {1, "parsec", []fits.Entry{e("CRVAL1", 5000.0), e("CDELT1", 1.0), e("CTYPE1", "WAVE"), e("CUNIT1", "parsec")}},
		"zero":          {1, "CDELT1", []fits.Entry{e("CRVAL1", 5000.0), e("CDELT1", 0.0), e("CTYPE1", "WAVE")}},
		"text":          {1, "CRVAL1", []fits.Entry{e("CRVAL1", "abc"), e("CDELT1", 1.0)}},
		"below zero":    {1, "axis", []fits.Entry{e("CRVAL1", 1000.0), e("CDELT1", -900.0), e("CUNIT1", "Angstrom")}},
		"no rest":       {1, "RESTWAV", []fits.Entry{e("CRVAL1", 0.0), e("CDELT1", 1.0), e("CTYPE1", "VELO")}},
		"three lines":   {3, "3 lines", []fits.Entry{e("CRVAL1", 5000.0), e("CDELT1", 1.0), e("CTYPE1", "WAVE")}},
		"nothing":       {1, "no spectrum", nil},
		"log10 too big": {1, "DC-FLAG", []fits.Entry{e("CRVAL1", 7.9), e("CDELT1", 1.0), e("DC-FLAG", 1)}},
	} {
		_, err := read(fits.FromBytes("a.fits", image(t, tc.lines, tc.cards...)), Options{})
		if !oops.IsInput(err) || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("%s: %v; want %q", name, err, tc.want)
		}
	}
	// Two lines about as large as each other may be two spectra: the user says.
	var b bytes.Buffer
	axis := []fits.Entry{e("CRVAL1", 5000.0), e("CDELT1", 1.0), e("CTYPE1", "WAVE"), e("CUNIT1", "Angstrom")}
	if err := fits.WriteImage(&b, [][]float64{{1, 2, 3}, {1, 2, 2}}, axis); err != nil {
		t.Fatal(err)
	}
	if _, err := read(fits.FromBytes("a.fits", b.Bytes()), Options{}); !oops.IsInput(err) || !strings.Contains(err.Error(), "columns = ") {
		t.Errorf("two like lines: %v", err)
	}
	if s, err := read(fits.FromBytes("a.fits", b.Bytes()), Options{FluxCol: "2", ErrCol: "none"}); err != nil || s.Segments[0].Flux[2] != 2 || s.Segments[0].Err != nil {
		t.Errorf("line 2 by the user: %v", err)
	}
}

// vectors makes a table of one row of array cells.
func vectorTable(t *testing.T, first []fits.Entry, cols ...fits.Vector) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := fits.WriteTable(&b, first, "SPECTRUM", cols, nil); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func TestESOChoosesSpecOverEso(t *testing.T) {
	v := func(name, utype, ucd string, x float64) fits.Vector {
		return fits.Vector{Name: name, Utype: utype, UCD: ucd, Type: 'D', Rows: [][]float64{{x, x + 1, x + 2}}}
	}
	wave := v("LAMBDA", "eso:Data.SpectralAxis.Value", "em.wl", 5000)
	wave.Unit = "Angstrom"
	for name, tc := range map[string]struct {
		cols      []fits.Vector
		flux, err float64
	}{
		"spec before eso": {[]fits.Vector{wave, v("A", "eso:Data.FluxAxis.Value", "x;meta.main", 1), v("B", "eso:Data.FluxAxis.Accuracy.StatError", "", 2),
			v("C", "spec:Data.FluxAxis.Value", "x", 3), v("D", "spec:Data.FluxAxis.Accuracy.StatError", "", 4)}, 3, 4},
		"main of two": {[]fits.Vector{wave, v("A", "spec:Data.FluxAxis.Value", "x", 1), v("C", "spec:Data.FluxAxis.Value", "x;meta.main", 3)}, 3, 0},
		"only eso":    {[]fits.Vector{wave, v("A", "eso:Data.FluxAxis.Value", "x", 1), v("B", "eso:Data.FluxAxis.Accuracy.StatError", "", 2)}, 1, 2},
	} {
		s, err := read(fits.FromBytes("a.fits", vectorTable(t, nil, tc.cols...)), Options{})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		g := &s.Segments[0]
		if g.Flux[0] != tc.flux || tc.err != 0 && g.Err[0] != tc.err || g.Medium != frame.Vacuum || s.Layout != layoutSDP {
			t.Errorf("%s: flux %g, errors %v, %q, %s", name, g.Flux[0], g.Err, g.Medium, s.Layout)
		}
	}
}

func TestHST(t *testing.T) {
	col := func(name string, v ...float64) fits.Vector {
		return fits.Vector{Name: name, Unit: "Angstrom", Type: 'D', Rows: [][]float64{v}}
	}
	for v, kind := range map[string]frame.Kind{"COMPLETE": frame.Heliocent, "OMIT": frame.Geocentric} {
		b := vectorTable(t, []fits.Entry{e("TELESCOP", "HST"), e("HELCORR", v), e("V_HELIO", -18.0)}, col("SPORDER", 301), col("NELEM", 3),
			col("WAVELENGTH", 2500, 2501, 2502, 0), col("FLUX", 1, 1, 1, 0), col("ERROR", 1, 1, 1, 0), col("DQ", 0, 1024, 512, 0))
		s, err := read(fits.FromBytes("a.fits", b), Options{})
		if err != nil {
			t.Fatal(err)
		}
		g := &s.Segments[0]
		if len(g.Wave) != 3 || g.Mask[1].Bad() || !g.Mask[2].Bad() || g.Frame != kind || g.Medium != frame.Vacuum || g.Order != 301 {
			t.Errorf("%s: %d pixels, masks %v, %s, %s, order %d", v, len(g.Wave), g.Mask, g.Frame, g.Medium, g.Order)
		}
		// V_HELIO = −18: towards the star, so 18 km/s is added, once.
		if err := g.ToFrame(frame.Heliocent); err != nil {
			t.Fatal(err)
		}
		want := map[string]float64{"COMPLETE": 0, "OMIT": 18}[v]
		if got := frame.Velocity(g.Wave[0], 2500); !(math.Abs(got-want) < 1e-6) {
			t.Errorf("%s: moved by %.4f km/s, want %g", v, got, want)
		}
	}
}

func TestTablesRefuse(t *testing.T) {
	col := func(name string, v ...float64) fits.Vector {
		return fits.Vector{Name: name, Type: 'D', Rows: [][]float64{v}}
	}
	for name, tc := range map[string]struct {
		b    []byte
		o    Options
		want string
	}{
		"no such HDU":    {vectorTable(t, nil, col("WAVE", 5000, 5001), col("FLUX", 1, 2)), Options{HDU: "7"}, "SPECTRUM"},
		"no such row":    {vectorTable(t, nil, col("WAVE", 5000, 5001), col("FLUX", 1, 2)), Options{Row: 2}, "no row 2"},
		"no such column": {vectorTable(t, nil, col("WAVE", 5000, 5001), col("FLUX", 1, 2)), Options{FluxCol: "FLUXX"}, "did you mean FLUX"},
		"lengths":        {vectorTable(t, nil, col("WAVE", 5000, 5001), col("FLUX", 1, 2, 3)), Options{}, "3 values"},
		"NELEM":          {vectorTable(t, nil, col("WAVE", 5000, 5001), col("FLUX", 1, 2), col("NELEM", 3)), Options{}, "NELEM"},
		"names":          {vectorTable(t, nil, col("X", 5000, 5001), col("Y", 1, 2)), Options{}, "columns = "},
		"unit":           {vectorTable(t, nil, fits.Vector{Name: "WAVE", Unit: "acre", Type: 'D', Rows: [][]float64{{5000, 5001}}}, col("FLUX", 1, 2)), Options{}, "acre"},
	} {
		_, err := read(fits.FromBytes("a.fits", tc.b), tc.o)
		if !oops.IsInput(err) || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("%s: %v; want %q", name, err, tc.want)
		}
	}
}

// extension makes the bytes of an image extension of doubles.
func extension(name string, cards []string, data ...float64) []byte {
	var b bytes.Buffer
	line := func(s string) { b.WriteString((s + strings.Repeat(" ", 80))[:80]) }
	line("XTENSION= 'IMAGE   '")
	line("BITPIX  =                  -64")
	line("NAXIS   =                    1")
	line("NAXIS1  = " + strconv.Itoa(len(data)))
	line("PCOUNT  =                    0")
	line("GCOUNT  =                    1")
	line("EXTNAME = '" + name + "'")
	for _, c := range cards {
		line(c)
	}
	line("END")
	b.WriteString(strings.Repeat(" ", (2880-b.Len()%2880)%2880))
	for _, x := range data {
		binary.Write(&b, binary.BigEndian, x)
	}
	b.Write(make([]byte, (2880-b.Len()%2880)%2880))
	return b.Bytes()
}

// Flux, error and flags in extensions of equal EXTVER belong together; the second
// exposure keeps its own.
func TestImageGroup(t *testing.T) {
	axis := []string{"CRVAL1  = 5000.0", "CDELT1  = 1.0", "CTYPE1  = 'WAVE'", "CUNIT1  = 'Angstrom'"}
	with := func(ver string) []string { return append([]string{"EXTVER  = " + ver}, axis...) }
	head := strings.Repeat(" ", 2880)
	head = ("SIMPLE  =                    T" + strings.Repeat(" ", 50) + "BITPIX  =                    8" + strings.Repeat(" ", 50) +
		"NAXIS   =                    0" + strings.Repeat(" ", 50) + "END" + head)[:2880]
	b := []byte(head)
	for _, x := range [][]byte{extension("SCI", with("1"), 1, 2, 3), extension("ERR", with("1"), .1, .2, .3), extension("DQ", with("1"), 0, 0, 4),
		extension("SCI", with("2"), 4, 5, 6), extension("VAR", with("2"), .04, .04, .04)} {
		b = append(b, x...)
	}
	s, err := read(fits.FromBytes("a.fits", b), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if len(s.Segments) != 2 {
		t.Fatalf("%d segments", len(s.Segments))
	}
	a, c := &s.Segments[0], &s.Segments[1]
	if a.Err[1] != 0.2 || !a.Mask[2].Bad() || a.Mask[1].Bad() || c.Flux[0] != 4 || !(math.Abs(c.Err[0]-0.2) < 1e-12) || c.Mask[2].Bad() {
		t.Errorf("%v %v, %v %v", a.Err, a.Mask, c.Err, c.Mask)
	}
	if one, err := read(fits.FromBytes("a.fits", b), Options{HDU: "4"}); err != nil || len(one.Segments) != 1 || one.Segments[0].Flux[0] != 4 {
		t.Errorf("HDU 4 alone: %v", err)
	}
}

// formats/README §4.11: FUSE counts QUALITY 0 as bad, and zero flux with zero
// error is a gap, even where all is faint.
func TestFUSE(t *testing.T) {
	rows := func(v ...float64) (out [][]float64) {
		for _, x := range v {
			out = append(out, []float64{x})
		}
		return out
	}
	b := vectorTable(t, []fits.Entry{e("TELESCOP", "FUSE"), e("V_HELIO", 12.0)},
		fits.Vector{Name: "WAVE", Unit: "ANGSTROMS", Type: 'E', Rows: rows(1040, 1041, 1042, 1043, 1044)},
		fits.Vector{Name: "FLUX", Unit: "ERG/CM2/S/A", Type: 'E', Rows: rows(1, 1, 0, 1, 1)},
		fits.Vector{Name: "ERROR", Type: 'E', Rows: rows(1, 1, 0, 1, 1)},
		fits.Vector{Name: "QUALITY", Type: 'I', Rows: rows(100, 0, 100, 100, 100)})
	s, err := read(fits.FromBytes("a.fits", b), Options{})
	if err != nil {
		t.Fatal(err)
	}
	g := &s.Segments[0]
	for i, bad := range []bool{false, true, true, false, false} {
		if g.Mask[i].Bad() != bad {
			t.Errorf("pixel %d bad: %v, want %v", i, g.Mask[i].Bad(), bad)
		}
	}
	if g.Medium != frame.Vacuum || g.Frame != frame.Heliocent || s.Layout != layoutRows {
		t.Errorf("%s, %s, %s", g.Medium, g.Frame, s.Layout)
	}
}
