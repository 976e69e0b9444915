package clouds_test

import (
	"fmt"
	"math"
	"path/filepath"
	"testing"
	"time"

	"lacuna/atomic"
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

func TestRealExplore(t *testing.T) {
	hr := real(t, "hr1840/ocb6i2020_x1d.fits")
	var ws []clouds.Window
	for _, n := range []string{"Fe II 2344", "Fe II 2374", "Fe II 2382", "Fe II 2586"} {
		ws = append(ws, piece(t, hr, []atomic.Line{line(t, n)}, -40, 65, 60, 2.6, 3))
	}
	for _, n := range []string{"Mn II 2576", "Mn II 2594"} {
		ws = append(ws, piece(t, hr, []atomic.Line{line(t, n)}, -40, 65, 60, 2.6, 3))
	}
	s := clouds.Search{Windows: ws, V: [2]float64{-40, 60}, Max: 14,
		Like: clouds.Cloud{B: clouds.Start(1).Within(0.5, 12), Species: []clouds.Species{{Carrier: "Fe II"}, {Carrier: "Mn II", Linear: true}}}}
	show(t, s)
	cen := real(t, "cen-x3/ADP.2021-08-26T17_24_42.172.fits")
	blue := real(t, "cen-x3/ADP.2021-08-26T17_24_42.195.fits")
	ws = nil
	ws = append(ws, piece(t, cen, []atomic.Line{line(t, "Na I 5889.95")}, -50, 45, 60, 7.1, 2))
	ws = append(ws, piece(t, cen, []atomic.Line{line(t, "Na I 5895.92")}, -50, 45, 60, 7.1, 2))
	ws = append(ws, piece(t, blue, []atomic.Line{line(t, "Na I 3302.37"), line(t, "Na I 3302.98")}, -50, 100, 100, 7.3, 2))
	for i := range ws {
		ws[i].Instrument = []string{"red", "red", "blue"}[i]
	}
	s = clouds.Search{Windows: ws, V: [2]float64{-50, 45}, Like: clouds.Cloud{B: clouds.Start(1).Within(0.5, 12), Species: []clouds.Species{{Carrier: "Na I"}}}}
	show(t, s)
	s.Windows = []clouds.Window{piece(t, blue, []atomic.Line{line(t, "Ca II 3933.66")}, -50, 45, 100, 7.3, 3)}
	s.Like.Species[0].Carrier = "Ca II"
	show(t, s)
}

func show(t *testing.T, s clouds.Search) {
	start := time.Now()
	got, err := s.Run()
	if err != nil {
		t.Fatal(err)
	}
	fmt.Println("search took", time.Since(start))
	for _, o := range got.Solutions {
		fmt.Printf("%d clouds %.1f: χ² %.1f, BIC %.1f %s\n", o.Number, o.V, o.Chi2, o.BIC, o.Refused)
	}
	for _, c := range got.Clouds {
		fmt.Printf("v %.2f ± %.2f", c.V.X, c.V.Err())
		for _, s := range c.Species {
			fmt.Printf("  %s b %.2f ± %.2f (%s) logN %.3f ± %.3f (%s) %s τ₀ %.2g", s.Carrier, s.B.X, s.B.Err(), s.B.Kind(), s.LogN.X, s.LogN.Err(), s.LogN.Kind(), s.LogN.Flag, s.Tau0)
		}
		fmt.Println()
	}
	fmt.Printf("χ² %.1f dof %d neff %.0f DW %+.1fσ runs %+.1fσ cond %.2g %s\n", got.Chi2, got.DOF, got.NEff, got.Whiteness.WatsonZ, got.Whiteness.RunsZ, got.Condition, got.Stop)
	for _, w := range got.Windows {
		fmt.Printf("  %s: χ² %.1f of %d, zero %.4f ± %.4f, FWHM %.2f, DW %+.1f runs %+.1f\n", w.Name, w.Chi2, w.Pixels, w.Zero, w.ZeroErr, w.FWHM, w.Whiteness.WatsonZ, w.Whiteness.RunsZ)
	}
	for _, g := range got.Ranges {
		for _, c := range g.Columns {
			fmt.Printf("  ΣN %s %.4g ± %.2g structure %.2g  log %.3f\n", c.Carrier, c.N.X, c.N.Err(), c.N.ErrBy(11), c.LogN.X)
		}
		for _, c := range g.Widths {
			fmt.Printf("  W %s %.2f ± %.2f mÅ structure %.2g\n", c.Line, 1e3*c.W.X, 1e3*c.W.Err(), 1e3*c.W.ErrBy(11))
		}
	}
	fmt.Println(got.Notes)
}
