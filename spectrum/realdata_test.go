package spectrum_test

import (
	"math"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/spectrum"
	"lacuna/spectrum/frame"
)

// Facts of realdata/INDEX.md, collected by hand from the headers; SHA-256 by its
// first 16 digits. Ranges there are rounded to 1 Å.
func TestRealFiles(t *testing.T) {
	for _, tc := range []struct {
		file, layout, sha string
		segments, pixels  int // pixels of the first segment
		lo, hi            float64
		medium            frame.Medium
		kind              frame.Kind
		keyword           string // of the correction
		v                 float64
		done              bool
		r                 float64
	}{
		{"cen-x3/ADP.2021-08-26T17_24_42.195.fits", "ESO", "9a6b5e63fcc34a91", 1, 93872, 3281, 4562, frame.Air, frame.Topocentric, "ESO QC VRAD HELICOR", 13.888, false, 40970},
		{"cen-x3/ADP.2021-08-26T17_24_42.172.fits", "ESO", "045e1ef3063160e3", 2, 72982, 4583, 6686, frame.Air, frame.Topocentric, "ESO QC VRAD HELICOR", 13.888, false, 42310},
		{"smc-x1/ADP.2021-08-25T12_56_30.964.fits", "ESO", "79521fc25d4a5c1c", 1, 94221, 3281, 4562, frame.Air, frame.Topocentric, "ESO QC VRAD HELICOR", -7.298, false, 40970},
		{"lmc-x4/ADP.2021-09-09T13_16_16.511.fits", "ESO", "ccf20f4f54088016", 2, 73260, 4583, 6686, frame.Air, frame.Topocentric, "ESO QC VRAD HELICOR", -1.398, false, 42310},
		{"lmc-x4/ADP.2021-09-09T08_23_17.841.fits", "ESO", "adfa67510bcdee9b", 2, 73207, 4583, 6686, frame.Air, frame.Topocentric, "ESO QC VRAD HELICOR", -1.28, false, 42310},
		{"qv-nor/ADP.2020-06-19T08_40_21.544.fits", "ESO", "55cea62cfb21cc9a", 2, 73703, 4583, 6687, frame.Air, frame.Topocentric, "ESO QC VRAD HELICOR", -4.669, false, 51690},
		{"bd28-4211/o3zx02070_x1d.fits", "HST", "6264eef30c00c483", 40, 1024, 1607, 2366, frame.Vacuum, frame.Heliocent, "V_HELIO (sign turned)", math.NaN(), true, 30000},
		{"hr1840/ocb6i2020_x1d.fits", "HST", "d7800f509ab6344e", 34, 1024, 2327, 2597, frame.Vacuum, frame.Heliocent, "V_HELIO (sign turned)", math.NaN(), true, 114000},
		{"g191-b2b/o4vt02040_x1d.fits", "HST", "7d70d74ffd9399df", 44, 1024, 1140, 1730, frame.Vacuum, frame.Heliocent, "V_HELIO (sign turned)", math.NaN(), true, 45800},
		{"he1523-0901/he1523-0901.fits", "linear", "706e6f21d40a37c5", 1, 182394, 3400, 9400, frame.UnknownMedium, frame.Unknown, "", 0, false, 0},
		{"hd140283/hd140283.fits", "linear", "aa1bf2d081bfaf4a", 1, 183923, 3352, 9404, frame.Air, frame.Source, "DOPCOR01", 142.0, true, 0},
		{"alpha-cen-a/alphaCenA_LyA.txt", "text", "4c0c3c07a7d4593e", 1, 2000, 1212.32, 1218.78, frame.Vacuum, frame.Unknown, "", 0, false, 0},
		{"3c273/3C273_STIS.txt", "text", "751b3b58faaf3186", 12, 4757, 1145.43, 1709.46, frame.Vacuum, frame.Unknown, "", 0, false, 0},
		{"iq-aur/TRES.fits", "multispec", "c74fb201dcabd47d", 51, 2304, 3850, 9097, frame.Air, frame.Unknown, "", 0, false, 0},
		{"layouts/AAO.fits", "multispec", "775b3336ecf8c0ae", 51, 2746, 4780, 8415, frame.Air, frame.Unknown, "", 0, false, 0},
		{"layouts/evega.0039.rs.ec.dispcor.fits", "multispec", "d8b7f764e8c6d501", 107, 2048, 3466, 10290, frame.Air, frame.Unknown, "", 0, false, 0},
		{"layouts/multispec_equispec.fits", "multispec", "88864d75b9414fb9", 2, 1024, 14740, 24466, frame.Air, frame.Unknown, "", 0, false, 0}, // range: WAT2's own w1, dw and nw
		{"layouts/IUE_LWP.fits", "MXLO", "a1b604f9055035d4", 1, 640, 1750, 3452, frame.Vacuum, frame.Heliocent, "", 0, false, 0},               // "about 1850-3350 Å" of good pixels
		{"layouts/UM669_nF.fits", "log-linear", "2d92f4975be78c9d", 1, 16602, 3041, 10284, frame.UnknownMedium, frame.Unknown, "", 0, false, 0},
		{"layouts/r.UVES.2011-08-11T232352.266-A01_0000.fits", "linear", "4810a7c21cc9748b", 1, 42751, 3732, 5000, frame.Air, frame.Topocentric, "ESO QC VRAD HELICOR", -27.477, false, 0},
		{"layouts/mbgphH201811160014_u1we.fits", "linear", "203bbc68ffb358df", 37, 1152, 3858, 5580, frame.UnknownMedium, frame.Unknown, "", 0, false, 0},
		{"layouts/alphadra_20220513233026_gbertrand.fits", "linear", "ab3f201d4d5e64db", 1, 7591, 6463, 6700, frame.UnknownMedium, frame.Topocentric, "", 0, false, 17384},
	} {
		t.Run(tc.file, func(t *testing.T) {
			s, err := spectrum.Read(check.Shared(t, "realdata/"+tc.file), spectrum.Options{})
			if err != nil {
				t.Fatal(err)
			}
			g := &s.Segments[0]
			if !strings.Contains(s.Layout, tc.layout) || !strings.HasPrefix(g.Source.SHA256, tc.sha) {
				t.Errorf("layout %q, SHA-256 %s; want %q, %s…", s.Layout, g.Source.SHA256, tc.layout, tc.sha)
			}
			if len(s.Segments) != tc.segments || len(g.Wave) != tc.pixels {
				t.Errorf("%d segments, %d pixels in the first; want %d, %d", len(s.Segments), len(g.Wave), tc.segments, tc.pixels)
			}
			lo, hi := math.Inf(1), 0.0
			for k := range s.Segments {
				g := &s.Segments[k]
				lo, hi = min(lo, g.Wave[0]), max(hi, g.Wave[len(g.Wave)-1])
				if g.Medium != tc.medium || g.Frame != tc.kind || g.Resolution != tc.r {
					t.Fatalf("%s: %q (%s), %q (%s), R %g; want %q, %q, %g", g.Label, g.Medium, g.MediumBy, g.Frame, g.FrameBy, g.Resolution, tc.medium, tc.kind, tc.r)
				}
			}
			tol := 1.0
			if tc.segments == 37 {
				tol = 5 // rounded to 10 Å there
			}
			if !(math.Abs(lo-tc.lo) <= tol) || !(math.Abs(hi-tc.hi) <= tol) {
				t.Errorf("%.3f to %.3f Å, want %g to %g", lo, hi, tc.lo, tc.hi)
			}
			if tc.keyword == "" {
				if len(g.Shift) != 0 {
					t.Errorf("corrections %v, want none", g.Shift)
				}
				return
			}
			a := g.Shift[0]
			if a.Keyword != tc.keyword || a.Done != tc.done || !math.IsNaN(tc.v) && !(math.Abs(a.V-tc.v) < 1e-3*max(1, math.Abs(tc.v))) {
				t.Errorf("correction %+v, want %s of %g, done %v", a, tc.keyword, tc.v, tc.done)
			}
		})
	}
}

