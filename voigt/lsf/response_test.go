package lsf_test

import (
	"fmt"
	"math"
	"slices"
	"testing"

	"lacuna/atomic"
	"lacuna/internal/check"
	"lacuna/internal/oops"
	"lacuna/voigt"
	"lacuna/voigt/lsf"
)

// pixels returns n pixel centres from wave on, growing slowly wider.
func pixels(wave, step float64, n int) []float64 {
	w := make([]float64, n)
	for i := range w {
		x := float64(i)
		w[i] = wave + step*(x+1e-4*x*x)
	}
	return w
}

func must(r lsf.Response, err error) lsf.Response {
	if err != nil {
		panic(err)
	}
	return r
}

// transmission is exp(−τ) of one cloud on the sub-grid.
func transmission(r lsf.Response, l atomic.Line, clouds ...voigt.Cloud) []float64 {
	t := make([]float64, len(r.Sub))
	for _, c := range clouds {
		voigt.AddTau(t, r.Sub, l, c)
	}
	for j, x := range t {
		t[j] = math.Exp(-x)
	}
	return t
}

// A Gaussian dip of the transmission has a closed form: variances add, and the
// pixel box leaves a difference of error integrals.
func TestGaussianDip(t *testing.T) {
	const centre, depth, sigma = 4000.03, 0.8, 0.02
	wave := pixels(3999.5, 0.017, 60)
	edges := lsf.Edges(wave)
	for _, fwhm := range []float64{0.01, 0.05, 0.2} {
		// σ of the dip as the Doppler parameter: b = √2 σ c/λ
		r := must(lsf.Gaussian(edges, lsf.Constant(fwhm), math.Sqrt2*sigma*atomic.C/centre, 4))
		dip := make([]float64, len(r.Sub))
		for j, w := range r.Sub {
			x := (w - centre) / sigma
			dip[j] = 1 - depth*math.Exp(-x*x/2)
		}
		got := make([]float64, len(wave))
		r.Apply(got, dip)
		total := math.Hypot(sigma, fwhm/math.Sqrt(8*math.Ln2))
		for i := range wave {
			box := 0.5 * (math.Erf((edges[i+1]-centre)/(total*math.Sqrt2)) - math.Erf((edges[i]-centre)/(total*math.Sqrt2)))
			want := 1 - depth*sigma*math.Sqrt(2*math.Pi)*box/(edges[i+1]-edges[i])
			// The sum over the sub-grid is exact to 1e-14; each tail cut at 7 σ holds 1.3e-12
			// of the light, and the row is scaled up for both.
			if d := math.Abs(got[i] - want); !(d <= 5e-12) {
				t.Errorf("FWHM %g, pixel %d: %.15f, want %.15f, off by %.1e", fwhm, i, got[i], want, d)
			}
		}
	}
}

// profiles of every kind, for properties that must hold for all.
func profiles(t *testing.T) map[string]lsf.Profile {
	return map[string]lsf.Profile{
		"Gaussian":     lsf.Sum{{Weight: 1, FWHM: lsf.Constant(0.07)}},
		"R = 80000":    lsf.Sum{{Weight: 1, FWHM: lsf.Resolution(80000)}},
		"core + wings": lsf.Sum{{Weight: 0.8, FWHM: lsf.Velocity(3)}, {Weight: 0.2, FWHM: lsf.Constant(0.2)}},
		"tabulated":    sampled(t, 0.07, 0.005, lsf.Angstrom),
	}
}

// Convolution keeps the equivalent width: Σ (1 − F) Δλ = ∫ (1 − T) dλ to 1e-10 of
// itself, with uneven pixels and for any line spread function.
func TestWidthIsConserved(t *testing.T) {
	line := atomic.Line{Wave: 5891.5833, F: 0.6408} // undamped: no wings beyond the window
	cloud := voigt.Cloud{V: 4, B: 1.3, LogN: 12.4}
	wave := pixels(5889, 0.031, 170)
	edges := lsf.Edges(wave)
	for name, p := range profiles(t) {
		r := must(lsf.New(edges, p, cloud.B, 4))
		tr := transmission(r, line, cloud)
		f := make([]float64, len(wave))
		r.Apply(f, tr)
		got, want := 0.0, 0.0
		for i := range f {
			got += (1 - f[i]) * (edges[i+1] - edges[i])
		}
		step := math.Log(r.Sub[len(r.Sub)-1]/r.Sub[0]) / float64(len(r.Sub)-1)
		for j, w := range r.Sub {
			want += (1 - tr[j]) * w * step
		}
		d := math.Abs(got/want - 1)
		t.Logf("%-13s W = %.4f mÅ, off by %.1e", name, got*1e3, d)
		if !(d <= 1e-10) {
			t.Errorf("%s: W = %.14g Å, want %.14g, off by %.1e", name, got, want, d)
		}
	}
}

