package lsf_test

import (
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"lacuna/atomic"
	"lacuna/internal/oops"
	"lacuna/voigt"
	"lacuna/voigt/lsf"
)

// sampled is a Gaussian of the given FWHM as a table; all in one unit.
func sampled(t *testing.T, fwhm, step float64, unit lsf.Unit) *lsf.Tabulated {
	p, err := lsf.NewTabulated(gaussTable(fwhm, step, unit))
	if err != nil {
		t.Fatal(err)
	}
	return p
}

func gaussTable(fwhm, step float64, unit lsf.Unit) lsf.Table {
	tab := lsf.Table{Unit: unit, Density: make([][]float64, 1)}
	sigma := fwhm / math.Sqrt(8*math.Ln2)
	n := int(6 * sigma / step)
	for i := -n; i <= n; i++ {
		x := float64(i) * step
		tab.Offset = append(tab.Offset, x)
		tab.Density[0] = append(tab.Density[0], math.Exp(-x*x/(2*sigma*sigma))/(sigma*math.Sqrt(2*math.Pi)))
	}
	return tab
}

// A sampled Gaussian gives the flux of the Gaussian itself; the error of a spline
// falls as the fourth power of the sampling.
func TestTabulatedGaussian(t *testing.T) {
	line, cloud := atomic.Line{Wave: 5891.5833, F: 0.6408}, voigt.Cloud{B: 1, LogN: 12.3}
	wave := pixels(5890, 0.031, 100)
	edges := lsf.Edges(wave)
	flux := func(p lsf.Profile) []float64 {
		r := must(lsf.New(edges, p, cloud.B, 6))
		f := make([]float64, len(wave))
		r.Apply(f, transmission(r, line, cloud))
		return f
	}
	want := flux(lsf.Sum{{Weight: 1, FWHM: lsf.Constant(0.07)}})
	const kms = atomic.C / 5891.58
	inPixels := gaussTable(0.07/0.031, 0.2, lsf.Pixel)
	inPixels.PixelA = 0.031
	pixel, err := lsf.NewTabulated(inPixels)
	if err != nil {
		t.Fatal(err)
	}
	for _, tc := range []struct {
		name string
		p    lsf.Profile
		tol  float64
	}{
		{"5 a FWHM", sampled(t, 0.07, 0.014, lsf.Angstrom), 2e-4},
		{"10 a FWHM", sampled(t, 0.07, 0.007, lsf.Angstrom), 1e-5},
		{"20 a FWHM", sampled(t, 0.07, 0.0035, lsf.Angstrom), 1e-6},
		// λ/c varies by 3e-4 over the window
		{"in km/s", sampled(t, 0.07*kms, 0.007*kms, lsf.Kms), 4e-5},
		{"in pixels", pixel, 2e-5},
	} {
		worst := 0.0
		for i, f := range flux(tc.p) {
			worst = max(worst, math.Abs(f-want[i]))
		}
		t.Logf("%s: %.1e", tc.name, worst)
		if !(worst <= tc.tol) {
			t.Errorf("%s: flux off by %.1e, allowed %.0e", tc.name, worst, tc.tol)
		}
	}
}

// Halving the sub-grid with a table: its spline has kinks in the second
// derivative, so the sum converges algebraically; 1e-6 is far below any noise.
func TestTabulatedStep(t *testing.T) {
	line, cloud := atomic.Line{Wave: 5891.5833, F: 0.6408}, voigt.Cloud{B: 1, LogN: 12.3}
	wave := pixels(5890, 0.031, 100)
	p := sampled(t, 0.07, 0.014, lsf.Angstrom)
	var got [2][]float64
	for k, q := range []float64{4, 16} {
		r := must(lsf.New(lsf.Edges(wave), p, cloud.B, q))
		got[k] = make([]float64, len(wave))
		r.Apply(got[k], transmission(r, line, cloud))
	}
	for i := range wave {
		if d := math.Abs(got[0][i] - got[1][i]); !(d <= 1e-6) {
			t.Errorf("pixel %d: q = 4 and 16 differ by %.1e", i, d)
		}
	}
}

// Between two wavelengths the integrals are mixed linearly.
func TestTabulatedBetween(t *testing.T) {
	narrow, wide := gaussTable(0.05, 0.005, lsf.Angstrom), gaussTable(0.1, 0.005, lsf.Angstrom)
	pad := (len(wide.Offset) - len(narrow.Offset)) / 2
	y := make([]float64, len(wide.Offset))
	copy(y[pad:], narrow.Density[0])
	wide.Wave, wide.Density = []float64{1200, 1600}, [][]float64{y, wide.Density[0]}
	p, err := lsf.NewTabulated(wide)
	if err != nil {
		t.Fatal(err)
	}
	for _, x := range []float64{-0.08, -0.02, 0, 0.013, 0.05} {
		lo, hi, mid := p.Below(1200, x), p.Below(1600, x), p.Below(1300, x)
		if d := math.Abs(mid - (0.75*lo + 0.25*hi)); !(d <= 1e-15) {
			t.Errorf("integral to %g Å is %g at 1300 Å, %g and %g at the ends", x, mid, lo, hi)
		}
		exact := 0.5 * math.Erfc(-x*math.Sqrt(4*math.Ln2)/0.05)
		if d := math.Abs(lo - exact); !(d <= 1e-5) { // spline at 10 a FWHM
			t.Errorf("integral to %g Å is %.7f at 1200 Å, exactly %.7f", x, lo, exact)
		}
	}
	if err := p.Check(1150, 1300); !oops.IsInput(err) {
		t.Errorf("wavelengths below the table: %v", err)
	}
	if _, err := lsf.New([]float64{1598, 1599, 1601}, p, 1, 4); !oops.IsInput(err) {
		t.Errorf("wavelengths above the table: %v", err)
	}
	if err := p.Check(1200, 1600); err != nil {
		t.Error(err)
	}
}

