package measure

import (
	"math"
	"math/rand/v2"
	"testing"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/spectrum/continuum"
)

// The limit formula: 26 pixels of 0.0139 Å at S/N 100 on K I 7699 give 3 × 0.0139 ×
// √26/100 Å = 2.13 mÅ and N < 1.22e10 (practice notes; the same by hand).
func TestLimitFormula(t *testing.T) {
	const n = 400
	wave, sigma := make([]float64, n), constant(0.01, n)
	for i := range wave {
		wave[i] = ki.Wave + 0.0139*(float64(i)-199.5)
	}
	width := velocity(ki.Wave+26*0.0139, ki.Wave)
	p := Piece{Line: ki, Wave: wave, Flux: constant(1, n), Window: [2]float64{-20, 20}, LimitWidth: width, Continuum: flat(1, 0, wave, sigma)}
	w := mustMeasure(t, p)
	near(t, "limit", 1e3*w.Limit, 2.13, 0.002)
	near(t, "N", w.Linear.X, 1.22e10, 0.004)
	if w.Detected || !w.Linear.Is(budget.Upper) || w.Linear.Conf != 3 || w.Linear.Behind == nil || !math.IsNaN(w.AOD.X) {
		t.Errorf("not a limit: %+v", w.Linear)
	}
	if w.LimitB != 2 {
		t.Errorf("b = %g assumed for an atom", w.LimitB)
	}
	// Twice the observed width by default: FWHM 6 with b = 2 is √(36 + 11.09) = 6.862.
	p.LimitWidth, p.FWHM = 0, 6
	near(t, "default width", mustMeasure(t, p).LimitWidth, 13.724, 1e-4)
	p.LimitSigma = 2
	two := mustMeasure(t, p)
	p.LimitSigma = 3
	near(t, "2σ", two.Limit/mustMeasure(t, p).Limit, 2./3, 1e-12)
}

// Shifting a window by 0.3 pixel changes W by less than 0.1σ, since pixels at its
// ends count in part.
func TestPartialPixels(t *testing.T) {
	r := rand.New(rand.NewPCG(14, 1))
	const n = 300
	wave, err := velocities(nad, 1.7, n), constant(0.02, n)
	worst := 0.0
	for range 200 {
		flux := absorbed(nad, wave, gaussTau(0.8, 5, 0))
		for i, e := range noisy(r, n) {
			flux[i] += 0.02 * e
		}
		p := windowed(t, nad, wave, flux, err, 40, continuum.Options{Degree: 1, Noise: &continuum.Noise{Ratio: 1}})
		a := mustMeasure(t, p)
		p.Window = [2]float64{-40 + 0.3*1.7, 40 + 0.3*1.7}
		b := mustMeasure(t, p)
		worst = max(worst, math.Abs(a.W.X-b.W.X)/a.W.Err())
	}
	// Two ends of 0.3 pixel with noise of one pixel: √2·0.3/√47 = 0.06σ typical, and
	// 0.2 at the worst of 200.
	if !(worst < 0.25) {
		t.Errorf("W moved by %.2fσ", worst)
	}
	flux := absorbed(nad, wave, gaussTau(0.8, 5, 0)) // without noise it hardly moves
	p := Piece{Line: nad, Wave: wave, Flux: flux, Continuum: flat(1, 0, wave, err), Window: [2]float64{-40, 40}}
	a := mustMeasure(t, p)
	for _, d := range []float64{0.1, 0.3, 0.5, 0.77} {
		p.Window = [2]float64{-40 + d*1.7, 40 + d*1.7}
		if b := mustMeasure(t, p); !(math.Abs(a.W.X-b.W.X) < 1e-9) {
			t.Errorf("shift of %g pixel changes W by %g Å", d, a.W.X-b.W.X)
		}
	}
}