// A shifted component moves the line's centre of gravity by its part of the light.
func TestShiftedComponent(t *testing.T) {
	line, cloud := atomic.Line{Wave: 5891.5833, F: 0.6408}, voigt.Cloud{V: 0, B: 1.3, LogN: 11}
	wave := pixels(5890, 0.01, 320)
	edges := lsf.Edges(wave)
	p := lsf.Sum{{Weight: 0.8, FWHM: lsf.Velocity(3)}, {Weight: 0.2, FWHM: lsf.Velocity(9), Shift: 1.5}}
	r := must(lsf.New(edges, p, cloud.B, 4))
	f := make([]float64, len(wave))
	r.Apply(f, transmission(r, line, cloud))
	sum, first := 0.0, 0.0
	for i := range f {
		d := (1 - f[i]) * (edges[i+1] - edges[i])
		sum += d
		first += d * ((edges[i]+edges[i+1])/2/line.Wave - 1) * atomic.C
	}
	if v := first / sum; !(math.Abs(v-0.3) <= 1e-4) { // 0.2 × 1.5 km/s; widths that grow with λ skew by σ²/c = 5e-5
		t.Errorf("centre of gravity at %.7f km/s, want 0.3", v)
	}
}

// Without absorption the flux is 1.
func TestRowsAddUpToOne(t *testing.T) {
	wave := pixels(5889, 0.031, 50)
	for name, p := range profiles(t) {
		r := must(lsf.New(lsf.Edges(wave), p, 2, 4))
		ones, f := slices.Repeat([]float64{1}, len(r.Sub)), make([]float64, len(wave))
		r.Apply(f, ones)
		for i := range f {
			if d := math.Abs(f[i] - 1); !(d <= 1e-14) { // a hundred roundings of weights of 1/100
				t.Errorf("%s: pixel %d is %.16f", name, i, f[i])
			}
		}
	}
}

// Halving the step of the sub-grid: what New says of q. The numbers allowed are
// those of its comment; the reference is eight times finer than the finest tested.
func TestHalvingTheStep(t *testing.T) {
	const sigma = 0.03
	wave := pixels(4999, 1.2*sigma, 70)
	edges := lsf.Edges(wave)
	worst := map[[2]float64]float64{}
	for _, ratio := range []float64{0.25, 0.5, 1, 2} { // σ/b
		b := sigma / ratio * atomic.C / 5000
		for _, tau0 := range []float64{0.1, 3, 100, 1e4} {
			line := atomic.Line{Wave: 5000, F: 1, Gamma: 1e-3 * b * 4 * math.Pi / (1e-13 * 5000)} // a = 1e-3
			cloud := voigt.Cloud{B: b, LogN: math.Log10(tau0 / voigt.Tau0(1, 1, 5000, b))}
			flux := func(q, v float64) []float64 {
				cloud.V = v
				r := must(lsf.Gaussian(edges, lsf.Constant(sigma*math.Sqrt(8*math.Ln2)), b, q))
				f := make([]float64, len(wave))
				r.Apply(f, transmission(r, line, cloud))
				return f
			}
			for _, v := range []float64{0, 0.13, 0.29, 0.41} { // phases of the grid
				fine := flux(48, v)
				for _, q := range []float64{4, 6} {
					for i, f := range flux(q, v) {
						worst[[2]float64{q, tau0}] = max(worst[[2]float64{q, tau0}], math.Abs(f-fine[i]))
					}
				}
			}
		}
	}
	for _, tc := range []struct{ q, tau0, tol float64 }{
		{4, 0.1, 1e-11}, {4, 3, 1e-10}, {4, 100, 1e-5}, // 1e-11: the tails cut at 7 σ
		{6, 3, 1e-11}, {6, 100, 2e-8}, {6, 1e4, 4e-6},
	} {
		got := worst[[2]float64{tc.q, tc.tau0}]
		t.Logf("q = %g, τ₀ = %g: %.1e", tc.q, tc.tau0, got)
		if !(got <= tc.tol) {
			t.Errorf("q = %g, τ₀ = %g: flux off by %.1e, allowed %.0e", tc.q, tc.tau0, got, tc.tol)
		}
	}
}

