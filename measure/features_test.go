package measure

import (
	"encoding/json"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/internal/oops"
	"lacuna/spectrum"
	"lacuna/spectrum/continuum"
)

func TestAutoWindow(t *testing.T) {
	r := rand.New(rand.NewPCG(21, 1))
	const n = 400
	wave, err := velocities(nad, 1, n), constant(0.01, n)
	two := func(v float64) float64 {
		return gaussTau(1.5, 4, -12)(v) + gaussTau(0.3, 3, 6)(v) + gaussTau(0.5, 3, 70)(v)
	}
	trans := absorbed(nad, wave, two)
	truth := 0.0
	for i, e := range edges(wave)[1:] {
		if v := velocity(wave[i], nad.Wave); v > -40 && v < 40 {
			truth += (e - edges(wave)[i]) * (1 - trans[i])
		}
	}
	var pull, lo, hi []float64
	for range 200 {
		flux := noisy(r, n)
		for i := range flux {
			flux[i] = trans[i] + 0.01*flux[i]
		}
		p := windowed(t, nad, wave, flux, err, 100, continuum.Options{Noise: &continuum.Noise{Ratio: 1}})
		p.AutoWindow, p.FWHM, p.Window = true, 8, [2]float64{-60, 60}
		w := mustMeasure(t, p)
		pull = append(pull, (w.W.X-truth)/w.W.Err())
		lo, hi = append(lo, w.Window[0]), append(hi, w.Window[1])
	}
	// Depths fall to 1σ at −12 − 4√ln(1.5/0.01) = −21.0 and 6 + 3√ln 30 = 11.5; three
	// pixels are kept there, and a pixel in six beyond 1σ by chance carries the end on.
	slices.Sort(lo)
	slices.Sort(hi)
	if a, b := lo[100], hi[100]; !(a > -29 && a < -20) || !(b > 11 && b < 20) || lo[0] < -45 || hi[199] > 36 {
		t.Errorf("windows from %.1f (%.1f) to %.1f (%.1f)", a, lo[0], b, hi[199])
	}
	if mean, rms := meanRMS(pull); !(math.Abs(mean) < 0.35) || !(rms < 1.2) {
		t.Errorf("W in the window found is off by %.2f ± %.2f σ", mean, rms)
	}
	p := Piece{Line: nad, Wave: wave, Flux: constant(1, n), Continuum: flat(1, 0, wave, err), Window: [2]float64{-30, 30}, AutoWindow: true}
	if w := mustMeasure(t, p); w.Window != p.Window || !strings.Contains(strings.Join(w.Notes, "\n"), "no line found") {
		t.Errorf("no line, but a window: %v %v", w.Window, w.Notes)
	}
}

// bd+28 4211: Mg I 2026 lies 50 km/s to the red of Zn II 2026; CN R(1) 47 km/s to
// the blue of R(0); the Na I pair at 3302 is 55 km/s apart (practice notes; the
// differences follow from the wavelengths of the table).
func TestNeighbours(t *testing.T) {
	all := atomic.Default().Lines()
	for _, tc := range []struct {
		line   string
		window [2]float64
		gas    [2]float64
		want   string
		at     float64
	}{
		{"Zn II 2026.14", [2]float64{-40, 40}, [2]float64{-25, 10}, "Mg I 2026", 50},
		{"CN R(0)", [2]float64{-50, 45}, [2]float64{-20, 20}, "CN 3873.99", -47},
		{"Na I 3302.37", [2]float64{-50, 45}, [2]float64{-20, 20}, "Na I 3302.98", 55},
	} {
		l := line(t, tc.line)
		list := Neighbours(l, tc.window, Surroundings{Gas: tc.gas, Lines: all})
		k := slices.IndexFunc(list, func(f Feature) bool { return strings.HasPrefix(f.Name, tc.want) })
		if k < 0 {
			t.Errorf("%s: %s is not among %v", tc.line, tc.want, list)
			continue
		}
		if dv := velocity(list[k].Wave, l.Wave); !(math.Abs(dv-tc.at) < 1.5) {
			t.Errorf("%s: %s at %.1f km/s, want %.0f", tc.line, tc.want, dv, tc.at)
		}
		if slices.ContainsFunc(list, func(f Feature) bool { return f.Name == l.Name }) {
			t.Errorf("%s is a neighbour of itself", l.Name)
		}
	}
	// far away gas: nothing
	if l := Neighbours(line(t, "K I 7698.96"), [2]float64{-20, 20}, Surroundings{Gas: [2]float64{-20, 20}, Lines: all}); len(l) != 0 {
		t.Errorf("K I 7699 has neighbours %v", l)
	}
}