// realdata/INDEX.md: Ca II K towards Cen X-3 is saturated at heliocentric
// velocities; CH 4300 lies at +1.8 km/s and CH+ 4232 at +5.5 km/s with 25 and
// 38 mÅ, measured by the collector by direct integration after adding HELICOR.
// The velocity is the weighted mean over the line; 1.5 km/s allows for the
// continuum and the limits of the window, and is far below the 13.9 km/s of the
// correction or the 85 km/s between air and vacuum. At S/N 30 a pixel the noise
// of line and continuum is about 5 mÅ; twice that is allowed.
func TestCenX3Velocities(t *testing.T) {
	s, err := spectrum.Read(check.Shared(t, "realdata/cen-x3/ADP.2021-08-26T17_24_42.195.fits"), spectrum.Options{})
	if err != nil {
		t.Fatal(err)
	}
	g := &s.Segments[0]
	if err := g.ToVacuum(frame.Ciddor1996); err != nil {
		t.Fatal(err)
	}
	for range 2 { // the second time must change nothing
		if err := g.ToFrame(frame.Heliocent); err != nil {
			t.Fatal(err)
		}
	}
	if v, ok := g.Motion(); !ok || !(math.Abs(v-13.888) < 0.001) {
		t.Errorf("motion of the observer %g, %v; want 13.888", v, ok)
	}
	for _, l := range []struct {
		name         string
		air, v, ew   float64
		vtol, ewtol  float64
		left, window float64
	}{{"CH", 4300.313, 1.8, 25, 1.5, 10, -25, 25}, {"CH+", 4232.548, 5.5, 38, 1.5, 10, -25, 30}} {
		rest := frame.ToVacuum(l.air, frame.Ciddor1996)
		v, ew := centroid(g, rest, l.left, l.window, 30)
		if !(math.Abs(v-l.v) <= l.vtol) || !(math.Abs(ew-l.ew) <= l.ewtol) {
			t.Errorf("%s: v = %.2f km/s, W = %.1f mÅ; want %.1f ± %.1f, %.0f ± %.0f", l.name, v, ew, l.v, l.vtol, l.ew, l.ewtol)
		}
	}
	// Ca II K reaches 0.00 between -50 and +45 km/s: the darkest 9 pixels (the
	// width of the instrument's profile, 0.1 Å) against the star's light beside.
	k := frame.ToVacuum(3933.661, frame.Ciddor1996)
	core := g.Cut(frame.Wavelength(k, -50), frame.Wavelength(k, 45))
	side := g.Cut(frame.Wavelength(k, -90), frame.Wavelength(k, -60))
	dark := math.Inf(1)
	for i := 0; i+9 <= len(core.Flux); i++ {
		dark = min(dark, mean(core.Flux[i:i+9]))
	}
	if c := mean(side.Flux); !(math.Abs(dark) < 0.02*c) {
		t.Errorf("Ca II K core %g against %g beside it, want below 2 %%", dark, c)
	}
}

