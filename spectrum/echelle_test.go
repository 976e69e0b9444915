package spectrum

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"lacuna/internal/oops"
	"lacuna/spectrum/fits"
	"lacuna/spectrum/frame"
)

// e2dsImage has n orders of 6 pixels with λ(i) = 4000 + 10 o + 0.5 i + 0.01 i².
func e2dsImage(prefix string, n int, change map[string]string) []byte {
	cards := []string{"HIERARCH " + prefix + " BERV = 18.437", "HIERARCH " + prefix + " CAL TH DEG LL = 2"}
	for o := range n {
		for k, c := range []float64{4000 + 10*float64(o), 0.5, 0.01} {
			cards = append(cards, fmt.Sprintf("HIERARCH %s CAL TH COEFF LL%d = %.10g", prefix, 3*o+k, c))
		}
	}
	for i, c := range cards {
		key, _, _ := strings.Cut(strings.TrimPrefix(c, "HIERARCH "+prefix+" "), " =")
		if v, ok := change[key]; ok {
			cards[i] = v
		}
	}
	return rawImage([]int{6, n}, func(i int) float64 { return float64(i) }, cards...)
}

// The pixel of the polynomial counts from 0; orders without coefficients are left
// out; wavelengths are air at the telescope, and BERV leads to the barycentre.
func TestE2DS(t *testing.T) {
	for _, prefix := range []string{"ESO DRS", "TNG DRS"} {
		zero := map[string]string{}
		for k := 3; k < 6; k++ {
			zero[fmt.Sprintf("CAL TH COEFF LL%d", k)] = fmt.Sprintf("HIERARCH %s CAL TH COEFF LL%d = 0.0", prefix, k)
		}
		s, err := read(fits.FromBytes("a.fits", e2dsImage(prefix, 3, zero)), Options{})
		if err != nil {
			t.Fatal(err)
		}
		if len(s.Segments) != 2 || s.Segments[1].Order != 3 || s.Segments[1].Flux[0] != 12 || !strings.Contains(strings.Join(s.Notes, ""), "order 2 is not calibrated") {
			t.Fatalf("%d segments, notes %q", len(s.Segments), s.Notes)
		}
		g := &s.Segments[1]
		if w := 4020 + 0.5*5 + 0.01*25; g.Wave[0] != 4020 || !(math.Abs(g.Wave[5]-w) < 1e-9) || g.Medium != frame.Air || g.Frame != frame.Topocentric {
			t.Errorf("%v, want up to %g; %s, %s", g.Wave, w, g.Medium, g.Frame)
		}
		if err := g.ToFrame(frame.Barycentric); err != nil || !(math.Abs(g.Wave[0]-4020*(1+18.437/frame.C)) < 1e-9) {
			t.Errorf("%v: %.6f at the barycentre", err, g.Wave[0])
		}
	}
	if s, err := read(fits.FromBytes("a.fits", e2dsImage("ESO DRS", 3, nil)), Options{Row: 2}); err != nil || len(s.Segments) != 1 || s.Segments[0].Order != 2 {
		t.Errorf("row 2: %v", err)
	}
	for want, change := range map[string]map[string]string{
		"LL4 is missing":     {"CAL TH COEFF LL4": "COMMENT"},
		"DEG LL":             {"CAL TH DEG LL": "HIERARCH ESO DRS CAL TH DEG LL = 0"},
		"LL5":                {"CAL TH COEFF LL5": "HIERARCH ESO DRS CAL TH COEFF LL5 = 'abc'"},
		"gives wavelength -": {"CAL TH COEFF LL1": "HIERARCH ESO DRS CAL TH COEFF LL1 = -5000"},
	} {
		if _, err := read(fits.FromBytes("a.fits", e2dsImage("ESO DRS", 3, change)), Options{}); !oops.IsInput(err) || !strings.Contains(err.Error(), want) {
			t.Errorf("%v; want %q", err, want)
		}
	}
}

// koaImage: λ = Σ c_k x^k with x = 101, 103, … (CRVAL1 is a column), seven terms.
func koaImage(second string) []byte {
	return rawImage([]int{5, 2}, func(i int) float64 { return float64(i + 1) }, "CRVAL1  = 101", "CDELT1  = 2", "CRPIX1  = 1", "INSTRUME= 'HIRES'",
		"WV_0_01 = '4000 0.1 1e-5 0'", "WV_4_01 = '0 0 1e-15 0'", "WV_0_02 = '"+second+"'", "WV_4_02 = '0 0 0 0'")
}