// Two exact symmetries and one statistical one: scaling the flux; shifting the
// wavelengths; adding pixels in pairs.
func TestSymmetries(t *testing.T) {
	r := rand.New(rand.NewPCG(17, 1))
	const n = 400
	wave, flux, err := velocities(nad, 1, n), absorbed(nad, velocities(nad, 1, n), gaussTau(1, 4, 2)), constant(0.01, n)
	for i, e := range noisy(r, n) {
		flux[i] += 0.01 * e
	}
	known := continuum.Options{Degree: 1, Noise: &continuum.Noise{Ratio: 1}}
	a := mustMeasure(t, windowed(t, nad, wave, flux, err, 25, known))
	scale := func(x []float64, k float64) []float64 {
		y := make([]float64, len(x))
		for i := range x {
			y[i] = k * x[i]
		}
		return y
	}
	b := mustMeasure(t, windowed(t, nad, wave, scale(flux, 1e-16), scale(err, 1e-16), 25, known))
	for name, v := range map[string][2]float64{"W": {a.W.X, b.W.X}, "σ": {a.W.Err(), b.W.Err()}, "N_a": {a.AOD.X, b.AOD.X}, "v": {a.V.X, b.V.X}, "S/N": {a.SNPixel, b.SNPixel}} {
		near(t, "flux × 1e-16: "+name, v[1], v[0], 1e-12)
	}
	const shift = 30.
	p := windowed(t, nad, wave, flux, err, 25, known)
	p.Wave = scale(wave, 1+shift/atomic.C)
	o := known
	k := 1 + shift/atomic.C
	lo, hi := wavelength(nad.Wave, -25)*k, wavelength(nad.Wave, 25)*k
	o.Target = [2]float64{lo, hi}
	o.Windows = [][2]float64{{p.Wave[0] - 1, lo}, {hi, p.Wave[n-1] + 1}}
	p.Continuum = mustFit(t, p.Wave, flux, err, o)
	p.Window = [2]float64{velocity(lo, nad.Wave), velocity(hi, nad.Wave)}
	c := mustMeasure(t, p)
	near(t, "shifted: W/λ", c.W.X/k, a.W.X, 1e-9)
	near(t, "shifted: v", c.V.X, (1+a.V.X/atomic.C)*k*atomic.C-atomic.C, 1e-7)
	near(t, "shifted: N_a", c.AOD.X/k, a.AOD.X, 1e-9)

	w2, f2 := make([]float64, n/2), make([]float64, n/2)
	for i := range w2 {
		w2[i], f2[i] = (wave[2*i]+wave[2*i+1])/2, (flux[2*i]+flux[2*i+1])/2
	}
	whole := func(w []float64, f []float64, s float64) Width {
		return mustMeasure(t, Piece{Line: nad, Wave: w, Flux: f, Continuum: flat(1, 0, w, constant(s, len(w))), Window: [2]float64{-40, 40}})
	}
	one, two := whole(wave, flux, 0.01), whole(w2, f2, 0.01/math.Sqrt2)
	near(t, "pairs: W", two.W.X, one.W.X, 1e-9)
	near(t, "pairs: σ_W", two.W.Err(), one.W.Err(), 1e-3) // one pixel in 80 is cut at the window's ends
	if !(two.AOD.X < one.AOD.X) {
		t.Errorf("pairs: N_a %g is not below %g", two.AOD.X, one.AOD.X)
	}
}

// Light z added to all of the spectrum: W_observed = W/(1+z) exactly, and the largest
// apparent optical depth is ln((1+z)/z), 3.93 at 2 %. With the zero level given, both
// come back.
func TestZeroOffset(t *testing.T) {
	const n, z = 300, 0.02
	wave, sigma := velocities(nad, 1, n), constant(0.001, n)
	trans := absorbed(nad, wave, gaussTau(100, 5, 0))
	flux := make([]float64, n)
	for i := range flux {
		flux[i] = (trans[i] + z) / (1 + z)
	}
	p := Piece{Line: nad, Wave: wave, Flux: trans, Continuum: flat(1, 0, wave, sigma), Window: [2]float64{-40, 40}}
	true_ := mustMeasure(t, p)
	p.Flux = flux
	seen := mustMeasure(t, p)
	near(t, "W with added light", seen.W.X, true_.W.X/(1+z), 1e-12)
	near(t, "largest τ_a", seen.TauPeak, math.Log((1+z)/z), 1e-6)
	near(t, "the same", math.Log((1+z)/z), 3.93, 1e-3)
	p.Zero = Zero{Level: z, Err: 0.005, By: "user"}
	back := mustMeasure(t, p)
	near(t, "W with the zero level", back.W.X, true_.W.X, 1e-12)
	// its error, by measuring again with z + σ_z
	p.Zero.Level += 0.005
	up := mustMeasure(t, p)
	near(t, "error by the zero level", back.W.ErrBy(budget.ZeroLevel), math.Abs(up.W.X-back.W.X), 1e-9)
	if back.Saturated == "" || !back.AOD.Is(budget.Lower) || back.Floored == 0 {
		t.Error("a black line does not count as saturated")
	}
}