func mean(v []float64) float64 {
	s := 0.0
	for _, x := range v {
		s += x
	}
	return s / float64(len(v))
}

// centroid integrates 1 − F/F_c between lo and hi km/s with a straight continuum
// through the means of side km/s on either side.
func centroid(g *spectrum.Segment, rest, lo, hi, side float64) (v, ew float64) {
	at := func(a, b float64) (x, y float64) {
		c := g.Cut(frame.Wavelength(rest, a), frame.Wavelength(rest, b))
		return mean(c.Wave), mean(c.Flux)
	}
	x1, y1 := at(lo-side, lo)
	x2, y2 := at(hi, hi+side)
	line := g.Cut(frame.Wavelength(rest, lo), frame.Wavelength(rest, hi))
	var sum, first float64
	for i, w := range line.Wave {
		depth := 1 - line.Flux[i]/(y1+(y2-y1)*(w-x1)/(x2-x1))
		sum += depth
		first += depth * frame.Velocity(w, rest)
	}
	step := (line.Wave[len(line.Wave)-1] - line.Wave[0]) / float64(len(line.Wave)-1)
	return first / sum, 1000 * sum * step
}

// realdata/INDEX.md on the orders of IQ Aur (TRES), counted from 0 there: Ca II K
// has a narrow core of 21 mÅ at −15.5 km/s in order 1, Na I D2 28 ± 3 mÅ at −14.9 in
// order 30, topocentric; K I 7699 falls into a gap between orders. Widths agree
// within the collector's 2 mÅ for the continuum and the 3 mÅ of noise, doubled;
// velocities within 1.5 km/s, for lines as weak as telluric water near by.
func TestTRESLines(t *testing.T) {
	s, err := spectrum.Read(check.Shared(t, "realdata/iq-aur/TRES.fits"), spectrum.Options{Frame: frame.Topocentric})
	if err != nil {
		t.Fatal(err)
	}
	for _, l := range []struct {
		order     int
		air, v, w float64
		lo, hi    float64
	}{{1, 3933.661, -15.5, 21, -26, -5}, {30, 5889.951, -14.9, 28, -24, -6}} {
		g := s.Segments[l.order]
		if g.Wave[0] > l.air || g.Wave[len(g.Wave)-1] < l.air {
			t.Errorf("order %d runs from %.1f to %.1f Å", l.order, g.Wave[0], g.Wave[len(g.Wave)-1])
			continue
		}
		v, w := centroid(&g, l.air, l.lo, l.hi, 8)
		if !(math.Abs(v-l.v) <= 1.5) || !(math.Abs(w-l.w) <= 10) {
			t.Errorf("%.1f Å: %.1f mÅ at %.2f km/s, want %.0f at %.1f", l.air, w, v, l.w, l.v)
		}
	}
	for k := range s.Segments {
		if g := &s.Segments[k]; g.Wave[0] < 7698.96 && g.Wave[len(g.Wave)-1] > 7698.96 {
			t.Errorf("%s covers K I 7699", g.Label)
		}
	}
}