func TestReadProfile(t *testing.T) {
	var b strings.Builder
	tab := gaussTable(6, 0.5, lsf.Kms)
	b.WriteString("# Lantern spectrograph, 0.2 arcsec slit\n\noffset_kms\t1200, 1700\n")
	for i, x := range tab.Offset {
		fmt.Fprintf(&b, "%g %.9g,%.9g\n", x, tab.Density[0][i], tab.Density[0][i])
	}
	path := filepath.Join(t.TempDir(), "profile.txt")
	if err := os.WriteFile(path, []byte(b.String()), 0o600); err != nil {
		t.Fatal(err)
	}
	p, err := lsf.Read(path, 0)
	if err != nil {
		t.Fatal(err)
	}
	for _, wave := range []float64{1200, 1450, 1700} {
		sigma := 6 / math.Sqrt(8*math.Ln2) * wave / atomic.C
		if d := math.Abs(p.Sigma(wave)/sigma - 1); !(d <= 1e-3) { // as the peak is normalised
			t.Errorf("σ at %g Å is %g, want %g", wave, p.Sigma(wave), sigma)
		}
		if y := p.Below(wave, sigma); !(math.Abs(y-0.8413447461) <= 1e-5) { // Φ(1), any table
			t.Errorf("integral to 1 σ is %.7f", y)
		}
	}
}

// bell is a table that passes; the cases below spoil it.
const bell = "offset_A profile\n-3 0\n-2 0.05\n-1 0.25\n0 0.4\n1 0.25\n2 0.05\n3 0\n"

func TestReadRefuses(t *testing.T) {
	path := filepath.Join(t.TempDir(), "profile.txt")
	read := func(text string) error {
		if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
		_, err := lsf.Read(path, 0)
		return err
	}
	if err := read(bell); err != nil {
		t.Fatal(err)
	}
	for name, tc := range map[string]struct{ old, new, says string }{
		"empty":          {bell, "", "no table"},
		"only comments":  {bell, "# x\n", "no table"},
		"no header":      {"offset_A profile\n", "", "header"},
		"unit":           {"offset_A", "offset_nm", "unit"},
		"pixel size":     {"offset_A", "offset_pixel", "pixel of 0"},
		"not normalised": {"0 0.4", "0 0.5", "not normalised"},
		"cut off":        {"\n3 0\n", "\n", "cut off"},
		"order":          {"1 0.25\n2 0.05", "2 0.05\n1 0.25", "ascend"},
		"twice":          {"1 0.25\n2", "2 0.25\n2", "ascend"},
		"word":           {"0 0.4", "0 x", "line 5"},
		"columns":        {"0 0.4", "0 0.4 1", "line 5"},
		"negative":       {"1 0.25", "1 -0.25", "negative"},
		"NaN":            {"1 0.25", "1 NaN", "NaN"},
		"infinite":       {"1 0.25", "1 Inf", "Inf"},
		"offset NaN":     {"\n1 0.25", "\nNaN 0.25", "ascend"},
		"few":            {bell, "offset_A p\n-1 0\n0 1\n1 0\n", "3 offsets"},
		"off centre":     {bell, "offset_A p\n7 0\n8 0.05\n9 0.25\n10 0.4\n11 0.25\n12 0.05\n13 0\n", "centre of gravity"},
		"zero":           {bell, "offset_A p\n-2 0\n-1 0\n0 0\n1 0\n2 0\n", "negative"},
		"wavelengths":    {"offset_A profile\n", "offset_A 1200 x\n", "wavelength"},
		"two same":       {bell, "offset_A 1200 1200\n-2 0 0\n-1 .3 .3\n0 .4 .4\n1 .3 .3\n2 0 0\n", "ascend"},
		"wave negative":  {"profile", "-1200", "ascend"},
	} {
		err := read(strings.Replace(bell, tc.old, tc.new, 1))
		if err == nil || !oops.IsInput(err) || !strings.Contains(err.Error(), tc.says) || !strings.Contains(err.Error(), "profile.txt") {
			t.Errorf("%s: error %v, want one that says %q", name, err, tc.says)
		}
	}
	if _, err := lsf.Read(filepath.Join(t.TempDir(), "none"), 0); !oops.IsInput(err) {
		t.Errorf("missing file: %v", err)
	}
}

func FuzzRead(f *testing.F) {
	f.Add([]byte(bell))
	f.Add([]byte("# c\noffset_kms,1200,1700\n-2,0,0\n-1,.3,.3\n0,.4,.4\n1,.3,.3\n2,0,0\n"))
	f.Add([]byte("offset_A 1e300 1e301\n-1e308 0 0\n-1 0 1\n0 1 0\n1 1 1\n1e308 0 0\n"))
	path := filepath.Join(f.TempDir(), "fuzz.txt")
	f.Fuzz(func(t *testing.T, in []byte) {
		if err := os.WriteFile(path, in, 0o600); err != nil {
			t.Fatal(err)
		}
		p, err := lsf.Read(path, 0)
		if err != nil {
			if !oops.IsInput(err) {
				t.Fatalf("not a user's mistake: %v", err)
			}
			return
		}
		// What was taken is a distribution: it begins at 0, ends at 1 and has a width.
		const wave = 1500
		r := p.Reach(wave)
		if a, b := p.Below(wave, -2*r), p.Below(wave, 2*r); a != 0 || b != 1 || !(p.Sigma(wave) > 0) {
			t.Fatalf("accepted %q: integral from %g to %g, σ %g", in, a, b, p.Sigma(wave))
		}
	})
}