// pointFlux is the flux at one wavelength without pixel box: a pixel of width
// narrow times the FWHM.
func pointFlux(line atomic.Line, clouds []voigt.Cloud, wave, fwhm, narrow, q float64) float64 {
	b := math.Inf(1)
	for _, c := range clouds {
		b = min(b, c.B)
	}
	h := narrow * fwhm / 2
	r := must(lsf.Gaussian([]float64{wave - h, wave + h}, lsf.Constant(fwhm), b, q))
	var f [1]float64
	r.Apply(f[:], transmission(r, line, clouds...))
	return f[0]
}

// The invented sightlines of the checks, seen through a Gaussian of constant
// velocity width (numpy, 12 digits; their README allows 1e-10). They have no pixel
// box: a pixel 1e-5 of the FWHM wide leaves 1e-11. Their constants are those of
// CODATA 2018.
func TestSyntheticProfiles(t *testing.T) {
	lines := map[string]atomic.Line{}
	for _, r := range check.CSV(t, check.Shared(t, "checks/synthetic_lines.csv")) {
		lines[r["sightline"]+r["line"]] = atomic.Line{Wave: check.F(t, r, "lambda_vac_A"), Gamma: check.F(t, r, "gamma_s"),
			F: check.F(t, r, "f") * 0.026540088560 / (math.Pi * atomic.ElectronRadius * atomic.C * 1e5)}
	}
	clouds := map[string][]voigt.Cloud{}
	for _, r := range check.CSV(t, check.Shared(t, "checks/synthetic_components.csv")) {
		clouds[r["sightline"]] = append(clouds[r["sightline"]], voigt.Cloud{
			V: check.F(t, r, "v_kms"), B: check.F(t, r, "b_kms"), LogN: math.Log10(check.F(t, r, "N_cm2"))})
	}
	worst := 0.0
	for _, r := range check.CSV(t, check.Shared(t, "checks/synthetic_profiles.csv")) {
		l := lines[r["sightline"]+r["line"]]
		wave := l.Wave * (1 + check.F(t, r, "v_kms")/atomic.C)
		fwhm := check.F(t, r, "fwhm_lsf_kms") * l.Wave / atomic.C
		d := math.Abs(pointFlux(l, clouds[r["sightline"]], wave, fwhm, 1e-5, 6) - check.F(t, r, "I_convolved"))
		worst = max(worst, d)
		if !(d <= 1e-10) {
			t.Errorf("%s: flux off by %.1e", r["id"], d)
		}
	}
	t.Logf("largest difference %.1e", worst)
}

// Apparent optical depth of one Gaussian cloud through a Gaussian instrument, after
// Savage & Sembach 1991; numbers of the checks, 1e-6 dex as their README says.
func TestApparentOpticalDepth(t *testing.T) {
	n := 0
	for _, r := range check.CSV(t, check.Shared(t, "checks/aod_saturation.csv")) {
		if r["model"] != "gaussian_component_gaussian_lsf" || check.F(t, r, "tau_a_peak_strong") > 8 {
			continue // deeper, F itself would have to be good to 1e-12
		}
		n++
		const b, wave = 2.0, 5000.0
		line := atomic.Line{Wave: wave, F: 1}
		fwhm := check.F(t, r, "fwhm_over_b") * b * wave / atomic.C
		for _, c := range []struct{ ratio, peak, corr float64 }{
			{1, check.F(t, r, "tau_a_peak_weak"), check.F(t, r, "corr_weak")},
			{check.F(t, r, "fl_ratio"), check.F(t, r, "tau_a_peak_strong"), check.F(t, r, "corr_strong")},
		} {
			tau0 := check.F(t, r, "tau0_weak") * c.ratio
			cloud := []voigt.Cloud{{B: b, LogN: math.Log10(tau0 / voigt.Tau0(1, 1, wave, b))}}
			tauA := func(v float64) float64 {
				return -math.Log(pointFlux(line, cloud, wave*(1+v/atomic.C), fwhm, 1e-3, 6))
			}
			// ∫ τ_a dv by a sum with step b/10, both halves alike; smooth and zero at the end
			end := 6 * math.Hypot(b, fwhm*atomic.C/wave)
			sum := 0.5 * tauA(0)
			for v := 0.1 * b; v < end; v += 0.1 * b {
				sum += tauA(v)
			}
			corr := math.Log10(tau0 * b * math.Sqrt(math.Pi) / (2 * sum * 0.1 * b))
			if d := math.Abs(corr - c.corr); !(d <= 1e-6) {
				t.Errorf("%s: log N − log N_a = %.9f, want %.9f", r["id"], corr, c.corr)
			}
			if d := math.Abs(tauA(0)/c.peak - 1); !(d <= 1e-6) {
				t.Errorf("%s: central τ_a = %.9f, want %.9f", r["id"], tauA(0), c.peak)
			}
		}
	}
	if n < 20 {
		t.Errorf("only %d rows compared", n)
	}
}

