package measure

import (
	"math"
	"math/rand/v2"
	"testing"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/spectrum"
	"lacuna/spectrum/continuum"
)

// windowed is a piece with a line window of half km/s amid n pixels of dv, and a
// continuum from everything else.
func windowed(t testing.TB, l atomic.Line, wave, flux, err []float64, half float64, o continuum.Options) Piece {
	lo, hi := wavelength(l.Wave, -half), wavelength(l.Wave, half)
	o.Target = [2]float64{lo, hi}
	o.Windows = [][2]float64{{wave[0] - 1, lo}, {hi, wave[len(wave)-1] + 1}}
	return Piece{Line: l, Wave: wave, Flux: flux, Err: err, Continuum: mustFit(t, wave, flux, err, o), Window: [2]float64{-half, half}}
}

// 10,000 spectra without a line: |W| > 3σ in 0.27 % of them (Gaussian tail), a
// line of 3σ is detected in half. ± 0.15 % is 2.9 times the counting error.
func TestNullAndDetection(t *testing.T) {
	r := rand.New(rand.NewPCG(11, 1))
	const trials, n, dv, sn = 10000, 260, 1.5, 50.
	wave, err := velocities(ki, dv, n), constant(1/sn, n)
	known := &continuum.Noise{Ratio: 1}
	flux := make([]float64, n)
	out, found := 0, 0
	for range trials {
		for i := range flux {
			flux[i] = 1 + r.NormFloat64()/sn
		}
		p := windowed(t, ki, wave, flux, err, 20, continuum.Options{Degree: 1, Noise: known})
		w := mustMeasure(t, p)
		s := w.W.Err()
		if math.Abs(w.W.X) > 3*s {
			out++
		}
		if w.W.X+3*s >= 3*s { // the same noise under a line of W = 3σ
			found++
		}
		if w.Detected != (w.W.X >= 3*s) {
			t.Fatal("Detected does not follow W ≥ 3σ")
		}
	}
	if p := 100 * float64(out) / trials; !(math.Abs(p-0.27) <= 0.15) {
		t.Errorf("|W| > 3σ in %.2f %% of spectra without a line, want 0.27 ± 0.15", p)
	} else {
		t.Logf("|W| > 3σ in %.2f %%", p)
	}
	if p := 100 * float64(found) / trials; !(math.Abs(p-50) <= 1.5) { // 3 times the counting error
		t.Errorf("W = 3σ detected in %.1f %%, want 50", p)
	}
}

// The scatter of W over spectra, against the quoted total: 1,000 spectra a case,
// with the noise measured on each of them, for continua of degree 0 to 4 and lines
// of 5 to 50 % of the piece. A scatter from 1,000 trials is good to 2.2 %, so a
// single case may be off by 7 %, the mean of all ten by 3 %.
func TestQuotedErrorIsTheScatter(t *testing.T) {
	const trials, n, sn = 1000, 400, 40.
	sum, cases := 0.0, 0
	for degree := 0; degree <= 4; degree++ {
		for _, part := range []float64{0.05 + 0.15*float64(degree%2), 0.5} {
			r := rand.New(rand.NewPCG(12, uint64(degree)*10+uint64(10*part)))
			wave, err := velocities(nad, 2, n), constant(1.5/sn, n)
			half := part * float64(n) // km/s: 2 km/s pixels
			trans := absorbed(nad, wave, gaussTau(0.4, half/3, 0))
			truth := 0.0
			for i, e := range edges(wave)[1:] {
				truth += (e - edges(wave)[i]) * (1 - trans[i])
			}
			pull, placed := make([]float64, trials), 0
			for k := range pull {
				flux := noisy(r, n, 1, 0.6)
				for i := range flux {
					x := 2*float64(i)/(n-1) - 1
					c := 1 + []float64{0, 0.2 * x, 0.1 * x * x, 0.1 * x * x * x, 0.1 * x * x * x * x}[degree]
					flux[i] = c*trans[i] + flux[i]/sn
				}
				p := windowed(t, nad, wave, flux, err, half, continuum.Options{Degree: degree})
				w := mustMeasure(t, p)
				pull[k] = (w.W.X - truth) / w.W.Err()
				if w.W.ErrBy(budget.Placement) > 0 {
					placed++
				}
			}
			mean, rms := meanRMS(pull)
			t.Logf("degree %d, line %2.0f %%: mean %+.2f, scatter/quoted %.3f, placement error in %d", degree, 100*part, mean, rms, placed)
			sum += rms
			cases++
			if !(math.Abs(rms-1) < 0.09) || !(math.Abs(mean) < 0.15) {
				t.Errorf("degree %d, line %.0f %%: pull %.3f ± %.3f", degree, 100*part, mean, rms)
			}
		}
	}
	if m := sum / float64(cases); !(math.Abs(m-1) < 0.03) {
		t.Errorf("scatter over quoted error, mean of all: %.3f", m)
	} else {
		t.Logf("mean of all: %.3f", m)
	}
}

