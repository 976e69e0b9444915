package spectrum_test

import (
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/internal/oops"
	"lacuna/spectrum"
	"lacuna/spectrum/frame"
)

// lantern1 is an invented spectrum of two orders of different length.
func lantern1(medium frame.Medium, kind frame.Kind) *spectrum.Spectrum {
	s := &spectrum.Spectrum{Object: "Lantern 1", Coord: &spectrum.Coord{RA: 312.2345, Dec: -44.1234}}
	for k, n := range []int{40, 31} {
		g := spectrum.Segment{Order: 87 + k, Label: []string{"order 87", "order 88"}[k], Medium: medium, Frame: kind, Unit: "erg s-1 cm-2 Angstrom-1", Resolution: 81234.5, Normalised: true,
			Shift: []frame.Applied{{Keyword: "test", To: frame.Heliocent, V: -17.25, Done: kind == frame.Heliocent}}}
		for i := range n {
			g.Wave = append(g.Wave, 3933.123456789+50*float64(k)+0.012*float64(i))
			g.Flux = append(g.Flux, 1-0.9*math.Exp(-float64((i-15)*(i-15))/20))
			g.Err = append(g.Err, 0.01+0.001*float64(i%7))
			g.Continuum = append(g.Continuum, 1+1e-3*float64(i))
			g.Mask = append(g.Mask, 0)
		}
		g.Mask[7] = spectrum.BadCosmic
		s.Segments = append(s.Segments, g)
	}
	return s
}

func TestWriteReadsBack(t *testing.T) {
	dir := t.TempDir()
	for _, name := range []string{"a.fits", "a.ecsv", "a.csv"} {
		for _, medium := range []frame.Medium{frame.Air, frame.Vacuum, frame.UnknownMedium} {
			for _, kind := range []frame.Kind{frame.Topocentric, frame.Heliocent, frame.LSRK, frame.Unknown} {
				want := lantern1(medium, kind)
				path := filepath.Join(dir, name)
				if err := spectrum.Write(path, want, spectrum.Card{Key: "DATE-OBS", Value: "2031-03-05"}); err != nil {
					t.Fatal(err)
				}
				got, err := spectrum.Read(path, spectrum.Options{})
				if err != nil {
					t.Fatal(err)
				}
				if got.Object != want.Object || *got.Coord != *want.Coord || len(got.Segments) != 2 {
					t.Fatalf("%s: %q, %v, %d segments", name, got.Object, got.Coord, len(got.Segments))
				}
				for k := range want.Segments {
					compare(t, name, &got.Segments[k], &want.Segments[k])
				}
			}
		}
	}
	verify(t, filepath.Join(dir, "a.fits"))
}

func compare(t *testing.T, name string, got, want *spectrum.Segment) {
	t.Helper()
	if !slices.Equal(got.Wave, want.Wave) || !slices.Equal(got.Flux, want.Flux) || !slices.Equal(got.Err, want.Err) {
		t.Errorf("%s: wavelengths, fluxes or errors differ: %v…, want %v…", name, got.Wave[:2], want.Wave[:2])
	}
	if got.Medium != want.Medium || got.Frame != want.Frame || got.Resolution != want.Resolution || got.Normalised != want.Normalised || got.Unit != want.Unit || got.Order != want.Order {
		t.Errorf("%s: %+v\nwant %+v", name, got, want)
	}
	for i := range want.Mask {
		if got.Mask[i].Bad() != want.Mask[i].Bad() {
			t.Errorf("%s: mask at %d", name, i)
		}
	}
	if want.Continuum != nil && !slices.Equal(got.Continuum, want.Continuum) {
		t.Errorf("%s: continuum differs", name)
	}
	if len(got.Shift) != 1 || got.Shift[0].V != want.Shift[0].V || got.Shift[0].To != want.Shift[0].To {
		t.Fatalf("%s: corrections %+v", name, got.Shift)
	}
	if done := got.Shift[0].Done; done != (want.Frame == frame.Heliocent || want.Frame == frame.LSRK) {
		t.Errorf("%s: correction done %v with frame %s", name, done, want.Frame)
	}
}