func TestEdges(t *testing.T) {
	got := lsf.Edges([]float64{10, 11, 13})
	if want := []float64{9.5, 10.5, 12, 14}; !slices.Equal(got, want) {
		t.Errorf("edges %v, want %v", got, want)
	}
	if lsf.Edges(nil) != nil {
		t.Error("no pixels, but edges")
	}
	if e := lsf.Edges([]float64{5}); len(e) != 2 || !math.IsNaN(e[0]) {
		t.Errorf("one pixel has edges %v", e)
	}
}

func TestApplyWithin(t *testing.T) {
	wave := pixels(5889, 0.031, 120)
	r := must(lsf.Gaussian(lsf.Edges(wave), lsf.Constant(0.08), 1, 4))
	n := len(r.Sub)
	for _, span := range [][2]int{{0, n}, {n / 3, n / 2}, {0, 3}, {n - 2, n}, {40, 40}, {n / 2, n/2 + 1}} {
		part := make([]float64, n)
		full := make([]float64, n)
		for j := range part {
			part[j] = math.Sin(float64(j)) // junk outside the span
			if j >= span[0] && j < span[1] {
				full[j] = part[j]
			}
		}
		got, want := slices.Repeat([]float64{9}, len(wave)), make([]float64, len(wave))
		first, last := r.ApplyWithin(got, part, span[0], span[1])
		r.Apply(want, full)
		for i := range got {
			if d := math.Abs(got[i] - want[i]); !(d <= 1e-15) { // the dot product groups otherwise
				t.Errorf("span %v, pixel %d: %g, want %g", span, i, got[i], want[i])
			}
			if want[i] != 0 && (i < first || i >= last) {
				t.Errorf("span %v: pixel %d is outside the range %d–%d reported", span, i, first, last)
			}
		}
	}
	f, tr := make([]float64, len(wave)), make([]float64, n)
	if a := testing.AllocsPerRun(10, func() { r.Apply(f, tr); r.ApplyWithin(f, tr, 100, 200) }); a != 0 {
		t.Errorf("%g allocations", a)
	}
}

// A pixel draws on light from outside a wavelength range as far as the profile
// reaches: half of it at a pixel centred on the end.
func TestOutside(t *testing.T) {
	wave := pixels(5000, 0.01, 201)
	r := must(lsf.Gaussian(lsf.Edges(wave), lsf.Constant(0.05), 0.5, 4))
	lo, hi := wave[20], wave[180]
	flag := r.Outside(lo, hi, 0.01)
	reach := 2.326*0.05/math.Sqrt(8*math.Ln2) + 0.01 // 1 % of a Gaussian lies beyond 2.326 σ; a pixel of grace
	for i, w := range wave {
		switch {
		case (w < lo || w > hi) && !flag[i]:
			t.Errorf("pixel at %.3f Å, outside, is not flagged", w)
		case w > lo+reach && w < hi-reach && flag[i]:
			t.Errorf("pixel at %.3f Å, %.3f Å inside, is flagged", w, min(w-lo, hi-w))
		}
	}
	if !flag[21] || !flag[179] || flag[100] {
		t.Error("flags at 21, 100, 179:", flag[21], flag[100], flag[179])
	}
}

