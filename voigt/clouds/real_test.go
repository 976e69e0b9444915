package clouds_test

import (
	"math"
	"path/filepath"
	"testing"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/internal/check"
	"lacuna/spectrum"
	"lacuna/spectrum/continuum"
	"lacuna/spectrum/frame"
	"lacuna/voigt/clouds"
	"lacuna/voigt/lsf"
)

// real reads a spectrum and puts it on vacuum and the heliocentric frame.
func real(t *testing.T, name string) []spectrum.Segment {
	t.Helper()
	s, err := spectrum.Read(check.Shared(t, filepath.Join("realdata", name)), spectrum.Options{})
	if err != nil {
		t.Fatal(err)
	}
	for i := range s.Segments {
		if err := s.Segments[i].ToVacuum(frame.Ciddor1996); err != nil {
			t.Fatal(err)
		}
		if err := s.Segments[i].ToFrame(frame.Heliocent); err != nil {
			t.Fatal(err)
		}
	}
	return s.Segments
}

// piece makes a window on the segment in which the line stands farthest from an end,
// side km/s wider than lo … hi, with the noise as audited beside the line.
func piece(t *testing.T, segs []spectrum.Segment, lines []atomic.Line, lo, hi, side, fwhm float64, degree int) clouds.Window {
	t.Helper()
	l := lines[0]
	at := func(v float64) float64 { return l.Wave * (1 + v/atomic.C) }
	best, most := -1, 0.0
	for i, s := range segs {
		if len(s.Wave) < 2 {
			continue
		}
		if room := min(at(lo)-s.Wave[0], s.Wave[len(s.Wave)-1]-at(hi)); room > most {
			best, most = i, room
		}
	}
	if best < 0 {
		t.Fatalf("no segment covers %s", l.Name)
	}
	c := segs[best].Cut(at(lo-side), at(hi+side))
	m, err := continuum.Fit(c.Wave, c.Flux, c.Err, c.Mask, continuum.Options{Degree: -1, Target: [2]float64{at(lo), at(hi)}})
	if err != nil {
		t.Fatal(err)
	}
	w := clouds.Window{Name: l.Name, Lines: lines, Wave: c.Wave, Flux: c.Flux, Err: m.Sigma, Rho: m.Noise.Rho, Degree: degree,
		Profile: lsf.Sum{{Weight: 1, FWHM: lsf.Velocity(fwhm)}}, ZeroErr: 0.01}
	w.Mask = make([]bool, len(c.Wave))
	for i := range w.Mask {
		w.Mask[i] = c.Mask != nil && c.Mask[i].Bad() || !(m.Sigma[i] > 0) || math.IsNaN(c.Flux[i])
	}
	return w
}

// start makes clouds of one species from v, b, log N.
func start(carrier string, list ...[3]float64) []clouds.Cloud {
	var out []clouds.Cloud
	for _, c := range list {
		out = append(out, clouds.Cloud{V: clouds.Start(c[0]), B: clouds.Start(c[1]).Within(0.5, 15), Species: []clouds.Species{{Carrier: carrier, LogN: clouds.Start(c[2])}}})
	}
	return out
}

// summary logs a result.
func summary(t *testing.T, r clouds.Result) {
	t.Helper()
	for _, c := range r.Clouds {
		for _, s := range c.Species {
			t.Logf("v %7.2f ± %.2f  %-6s b %5.2f ± %.2f %-6s log N %.3f ± %.3f %s %s", c.V.X, c.V.Err(), s.Carrier, s.B.X, s.B.Err(), s.B.Kind(), s.LogN.X, s.LogN.Err(), s.LogN.Kind(), s.LogN.Flag)
		}
	}
	for _, w := range r.Windows {
		t.Logf("%s: χ² %.1f of %d, zero %.4f ± %.4f, FWHM %.2f, DW %+.1fσ, runs %+.1fσ", w.Name, w.Chi2, w.Pixels, w.Zero, w.ZeroErr, w.FWHM, w.Whiteness.WatsonZ, w.Whiteness.RunsZ)
	}
	t.Logf("χ² %.1f of %d, n_eff %.0f, DW %+.1fσ, runs %+.1fσ, %s; %q", r.Chi2, r.DOF, r.NEff, r.Whiteness.WatsonZ, r.Whiteness.RunsZ, r.Stop, r.Notes)
}