// realdata/INDEX.md, section B: what is particular about each layout.
func TestRealLayouts(t *testing.T) {
	read := func(name string) *spectrum.Spectrum {
		s, err := spectrum.Read(check.Shared(t, "realdata/layouts/"+name), spectrum.Options{})
		if err != nil {
			t.Fatal(err)
		}
		return s
	}
	aao := read("AAO.fits")
	for k := range aao.Segments { // orders and wavelengths descend
		if g := &aao.Segments[k]; k > 0 && !(g.Wave[0] < aao.Segments[k-1].Wave[0]) || !strings.Contains(strings.Join(g.Notes, ";"), "descend") {
			t.Errorf("AAO: %s from %.1f Å, notes %q", g.Label, g.Wave[0], g.Notes)
		}
	}
	vega := read("evega.0039.rs.ec.dispcor.fits")
	for k := range vega.Segments { // dtype 0: equal steps
		g := &vega.Segments[k]
		n := len(g.Wave)
		if step := (g.Wave[n-1] - g.Wave[0]) / float64(n-1); !(math.Abs(g.Wave[n/2]-g.Wave[0]-step*float64(n/2)) < 1e-8) {
			t.Errorf("Vega: %s is not linear", g.Label)
		}
	}
	if tirspec := read("multispec_equispec.fits"); !strings.Contains(strings.Join(tirspec.Notes, ";"), "2 (background)") || tirspec.Object != "HR4659" {
		t.Errorf("%s: notes %q", tirspec.Object, tirspec.Notes)
	}
	iue := read("IUE_LWP.fits")
	g := &iue.Segments[0]
	lo, hi := math.Inf(1), 0.0
	for i, w := range g.Wave {
		if !g.Mask[i].Bad() {
			lo, hi = min(lo, w), max(hi, w)
		}
	}
	if !(lo > 1800 && lo < 1900) || !(hi > 3300 && hi < 3400) || iue.Object != "NGC 4151" || g.Unit != "ERG/CM2/S/A" { // "about 1850-3350 A"
		t.Errorf("IUE: good from %.0f to %.0f Å, %s, %s", lo, hi, iue.Object, g.Unit)
	}
	salt := read("mbgphH201811160014_u1we.fits")
	sizes := map[int]bool{}
	for k := range salt.Segments { // an HDU an order, each with its own size
		g := &salt.Segments[k]
		sizes[len(g.Wave)] = true
		if g.Source.HDU != k || g.Order != k+1 {
			t.Errorf("SALT: %s, order %d, HDU %d", g.Label, g.Order, g.Source.HDU)
		}
	}
	// RA = 23.66 stands for hours: DS Tuc A lies at 23h 39m 39s (INDEX: HD 222259A).
	if len(sizes) < 20 || salt.Object != "HD 222259A first fiber" || salt.Coord == nil || !(math.Abs(salt.Coord.RA-15*(23+39.66/60)) < 0.01) {
		t.Errorf("SALT: %d sizes, %q, %v", len(sizes), salt.Object, salt.Coord)
	}
	if s := read("UM669_nF.fits"); !(math.Abs(s.Segments[0].Wave[0]-math.Pow(10, 3.48308100271)) < 1e-6) {
		t.Errorf("UM 669: from %.6f Å", s.Segments[0].Wave[0])
	}
	if s := read("r.UVES.2011-08-11T232352.266-A01_0000.fits"); s.Object != "MN-Lup" { // HIERARCH ESO OBS TARG NAME, not OBJECT
		t.Errorf("UVES: the star is called %q", s.Object)
	}
}

func BenchmarkReadESO(b *testing.B) {
	path := check.Shared(b, "realdata/cen-x3/ADP.2021-08-26T17_24_42.172.fits")
	b.ReportAllocs()
	for b.Loop() {
		if _, err := spectrum.Read(path, spectrum.Options{}); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkReadX1D(b *testing.B) {
	path := check.Shared(b, "realdata/hr1840/ocb6i2020_x1d.fits")
	b.ReportAllocs()
	for b.Loop() {
		if _, err := spectrum.Read(path, spectrum.Options{}); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkReadText(b *testing.B) {
	path := check.Shared(b, "realdata/3c273/3C273_STIS.txt")
	b.ReportAllocs()
	for b.Loop() {
		if _, err := spectrum.Read(path, spectrum.Options{}); err != nil {
			b.Fatal(err)
		}
	}
}