// White noise resampled linearly to 0.7 of the pixel: the rms of a pixel falls to
// 0.82, sums of 15 pixels scatter by 1.44 times the independent value (both: variance
// of linear interpolation, averaged over phase). The quoted error must follow the
// truth to 3 %, and does not without the correlations.
func TestResampledNoise(t *testing.T) {
	r := rand.New(rand.NewPCG(13, 1))
	const trials, n = 1000, 700
	wave := velocities(ki, 1, n)
	ew, quoted, photon, naive, pix, blocks := make([]float64, trials), 0.0, 0.0, 0.0, 0.0, 0.0
	for k := range ew {
		raw := noisy(r, n, 1)
		flux, err := make([]float64, n), constant(0.01, n)
		phase := r.Float64()
		for i := range flux {
			x := 0.7*float64(i) + phase
			j := int(x)
			f := x - float64(j)
			flux[i] = 1 + 0.01*((1-f)*raw[j]+f*raw[j+1])
		}
		for i := 0; i < n-15; i += 15 {
			sum := 0.0
			for j := range 15 {
				e := (flux[i+j] - 1) / 0.01
				sum += e
				pix += e * e / (46 * 15 * trials)
			}
			blocks += sum * sum / (46 * trials)
		}
		p := windowed(t, ki, wave, flux, err, 30, continuum.Options{Degree: 0})
		w := mustMeasure(t, p)
		ew[k] = w.W.X
		quoted += w.W.Err() * w.W.Err() / trials
		photon += w.W.ErrBy(budget.Photon) * w.W.ErrBy(budget.Photon) / trials
		p.Continuum.Noise.Rho = nil
		q := mustMeasure(t, p).W.Err()
		naive += q * q / trials
	}
	if got := math.Sqrt(pix); !(math.Abs(got-0.82) < 0.01) {
		t.Errorf("rms of a resampled pixel %.3f, want 0.82", got)
	}
	if got := math.Sqrt(blocks / 15 / pix); !(math.Abs(got-1.44) < 0.05) {
		t.Errorf("sums of 15 scatter by %.3f of the independent value, want 1.44", got)
	}
	// Exact: two pixels at a distance d of the raw ones share the cubic B-spline
	// B(d), the autocorrelation of the triangle that linear interpolation is.
	spline := func(d float64) float64 {
		switch d = math.Abs(d); {
		case d < 1:
			return 2./3 - d*d + d*d*d/2
		case d < 2:
			return (2 - d) * (2 - d) * (2 - d) / 6
		}
		return 0
	}
	truth := 0.0
	for i := range 60 {
		for j := range 60 {
			truth += spline(0.7*float64(i-j)) * 1e-4
		}
	}
	near(t, "photon error against the exact one", math.Sqrt(photon), math.Sqrt(truth)*ki.Wave/atomic.C, 0.03)
	_, rms := meanRMS(ew)
	good, bad := math.Sqrt(quoted)/rms, math.Sqrt(naive)/rms
	t.Logf("photon error/exact %.3f; total/scatter %.3f, without correlations %.3f", math.Sqrt(photon/truth)*atomic.C/ki.Wave, good, bad)
	if !(math.Abs(good-1) < 0.03+0.045) { // 3 %, and twice the error of a scatter from 1,000 trials
		t.Errorf("quoted error over scatter %.3f", good)
	}
	if !(bad < 0.8) {
		t.Errorf("without correlations the quoted error is %.3f of the scatter: the test could not fail", bad)
	}
}

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