// noiseLike reports whether the residuals look like noise: χ² within 5 of its standard errors,
// and the tests of neighbours within 4.
func noiseLike(t *testing.T, name string, chi2, dof float64, w clouds.Tests) {
	t.Helper()
	if !(math.Abs(chi2-dof) <= 5*math.Sqrt(2*dof)) || !(math.Abs(w.WatsonZ) <= 4) || !(math.Abs(w.RunsZ) <= 4) {
		t.Errorf("%s: χ² %.1f for %.0f degrees of freedom, Durbin–Watson %+.1fσ, runs %+.1fσ", name, chi2, dof, w.WatsonZ, w.RunsZ)
	}
}

// Fe II towards HR 1840 (HST/STIS E230H): realdata/INDEX.md lists clouds near −8, +3, +15
// to +30 (a deep blend), +37, +45 and one at −25 to −35. A cloud near each; residuals like
// noise at 2382 and 2586 Å. (2374 Å stands on structure of the star as narrow as the
// clouds, and is left out.)
func TestRealFeII(t *testing.T) {
	hr := real(t, "hr1840/ocb6i2020_x1d.fits")
	var p clouds.Problem
	for _, n := range []string{"Fe II 2344", "Fe II 2382", "Fe II 2586"} {
		p.Windows = append(p.Windows, piece(t, hr, []atomic.Line{line(t, n)}, -40, 65, 60, 2.6, 3))
	}
	p.Clouds = start("Fe II", [3]float64{-30, 3, 12.1}, [3]float64{-26, 1.5, 12}, [3]float64{-13, 5, 12.2}, [3]float64{-7, 2, 12.2}, [3]float64{2, 3.4, 13},
		[3]float64{16.7, 2.7, 13.2}, [3]float64{22.5, 11, 13.6}, [3]float64{24.2, 3, 13.5}, [3]float64{29.2, 0.7, 14}, [3]float64{31, 1.4, 13.1}, [3]float64{37.6, 2.2, 12.9}, [3]float64{43.3, 2.7, 12.9})
	f, err := clouds.New(p, clouds.Options{})
	if err != nil {
		t.Fatal(err)
	}
	r, err := f.Fit()
	if err != nil {
		t.Fatal(err)
	}
	summary(t, r)
	for _, want := range []float64{-30, -8, 3, 17, 24, 29, 37, 45} {
		near := math.Inf(1)
		for _, c := range r.Clouds {
			if !math.IsNaN(c.V.X) {
				near = min(near, math.Abs(c.V.X-want))
			}
		}
		if !(near <= 2.5) { // positions in the index are rounded to about a km/s
			t.Errorf("no cloud near %g km/s: the nearest is %.1f away", want, near)
		}
	}
	for _, w := range r.Windows[1:] {
		noiseLike(t, w.Name, w.Chi2, float64(w.Pixels)*float64(r.DOF)/float64(r.Pixels), w.Whiteness)
	}
	// Zero of 2382 from its black core: −0.003 ± 0.001 (practice notes, by direct sums)
	if w := r.Windows[1]; !(math.Abs(w.Zero+0.003) <= 3*math.Hypot(w.ZeroErr, 0.001)) {
		t.Errorf("zero level of 2382: %.4f ± %.4f", w.Zero, w.ZeroErr)
	}
}

// Two clouds of the local interstellar medium towards G191-B2B (HST/STIS E140M), near +3
// and +12 km/s in the file (realdata/INDEX.md), in four lines of Si II. The profile of this
// aperture has wide wings; a quarter of the light in 18 km/s is a rough form of them (from
// memory). 1304 Å holds a little more than two clouds.
func TestRealTwoClouds(t *testing.T) {
	g := real(t, "g191-b2b/o4vt02040_x1d.fits")
	var p clouds.Problem
	for _, n := range []string{"Si II 1190", "Si II 1260", "Si II 1304", "Si II 1526"} {
		w := piece(t, g, []atomic.Line{line(t, n)}, -20, 35, 90, 6.7, 2)
		w.Profile = lsf.Sum{{Weight: 0.75, FWHM: lsf.Velocity(6.2)}, {Weight: 0.25, FWHM: lsf.Velocity(18)}}
		w.WidthErr = 0.15
		w.Exposure, w.VelocityErr = n, 0.5 // orders of an echelle differ in their zero by a fraction of a pixel
		p.Windows = append(p.Windows, w)
	}
	p.Clouds = start("Si II", [3]float64{3, 3, 13}, [3]float64{12, 3, 13})
	_, r := fit(t, p)
	summary(t, r)
	for i, want := range []float64{3, 12} {
		if v := r.Clouds[i].V; !(math.Abs(v.X-want) <= 3) {
			t.Errorf("cloud at %.2f ± %.2f km/s, expected near %g", v.X, v.Err(), want)
		}
	}
	for _, k := range []int{0, 1, 3} {
		w := r.Windows[k]
		noiseLike(t, w.Name, w.Chi2, float64(w.Pixels)*float64(r.DOF)/float64(r.Pixels), w.Whiteness)
	}
}