func TestNeighboursOfAirAndStar(t *testing.T) {
	s := Surroundings{Gas: [2]float64{-20, 20}, Air: []AirLine{{Name: "H2O 5889.64", Wave: 5891.27}}, AirV: 14, AirKnown: true,
		Stellar: []atomic.StellarLine{{Name: "He I", Wave: 5877.25}}, StarV: 40, StarSeen: true, StarHalf: 100,
		Bands: []atomic.Band{{Name: "narrow", Wave: 5892, FWHM: 1}, {Name: "wide", Wave: 5890, FWHM: 20}}}
	// 5891.27 is −15.9 km/s from D2; moved by +14 it stands at −1.9.
	l := Neighbours(nad, [2]float64{-10, 10}, s)
	by := map[string]Feature{}
	for _, f := range l {
		by[f.Kind+" "+f.Name] = f
	}
	if f, ok := by["telluric H2O 5889.64"]; !ok || !(math.Abs(velocity(f.Wave, nad.Wave)+1.9) < 0.2) {
		t.Errorf("telluric line: %+v", f)
	}
	if _, ok := by["stellar stellar He I"]; ok {
		t.Error("a stellar line 700 km/s away was listed")
	}
	if by["band narrow"].Negligible || !by["band wide"].Negligible {
		t.Errorf("bands: %+v", l)
	}
	s.AirV = -14 // the wrong sign moves the line to −30, out of the window
	if l := Neighbours(nad, [2]float64{-10, 10}, s); slices.ContainsFunc(l, func(f Feature) bool { return f.Kind == "telluric" }) {
		t.Error("the line of the air did not move with the observer")
	}
	s.AirKnown = false
	if l := Neighbours(nad, [2]float64{-10, 10}, s); !slices.ContainsFunc(l, func(f Feature) bool { return f.Kind == "telluric" }) {
		t.Error("with the observer's motion unknown the line may be anywhere")
	}
	s.StarSeen = false
	s.Stellar[0].Wave = 5895
	if l := Neighbours(nad, [2]float64{-10, 10}, s); !slices.ContainsFunc(l, func(f Feature) bool { return f.Kind == "stellar" }) {
		t.Error("stellar line left out")
	}
}

func TestBlendsSetFlags(t *testing.T) {
	const n = 200
	wave, sigma := velocities(nad, 1, n), constant(0.01, n)
	p := Piece{Line: nad, Wave: wave, Flux: absorbed(nad, wave, gaussTau(0.2, 4, 0)), Continuum: flat(1, 0, wave, sigma), Window: [2]float64{-20, 20}}
	f := func(kind string, v, w float64) Feature {
		return Feature{Kind: kind, Name: kind, Wave: wavelength(nad.Wave, v), Range: [2]float64{-5, 5}, W: w}
	}
	for _, tc := range []struct {
		f    Feature
		want budget.Flag
		list int
	}{
		{f("transition", 22, 0), budget.Blended, 1},
		{f("transition", 26, 0), 0, 0},
		{f("transition", 0, 1e-6), 0, 1}, // known to be far below the error
		{f("transition", 0, 0.05), budget.Blended, 1},
		{f("band", -10, 0), budget.Blended, 1},
		{f("telluric", -10, 0), budget.InTelluric, 1},
		{f("stellar", -24, 0), budget.InStellar, 1},
		{Feature{Kind: "transition", Wave: nad.Wave, Negligible: true}, 0, 1},
	} {
		p.Neighbours = []Feature{tc.f}
		w := mustMeasure(t, p)
		got := w.Flag & (budget.Blended | budget.InTelluric | budget.InStellar)
		if got != tc.want || len(w.Blends) != tc.list || w.W.Flag&tc.want != tc.want {
			t.Errorf("%+v: flags %v, %d listed", tc.f, w.Flag.Words(), len(w.Blends))
		}
	}
}

func TestRefusals(t *testing.T) {
	const n = 200
	wave, sigma := velocities(nad, 1, n), constant(0.01, n)
	good := func() Piece {
		return Piece{Line: nad, Wave: wave, Flux: constant(1, n), Continuum: flat(1, 0.01, wave, sigma), Window: [2]float64{-20, 20}}
	}
	for name, f := range map[string]func(p *Piece){
		"outside":        func(p *Piece) { p.Window = [2]float64{80, 130} },
		"far outside":    func(p *Piece) { p.Window = [2]float64{500, 600} },
		"reversed":       func(p *Piece) { p.Window = [2]float64{20, -20} },
		"not a number":   func(p *Piece) { p.Window = [2]float64{math.NaN(), 3} },
		"no f":           func(p *Piece) { p.Line.F = 0 },
		"dark continuum": func(p *Piece) { p.Continuum.Coef = []float64{-1} },
		"zero level":     func(p *Piece) { p.Zero.Level = math.NaN() },
		"all masked": func(p *Piece) {
			p.Mask = make([]spectrum.Reason, n)
			for i := range p.Mask {
				p.Mask[i] = spectrum.BadFile
			}
		},
		"all not finite": func(p *Piece) { p.Flux = constant(math.NaN(), n) },
		"half masked": func(p *Piece) {
			p.Mask = make([]spectrum.Reason, n)
			for i := range n / 2 {
				p.Mask[i] = spectrum.BadUser
			}
		},
	} {
		p := good()
		f(&p)
		w, err := Measure(p)
		if !oops.IsInput(err) {
			t.Errorf("%s: %v, W = %v", name, err, w.W)
		} else if !strings.Contains(err.Error(), nad.Name) {
			t.Errorf("%s: the error does not name the line: %v", name, err)
		}
	}
	one := good()
	one.Continuum.Degree = 1
	one.Continuum.Coef, one.Continuum.Cov = []float64{1, 0}, make([]float64, 4)
	one.Continuum.Pixels = make([]bool, n)
	for i := range 60 {
		one.Continuum.Pixels[i] = true
	}
	if _, err := Measure(one); !oops.IsInput(err) {
		t.Errorf("slope from one side: %v", err)
	}
}