func TestNewRefuses(t *testing.T) {
	edges := []float64{5000, 5000.1, 5000.2}
	ok := lsf.Constant(0.1)
	for name, f := range map[string]func() (lsf.Response, error){
		"no pixel":          func() (lsf.Response, error) { return lsf.Gaussian(edges[:1], ok, 1, 4) },
		"edges descend":     func() (lsf.Response, error) { return lsf.Gaussian([]float64{5, 4}, ok, 1, 4) },
		"edge NaN":          func() (lsf.Response, error) { return lsf.Gaussian([]float64{5, math.NaN()}, ok, 1, 4) },
		"edge negative":     func() (lsf.Response, error) { return lsf.Gaussian([]float64{-5, 4}, ok, 1, 4) },
		"edge infinite":     func() (lsf.Response, error) { return lsf.Gaussian([]float64{5, math.Inf(1)}, ok, 1, 4) },
		"b zero":            func() (lsf.Response, error) { return lsf.Gaussian(edges, ok, 0, 4) },
		"b NaN":             func() (lsf.Response, error) { return lsf.Gaussian(edges, ok, math.NaN(), 4) },
		"b absurd":          func() (lsf.Response, error) { return lsf.Gaussian(edges, ok, 1e-9, 4) },
		"q":                 func() (lsf.Response, error) { return lsf.Gaussian(edges, ok, 1, 0.5) },
		"FWHM zero":         func() (lsf.Response, error) { return lsf.Gaussian(edges, lsf.Constant(0), 1, 4) },
		"FWHM NaN":          func() (lsf.Response, error) { return lsf.Gaussian(edges, lsf.Constant(math.NaN()), 1, 4) },
		"FWHM beyond λ":     func() (lsf.Response, error) { return lsf.Gaussian(edges, lsf.Constant(6000), 1, 4) },
		"reaches below 0 Å": func() (lsf.Response, error) { return lsf.Gaussian(edges, lsf.Constant(3000), 1, 4) },
		"no component":      func() (lsf.Response, error) { return lsf.New(edges, lsf.Sum{}, 1, 4) },
		"weights": func() (lsf.Response, error) {
			return lsf.New(edges, lsf.Sum{{Weight: 0.5, FWHM: ok}, {Weight: 0.4, FWHM: ok}}, 1, 4)
		},
		"weight negative": func() (lsf.Response, error) {
			return lsf.New(edges, lsf.Sum{{Weight: 1, FWHM: ok}, {Weight: -0.4, FWHM: ok}}, 1, 4)
		},
		"shift NaN": func() (lsf.Response, error) {
			return lsf.New(edges, lsf.Sum{{Weight: 1, FWHM: ok, Shift: math.NaN()}}, 1, 4)
		},
		"width runs wild": func() (lsf.Response, error) {
			return lsf.Gaussian(edges, func(w float64) float64 { return 0.1 + 0.9*math.Abs(w-5000.1) }, 1, 4)
		},
	} {
		if _, err := f(); err == nil || !oops.IsInput(err) {
			t.Errorf("%s: error %v", name, err)
		}
	}
}

func ExampleGaussian() {
	// Five pixels of 0.03 Å at resolution 80,000, and a sharp line in the middle one.
	wave := []float64{4000, 4000.03, 4000.06, 4000.09, 4000.12}
	r, err := lsf.Gaussian(lsf.Edges(wave), lsf.Resolution(80000), 1, 4)
	if err != nil {
		fmt.Println(err)
		return
	}
	t := make([]float64, len(r.Sub))
	line := atomic.Line{Wave: 4000.06, F: 0.5}
	voigt.AddTau(t, r.Sub, line, voigt.Cloud{B: 1, LogN: 12})
	for j := range t {
		t[j] = math.Exp(-t[j])
	}
	flux := make([]float64, len(wave))
	r.Apply(flux, t)
	fmt.Printf("%.3f\n", flux)
	// Output: [0.968 0.750 0.509 0.750 0.968]
}

func BenchmarkGaussian(b *testing.B) {
	edges := lsf.Edges(pixels(5889, 0.024, 121))
	for b.Loop() {
		must(lsf.Gaussian(edges, lsf.Resolution(80000), 0.7, 4))
	}
}

func BenchmarkApply(b *testing.B) {
	wave := pixels(5889, 0.024, 121)
	r := must(lsf.Gaussian(lsf.Edges(wave), lsf.Resolution(80000), 0.7, 4))
	f, t := make([]float64, len(wave)), slices.Repeat([]float64{0.5}, len(r.Sub))
	for b.Loop() {
		r.Apply(f, t)
	}
	b.ReportMetric(float64(len(r.Weight[60])), "weights/pixel")
}