// Na I towards Cen X-3 (UVES): the D lines are black, and the weak doublet at 3302 Å
// anchors the column: with it the error of ΣN falls.
func TestRealAnchor(t *testing.T) {
	red, blue := real(t, "cen-x3/ADP.2021-08-26T17_24_42.172.fits"), real(t, "cen-x3/ADP.2021-08-26T17_24_42.195.fits")
	var p clouds.Problem
	for _, n := range []string{"Na I 5889.95", "Na I 5895.92"} {
		w := piece(t, red, []atomic.Line{line(t, n)}, -50, 45, 40, 7.1, 2)
		w.Instrument = "red"
		p.Windows = append(p.Windows, w)
	}
	p.Clouds = start("Na I", [3]float64{-38, 1, 11.2}, [3]float64{-19.4, 2, 12.9}, [3]float64{-12.9, 2, 13.8}, [3]float64{0, 2, 13.6}, [3]float64{9, 4, 13.8}, [3]float64{24.6, 6, 12.5}, [3]float64{26.9, 1.5, 13})
	_, alone := fit(t, p)
	summary(t, alone)
	w := piece(t, blue, []atomic.Line{line(t, "Na I 3302.37"), line(t, "Na I 3302.98")}, -50, 100, 100, 7.3, 2)
	w.Instrument = "blue"
	p.Windows = append(p.Windows, w)
	f, both := fit(t, p)
	summary(t, both)
	a, b := alone.Totals[0].LogN, both.Totals[0].LogN
	t.Logf("log ΣN %.3f ± %.3f from the D lines, %.3f ± %.3f with 3302", a.X, a.Err(), b.X, b.Err())
	if !(b.Err() < 0.8*a.Err()) && !(a.Kind() == "upper") {
		t.Errorf("the weak doublet does not help: ± %.3f and ± %.3f", a.Err(), b.Err())
	}
	noiseLike(t, "3302", both.Windows[2].Chi2, float64(both.Windows[2].Pixels), both.Windows[2].Whiteness)
	// D cores are black to 0.0034 ± 0.001 each (practice notes, by direct sums)
	for _, w := range both.Windows[:2] {
		if !(math.Abs(w.Zero-0.0034) <= 3*math.Hypot(w.ZeroErr, 0.001)) {
			t.Errorf("%s: zero level %.4f ± %.4f", w.Name, w.Zero, w.ZeroErr)
		}
	}
	iv, err := f.Profile(both, clouds.TotalName("Na I"), 1)
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("profile: log ΣN %.3f in %.3f … %.3f, open %v %v, lower by %.2f", iv.X, iv.Lo, iv.Hi, iv.OpenLo, iv.OpenHi, iv.Lower)
}

// Ca II K towards Cen X-3: the number of clouds found by itself, residuals like noise, and
// the width that direct sums give (718 ± 5 mA, realdata/INDEX.md, whose author adds 2 to
// 5 % for the continuum).
func TestRealSearch(t *testing.T) {
	blue := real(t, "cen-x3/ADP.2021-08-26T17_24_42.195.fits")
	s := clouds.Search{
		Windows: []clouds.Window{piece(t, blue, []atomic.Line{line(t, "Ca II 3933.66")}, -50, 45, 100, 7.3, 3)}, V: [2]float64{-50, 45},
		Like: clouds.Cloud{B: clouds.Start(1).Within(0.5, 12), Species: []clouds.Species{{Carrier: "Ca II"}}},
	}
	got, err := s.Run()
	if err != nil {
		t.Fatal(err)
	}
	summary(t, got.Result)
	for _, o := range got.Solutions {
		t.Logf("%d clouds %.1f: χ² %.1f, BIC %.1f %s", o.Number, o.V, o.Chi2, o.BIC, o.Refused)
	}
	noiseLike(t, "Ca II K", got.Chi2, float64(got.DOF), got.Whiteness)
	w := got.Ranges[0].Widths[0].W
	t.Logf("W = %.1f ± %.1f mÅ, by structure %.1f", 1e3*w.X, 1e3*w.Err(), 1e3*w.ErrBy(budget.Structure))
	if !(math.Abs(w.X-0.718) <= 0.05*0.718+3*w.Err()) {
		t.Errorf("W = %.1f ± %.1f mÅ, index 718", 1e3*w.X, 1e3*w.Err())
	}
}