// A masked pixel in the core: filled, flagged, error larger, hardly biased.
// One core pixel of this line (τ₀ = 2, b = 3 km/s) at 1 km/s holds 14.6 % of W and is
// refused; at 0.5 km/s it holds 7 %.
func TestMaskedCore(t *testing.T) {
	r := rand.New(rand.NewPCG(15, 1))
	const n, trials = 500, 300
	wave, err := velocities(nad, 0.5, n), constant(0.02, n)
	trans := absorbed(nad, wave, gaussTau(2, 3, 0))
	mask := make([]spectrum.Reason, n)
	mask[n/2] = spectrum.BadCosmic
	bias, larger := make([]float64, trials), 0
	for k := range bias {
		flux := noisy(r, n)
		for i := range flux {
			flux[i] = trans[i] + 0.02*flux[i]
		}
		p := windowed(t, nad, wave, flux, err, 15, continuum.Options{Degree: 0, Noise: &continuum.Noise{Ratio: 1}})
		whole := mustMeasure(t, p)
		p.Mask = mask
		p.Flux = append([]float64(nil), flux...)
		p.Flux[n/2] = math.NaN()
		w := mustMeasure(t, p)
		bias[k] = (w.W.X - whole.W.X) / w.W.Err()
		if w.W.Err() > whole.W.Err() {
			larger++
		}
		if !w.W.Is(budget.Filled) || !w.AOD.Is(budget.Filled) || !(w.FillPart > 0.06 && w.FillPart < 0.09) || w.W.ErrBy(budget.Fill) == 0 {
			t.Fatalf("not flagged: %v, part %.3f", w.W.Flag, w.FillPart)
		}
	}
	if mean, _ := meanRMS(bias); !(math.Abs(mean) < 0.3) {
		t.Errorf("masked core pixel moves W by %.2fσ", mean)
	}
	if larger != trials {
		t.Errorf("error larger in %d of %d", larger, trials)
	}
	// a fitted profile fills without bias
	p := Piece{Line: nad, Wave: wave, Flux: append([]float64(nil), trans...), Mask: mask, Fill: trans, Continuum: flat(1, 0, wave, err), Window: [2]float64{-15, 15}}
	p.Flux[n/2] = -7
	q := p
	q.Mask, q.Flux = nil, trans
	near(t, "W with a filled pixel", mustMeasure(t, p).W.X, mustMeasure(t, q).W.X, 1e-12)
	// and a quarter of the width is too much
	for i := n/2 - 2; i < n/2+2; i++ {
		p.Mask[i] = spectrum.BadCosmic
	}
	if _, e := Measure(p); e == nil {
		t.Error("a width of which 28 % are filled in was given")
	}
}

// Pixels in which no count fell belong to a black core: its mean over 1,000 Poisson
// trials at 2 counts is 2.
func TestZeroCountCore(t *testing.T) {
	r := rand.New(rand.NewPCG(16, 1))
	const n, trials = 200, 1000
	wave := velocities(nad, 1, n)
	mean := 0.0
	for range trials {
		flux, sigma, mask := constant(100, n), constant(10, n), make([]spectrum.Reason, n)
		for i := n/2 - 10; i < n/2+10; i++ {
			flux[i] = poisson(r, 2)
			if sigma[i] = math.Sqrt(flux[i]); flux[i] == 0 {
				sigma[i], mask[i] = 1, spectrum.ZeroCount
			}
		}
		w := mustMeasure(t, Piece{Line: nad, Wave: wave, Flux: flux, Mask: mask, Continuum: flat(100, 0, wave, sigma), Window: [2]float64{-10, 10}})
		mean += 100 * (1 - w.W.X/(nad.Wave*20/atomic.C)) / trials
		if w.W.Is(budget.Filled) {
			t.Fatal("a pixel without counts was filled in")
		}
	}
	if !(math.Abs(mean-2) < 0.03) { // 3 × √(2/20,000)
		t.Errorf("mean of the core %.3f counts, want 2", mean)
	}
}

func poisson(r *rand.Rand, mean float64) float64 {
	k, p, l := 0, 1.0, math.Exp(-mean)
	for {
		if p *= r.Float64(); p <= l {
			return float64(k)
		}
		k++
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

// Noise makes the mean of −ln f too large by σ²/2f²: +6 % at τ = 0.1 and S/N 10
// (practice notes, by simulation; the series gives 5.9 %).
func TestAODBias(t *testing.T) {
	r := rand.New(rand.NewPCG(18, 1))
	const n, trials = 101, 4000
	wave, sigma := velocities(nad, 1, n), constant(0.1, n)
	trans := constant(math.Exp(-0.1), n)
	mean, said := 0.0, 0.0
	for range trials {
		flux := noisy(r, n)
		for i := range flux {
			flux[i] = trans[i] + 0.1*flux[i]
		}
		w := mustMeasure(t, Piece{Line: nad, Wave: wave, Flux: flux, Continuum: flat(1, 0, wave, sigma), Window: [2]float64{-40, 40}})
		mean += w.AOD.X / (perTau / (nad.F * nad.Wave) * 80 * 0.1) / trials
		said += w.AODBias / trials
	}
	t.Logf("N_a/N = %.4f, expected bias %.4f", mean, said)
	if !(math.Abs(mean-1.06) < 0.012) || !(math.Abs(said-0.06) < 0.012) {
		t.Errorf("N_a/N = %.4f and expected bias %.4f, want 1.06 and 0.06", mean, said)
	}
}