// A record must survive JSON whatever the pixels hold.
func TestWidthAsJSON(t *testing.T) {
	const n = 200
	wave, sigma := velocities(nad, 1, n), constant(0.01, n)
	p := Piece{Line: nad, Wave: wave, Flux: absorbed(nad, wave, gaussTau(3, 8, 0)), Continuum: flat(1, 0.01, wave, sigma), Window: [2]float64{-25, 25}, Mask: make([]spectrum.Reason, n)}
	p.Flux[n/2+20], p.Mask[n/2+20] = math.Inf(1), spectrum.BadFlux
	p.Flux[3] = math.NaN()
	for _, flux := range [][]float64{p.Flux, constant(1, n), constant(1.1, n)} {
		p.Flux = flux
		w := mustMeasure(t, p)
		b, err := json.Marshal(w)
		if err != nil {
			t.Fatal(err)
		}
		var back Width
		if err := json.Unmarshal(b, &back); err != nil {
			t.Fatal(err)
		}
		if back.W.X != w.W.X || back.W.Err() != w.W.Err() || len(back.Profile.V) != len(w.Profile.V) {
			t.Error("changed by JSON")
		}
	}
}

// Lines on one continuum share its error: the error of a sum of widths follows from
// the keys, and equals the one measured over both windows at once.
func TestSharedContinuum(t *testing.T) {
	r := rand.New(rand.NewPCG(22, 1))
	const n = 600
	wave, err := velocities(nad, 1, n), constant(0.01, n)
	flux := noisy(r, n)
	for i := range flux {
		flux[i] = 1 + 0.01*flux[i]
	}
	m := mustFit(t, wave, flux, err, continuum.Options{Degree: 2, Target: [2]float64{wavelength(nad.Wave, -40), wavelength(nad.Wave, 40)}, Noise: &continuum.Noise{Ratio: 1}})
	p := Piece{File: "x", Line: nad, Wave: wave, Flux: flux, Continuum: m}
	part := func(lo, hi float64) Width { p.Window = [2]float64{lo, hi}; return mustMeasure(t, p) }
	a, b, whole := part(-40, 0), part(0, 40), part(-40, 40)
	sum := budget.Combine([]float64{1, 1}, a.W, b.W)
	near(t, "W", sum.X, whole.W.X, 1e-9)
	// One pixel is cut by the border of the windows: its two halves are one noise.
	near(t, "photon", sum.ErrBy(budget.Photon), whole.W.ErrBy(budget.Photon), 0.01)
	near(t, "continuum", sum.ErrBy(budget.Continuum), whole.W.ErrBy(budget.Continuum), 1e-9)
	if apart := math.Hypot(a.W.ErrBy(budget.Continuum), b.W.ErrBy(budget.Continuum)); !(whole.W.ErrBy(budget.Continuum) > 1.2*apart) {
		t.Error("the two halves hardly share the continuum: the test says nothing")
	}
}

// At low S/N pixels are averaged to half a resolution element before the logarithm.
func TestAODBins(t *testing.T) {
	r := rand.New(rand.NewPCG(23, 1))
	const n = 200
	wave := velocities(nad, 1, n)
	trans := absorbed(nad, wave, gaussTau(0.8, 8, 0))
	for _, tc := range []struct {
		sn   float64
		fwhm float64
		bin  int
	}{{200, 7, 1}, {12, 7, 4}, {12, 0, 1}} {
		flux := noisy(r, n)
		for i := range flux {
			flux[i] = trans[i] + flux[i]/tc.sn
		}
		p := Piece{Line: nad, Wave: wave, Flux: flux, Continuum: flat(1, 0, wave, constant(1/tc.sn, n)), Window: [2]float64{-25, 25}, FWHM: tc.fwhm}
		w := mustMeasure(t, p)
		if w.Bin != tc.bin {
			t.Errorf("S/N %g, FWHM %g: bins of %d pixels, want %d", tc.sn, tc.fwhm, w.Bin, tc.bin)
		}
		if truth := perTau / (nad.F * nad.Wave) * math.Sqrt(math.Pi) * 8 * 0.8; !(math.Abs(w.AOD.X-truth) < 4*w.AOD.Err()) {
			t.Errorf("S/N %g: N_a = %.3g ± %.2g, want %.3g", tc.sn, w.AOD.X, w.AOD.Err(), truth)
		}
	}
}