func TestKOA(t *testing.T) {
	s, err := read(fits.FromBytes("a.fits", koaImage("4050 0.1 0 0")), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if len(s.Segments) != 2 || s.Segments[1].Flux[0] != 6 {
		t.Fatalf("%d segments", len(s.Segments))
	}
	for i, x := range []float64{101, 103, 105, 107, 109} {
		if w := 4000 + 0.1*x + 1e-5*x*x + 1e-15*math.Pow(x, 6); !(math.Abs(s.Segments[0].Wave[i]-w) < 1e-9) {
			t.Errorf("pixel %d: %.9f, want %.9f", i+1, s.Segments[0].Wave[i], w)
		}
	}
	if g := &s.Segments[0]; g.Medium != frame.Vacuum || g.Frame != frame.Heliocent {
		t.Errorf("%s, %s", g.Medium, g.Frame)
	}
	for want, second := range map[string]string{"2 numbers": "4050 0.1", "not a number": "4050 x 0 0"} {
		if _, err := read(fits.FromBytes("a.fits", koaImage(second)), Options{}); !oops.IsInput(err) || !strings.Contains(err.Error(), want) {
			t.Errorf("%v; want %q", err, want)
		}
	}
	if s, err := read(fits.FromBytes("a.fits", koaImage("0 0 0 0")), Options{}); err != nil || len(s.Segments) != 1 {
		t.Errorf("an order of zeros: %v", err)
	}
}

// Flux, errors, flags and wavelengths as images of equal size, as newer pipelines
// of the DRS family write them; the vacuum wavelengths are preferred, steps are no
// flux, and an order without wavelengths is left out.
func TestWaveImages(t *testing.T) {
	ext := func(name string, value func(line, i int) float64) []byte {
		b := rawImage([]int{4, 3}, func(i int) float64 { return value(i/4, i%4) }, "PCOUNT  = 0", "GCOUNT  = 1", "EXTNAME = '"+name+"'")
		copy(b, "XTENSION= 'IMAGE   '          ")
		return b
	}
	wave := func(at float64) func(line, i int) float64 {
		return func(line, i int) float64 {
			if line == 2 {
				return 0
			}
			return at + 10*float64(line) + float64(i)
		}
	}
	b := rawHeader("SIMPLE  = T", "BITPIX  = 8", "NAXIS   = 0", "HIERARCH ESO QC BERV = 12.5", "HIERARCH ESO PRO CATG = 'S2D_A'")
	for _, x := range [][]byte{ext("SCIDATA", func(l, i int) float64 { return float64(4*l + i + 1) }), ext("ERRDATA", func(l, i int) float64 { return 0.5 }),
		ext("QUALDATA", func(l, i int) float64 { return map[bool]float64{true: 1}[l == 1 && i == 2] }), ext("WAVEDATA_AIR_BARY", wave(4998)), ext("WAVEDATA_VAC_BARY", wave(5000)),
		ext("DLLDATA_VAC_BARY", func(l, i int) float64 { return 1 })} {
		b = append(b, x...)
	}
	s, err := read(fits.FromBytes("a.fits", b), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if len(s.Segments) != 2 || s.Layout != layoutWaveImage {
		t.Fatalf("%d segments of %s", len(s.Segments), s.Layout)
	}
	g := &s.Segments[1]
	if g.Wave[1] != 5011 || g.Flux[1] != 6 || g.Err[1] != 0.5 || !g.Mask[2].Bad() || g.Mask[1].Bad() || g.Medium != frame.Vacuum || g.Frame != frame.Barycentric {
		t.Errorf("%v %v %v %v, %s, %s", g.Wave, g.Flux, g.Err, g.Mask, g.Medium, g.Frame)
	}
	if len(g.Shift) != 1 || !g.Shift[0].Done || g.Shift[0].V != 12.5 {
		t.Errorf("corrections %+v", g.Shift)
	}
	// The one-dimensional tables of these pipelines: wavelength is vacuum where
	// wavelength_air stands beside it.
	col := func(name string, v ...float64) fits.Vector {
		var rows [][]float64
		for _, x := range v {
			rows = append(rows, []float64{x})
		}
		return fits.Vector{Name: name, Unit: "Angstrom", Type: 'D', Rows: rows}
	}
	b = vectorTable(t, []fits.Entry{e("ESO QC BERV", 12.5), e("ESO PRO CATG", "S1D_A")}, col("wavelength", 5000, 5001, 5002), col("wavelength_air", 4998, 4999, 5000), col("flux", 1, 2, 3))
	for column, want := range map[string]frame.Medium{"": frame.Vacuum, "wavelength_air": frame.Air} {
		s, err := read(fits.FromBytes("a.fits", b), Options{WaveCol: column})
		if err != nil {
			t.Fatal(err)
		}
		if g := &s.Segments[0]; g.Medium != want || g.Frame != frame.Barycentric {
			t.Errorf("%q: %s (%s), %s", column, g.Medium, g.MediumBy, g.Frame)
		}
	}
}

func FuzzPolynomialOrders(f *testing.F) {
	f.Add("2", "4000", "0.5", "0.01", "101", "4000 0.1 1e-5 0")
	f.Add("1", "4000", "-0.5", "1e300", "-1", "0 0 0 0")
	f.Add("20", "x", "", "0", "0", "1 2 3")
	f.Fuzz(func(t *testing.T, deg, c0, c1, c2, crval, wv string) {
		for _, s := range []string{deg, c0, c1, c2, crval, wv} {
			if strings.ContainsAny(s, "'") || len(s) > 40 {
				return
			}
		}
		fuzzRead(t, e2dsImage("ESO DRS", 2, map[string]string{"CAL TH DEG LL": "HIERARCH ESO DRS CAL TH DEG LL = " + deg, "CAL TH COEFF LL0": "HIERARCH ESO DRS CAL TH COEFF LL0 = " + c0,
			"CAL TH COEFF LL1": "HIERARCH ESO DRS CAL TH COEFF LL1 = " + c1, "CAL TH COEFF LL2": "HIERARCH ESO DRS CAL TH COEFF LL2 = " + c2}), Options{})
		fuzzRead(t, rawImage([]int{5, 2}, func(i int) float64 { return float64(i + 1) }, "CRVAL1  = "+crval, "CDELT1  = "+c1, "WV_0_01 = '"+wv+"'", "WV_4_01 = '"+c2+" 0 0 0'",
			"WV_0_02 = '4000 1 0 0'", "WV_4_02 = '0 0 0 0'"), Options{})
	})
}