// A weak line: the linear column is exact for τ₀ → 0, and with the correction close at
// τ₀ = 0.3.
func TestWeakLine(t *testing.T) {
	const n, b = 400, 3.
	wave, sigma := velocities(ki, 0.25, n), constant(1e-5, n)
	for _, tau := range []float64{1e-3, 0.1, 0.25} {
		want := perTau / (ki.F * ki.Wave) * math.Sqrt(math.Pi) * b * tau // ∫ N_a dv of the true optical depth
		w := mustMeasure(t, Piece{Line: ki, Wave: wave, Flux: absorbed(ki, wave, gaussTau(tau, b, 0)), Continuum: flat(1, 0, wave, sigma), Window: [2]float64{-20, 20}, B: 1})
		if w.Linear.Kind() != "value" {
			t.Errorf("τ₀ = %g: %s", tau, w.Linear.Kind())
		}
		near(t, "weak-line N", w.Linear.X, want, 2e-3)
		near(t, "without correction", w.Linear.X/math.Pow(10, w.Correction)/want, growth(tau)/(math.Sqrt(math.Pi)*tau), 1e-4)
		near(t, "N_a", w.AOD.X, want, 1e-3) // pixels of 0.25 km/s average the flux, not τ
		near(t, "b_a", w.AODB.X, b, 5e-3)
		if e := w.Linear.X * ki.FErr / ki.F; !(math.Abs(w.Linear.ErrBy(budget.FValue)-e) < 1e-9*e) {
			t.Error("no error of the oscillator strength")
		}
	}
	near(t, "constant", perWidth, 1.12958e20, 5e-6)
	near(t, "constant of N_a", old*perTau, 3.76788494e14, 1e-8) // checks/README.md
	w := mustMeasure(t, Piece{Line: ki, Wave: wave, Flux: absorbed(ki, wave, gaussTau(0.5, b, 0)), Continuum: flat(1, 0, wave, sigma), Window: [2]float64{-20, 20}, B: 1})
	if w.Linear.Kind() != "lower" || !w.Linear.Is(budget.Saturated) {
		t.Errorf("τ₀ = 0.5 gives %s", w.Linear.Kind())
	}
}

// A line of 4.5σ over twice the resolution, away from the middle of a window six times
// as wide, drowns in the noise of the window; no limit may lie below its width.
// (Flux without noise, so that the wanted numbers are arithmetic: n pixels of error s
// give σ = Δλ s √n.)
func TestWideWindowDrownsNoLine(t *testing.T) {
	const n, s = 600, 0.01
	wave, sigma := make([]float64, n), constant(s, n)
	for i := range wave {
		wave[i] = ki.Wave + 0.0139*(float64(i)-299.5)
	}
	pixel := velocity(ki.Wave+0.0139, ki.Wave)
	flux := constant(1, n)
	const pixels = 26 // of the limit
	first := 240      // of the line: 5 pixels with 4.5σ of the limit's range in all, 1.8σ of the window's
	depth := 4.5 * s * math.Sqrt(pixels) / 5
	for i := range 5 {
		flux[first+i] -= depth
	}
	p := Piece{Line: ki, Wave: wave, Flux: flux, Window: [2]float64{-78 * pixel, 78 * pixel}, LimitWidth: pixels * pixel, Continuum: flat(1, 0, wave, sigma)}
	w := mustMeasure(t, p)
	sig := 0.0139 * s * math.Sqrt(pixels)
	if w.Detected || w.Inside == nil || !w.Inside.Detected {
		t.Fatalf("detected %v over the window (W = %.2g ± %.2g Å), inside %+v", w.Detected, w.W.X, w.W.Err(), w.Inside)
	}
	near(t, "W inside", w.Inside.W, 4.5*sig, 1e-9)
	near(t, "limit", w.Limit, 6.5*sig, 1e-6)
	if v := velocity(wave[first+2], ki.Wave); !(v > w.Inside.Window[0] && v < w.Inside.Window[1]) {
		t.Errorf("found between %g and %g km/s, it is at %g", w.Inside.Window[0], w.Inside.Window[1], v)
	}
	// Nothing there: the limit is 3σ over its own range.
	p.Flux = constant(1, n)
	w = mustMeasure(t, p)
	if near(t, "limit of nothing", w.Limit, 3*sig, 1e-6); w.Inside != nil {
		t.Errorf("inside nothing: %+v", w.Inside)
	}
}

// Of n numbers one exceeds oneOf(2, n) as rarely as one alone exceeds 2: the
// one-sided chances are 0.02275 and 0.02275/n (tables of the normal distribution:
// 2.6686 for 0.0038, 0.02275/6).
func TestOneOf(t *testing.T) {
	near(t, "one", oneOf(2, 1), 2, 1e-12)
	near(t, "six", oneOf(2, 6), 2.669, 1e-3)
}