func TestWriteImageReadsBack(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "a.fits")
	for _, errors := range []bool{true, false} {
		want := lantern1(frame.Air, frame.Topocentric)
		want.Segments = want.Segments[:1]
		w := &want.Segments[0]
		w.Order, w.Continuum = 1, nil
		if !errors {
			w.Err = nil
		}
		if err := spectrum.WriteImage(path, want); err != nil {
			t.Fatal(err)
		}
		got, err := spectrum.Read(path, spectrum.Options{})
		if err != nil {
			t.Fatal(err)
		}
		g := &got.Segments[0]
		for i := range w.Wave { // the axis is three numbers: rounding of a few 1e-13
			if !(math.Abs(g.Wave[i]-w.Wave[i]) < 1e-9) {
				t.Fatalf("wavelength %d: %.12f, want %.12f", i, g.Wave[i], w.Wave[i])
			}
		}
		copy(g.Wave, w.Wave)
		if !math.IsNaN(g.Flux[7]) {
			t.Errorf("a masked pixel was written as %g", g.Flux[7])
		}
		g.Flux[7] = w.Flux[7]
		compare(t, "image", g, w)
		verify(t, path)
	}
	uneven := lantern1(frame.Air, frame.Topocentric)
	uneven.Segments = uneven.Segments[:1]
	uneven.Segments[0].Wave[3] += 0.001
	if err := spectrum.WriteImage(path, uneven); err == nil {
		t.Error("uneven wavelengths were written as a linear axis")
	}
}

func TestWriteRefuses(t *testing.T) {
	dir := t.TempDir()
	s := lantern1(frame.Air, frame.Topocentric)
	if err := spectrum.Write(filepath.Join(dir, "a.xyz"), s); !oops.IsInput(err) {
		t.Errorf("a.xyz: %v", err)
	}
	s.Segments[1].Medium = frame.Vacuum
	if err := spectrum.Write(filepath.Join(dir, "a.fits"), s); err == nil {
		t.Error("segments of two media were written")
	}
	if err := spectrum.Write(filepath.Join(dir, "a.fits"), &spectrum.Spectrum{}); err == nil {
		t.Error("nothing was written")
	}
	if left, _ := os.ReadDir(dir); len(left) != 0 {
		t.Errorf("%d files left after errors", len(left))
	}
}

// verify runs HEASARC's FITS verifier where it is installed.
func verify(t *testing.T, path string) {
	t.Helper()
	if prog, err := exec.LookPath("fitsverify"); err == nil {
		out, err := exec.Command(prog, path).CombinedOutput()
		if err != nil || !strings.Contains(string(out), "found 0 warning(s) and 0 error(s)") {
			t.Errorf("%s: %v\n%s", path, err, out)
		}
	} else if os.Getenv("LACUNA_REQUIRE_ALL") == "1" {
		t.Error("fitsverify is not installed (LACUNA_REQUIRE_ALL=1)")
	} else {
		t.Log("fitsverify is not installed: not verified by it")
	}
}

// What only some segments have comes back with those: errors, lower errors, a
// continuum. The table passes fitsverify.
func TestWriteUnlikeSegments(t *testing.T) {
	dir := t.TempDir()
	want := lantern1(frame.Vacuum, frame.Heliocent)
	a, b := &want.Segments[0], &want.Segments[1]
	for _, e := range a.Err {
		a.ErrLow = append(a.ErrLow, e/2)
	}
	b.Err, b.Continuum = nil, nil
	for _, name := range []string{"a.fits", "a.ecsv", "a.csv"} {
		path := filepath.Join(dir, name)
		if err := spectrum.Write(path, want); err != nil {
			t.Fatal(err)
		}
		got, err := spectrum.Read(path, spectrum.Options{})
		if err != nil {
			t.Fatal(err)
		}
		for k := range want.Segments {
			g, w := &got.Segments[k], &want.Segments[k]
			compare(t, name, g, w)
			if !slices.Equal(g.ErrLow, w.ErrLow) || (g.Err == nil) != (w.Err == nil) || (g.Continuum == nil) != (w.Continuum == nil) {
				t.Errorf("%s: segment %d: lower errors %v, errors %v, continuum %v", name, k, g.ErrLow, g.Err != nil, g.Continuum != nil)
			}
		}
	}
	verify(t, filepath.Join(dir, "a.fits"))
}

// Spectra of every kind that were read here can be written as a table that passes
// fitsverify, and come back with the same wavelengths and flux.
func TestConvertSamples(t *testing.T) {
	dir := t.TempDir()
	names, _ := filepath.Glob(filepath.Join(check.Shared(t, "formats/samples"), "[0-9]*"))
	names = append(names, check.Shared(t, "realdata/iq-aur/TRES.fits"), check.Shared(t, "realdata/hr1840/ocb6i2020_x1d.fits"))
	if len(names) != 22 {
		t.Fatalf("%d files", len(names))
	}
	for _, name := range names {
		want, err := spectrum.Read(name, spectrum.Options{})
		if err != nil {
			t.Fatal(err)
		}
		path := filepath.Join(dir, filepath.Base(name)+".fits")
		if err := spectrum.Write(path, want); err != nil {
			t.Errorf("%s: %v", filepath.Base(name), err)
			continue
		}
		verify(t, path)
		got, err := spectrum.Read(path, spectrum.Options{})
		if err != nil {
			t.Errorf("%s: %v", filepath.Base(name), err)
			continue
		}
		if len(got.Segments) != len(want.Segments) || got.Object != want.Object {
			t.Errorf("%s: %d segments of %q, want %d of %q", filepath.Base(name), len(got.Segments), got.Object, len(want.Segments), want.Object)
			continue
		}
		for k := range want.Segments {
			g, w := &got.Segments[k], &want.Segments[k]
			same := func(a, b []float64) bool {
				return slices.EqualFunc(a, b, func(x, y float64) bool { return x == y || math.IsNaN(x) && math.IsNaN(y) })
			}
			if !same(g.Wave, w.Wave) || !same(g.Flux, w.Flux) || !same(g.ErrLow, w.ErrLow) || g.Good() != w.Good() || g.Medium != w.Medium || g.Frame != w.Frame || g.Order != w.Order {
				t.Errorf("%s: segment %d of %s, %s, %d good pixels; want %s, %s, %d", filepath.Base(name), k, g.Medium, g.Frame, g.Good(), w.Medium, w.Frame, w.Good())
			}
		}
	}
}

// A reader that knows nothing of ours. 1 − 0.9 is 0.09999999999999998 in doubles.
func TestAstropyReadsOurTable(t *testing.T) {
	python := "/usr/bin/python3"
	if err := exec.Command(python, "-c", "import astropy").Run(); err != nil {
		check.Missing(t, "astropy is not installed")
	}
	path := filepath.Join(t.TempDir(), "a.fits")
	s := lantern1(frame.Air, frame.Topocentric)
	if err := spectrum.Write(path, s); err != nil {
		t.Fatal(err)
	}
	script := `import sys, warnings
warnings.simplefilter('error')
from astropy.io import fits
from astropy.table import QTable
q = QTable.read(sys.argv[1], hdu=1)
print(len(q), q['WAVE'].unit, q['FLUX'].unit, q['ERR'][1][30])
h = fits.open(sys.argv[1])
t = h[1].data
n = t['NELEM'][0]
print(repr(float(t['WAVE'][0][39])), repr(float(t['FLUX'][1][15])), int(t['QUAL'][0][7]), n, t['LABEL'][1], h[0].header['VHELIO'], h[0].header['SPECSYS'], h[1].header['TUCD4'])`
	out, err := exec.Command(python, "-c", script, path).CombinedOutput()
	if err != nil {
		t.Fatalf("%v\n%s", err, out)
	}
	want := []string{"3933.591456789", "0.09999999999999998", "1", "40", "order 88", "-17.25", "TOPOCENT", "em.wl;obs.atmos", "2 Angstrom erg / (Angstrom cm2 s) 0.012 erg"}
	for _, w := range want {
		if !strings.Contains(string(out), w) {
			t.Errorf("astropy reads %s; want %q in it", out, w)
		}
	}
}
