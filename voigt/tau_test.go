package voigt_test

import (
	"fmt"
	"math"
	"testing"

	"lacuna/atomic"
	"lacuna/internal/check"
	"lacuna/voigt"
)

// The checks use π e²/(m_e c) of CODATA 2018 (their README), this package CODATA
// 2022: 2e-9 apart. f is scaled by the ratio, so that the rest can be compared.
const codata2018 = 0.026540088560 / (math.Pi * atomic.ElectronRadius * atomic.C * 1e5) // c in cm/s

// synthetic returns the lines and clouds of the invented sightlines.
func synthetic(t *testing.T) (lines map[string]atomic.Line, clouds map[string][]voigt.Cloud) {
	lines, clouds = map[string]atomic.Line{}, map[string][]voigt.Cloud{}
	for _, r := range check.CSV(t, check.Shared(t, "checks/synthetic_lines.csv")) {
		lines[r["sightline"]+" "+r["line"]] = atomic.Line{
			Wave: check.F(t, r, "lambda_vac_A"), F: check.F(t, r, "f") * codata2018, Gamma: check.F(t, r, "gamma_s")}
	}
	for _, r := range check.CSV(t, check.Shared(t, "checks/synthetic_components.csv")) {
		clouds[r["sightline"]] = append(clouds[r["sightline"]], voigt.Cloud{
			V: check.F(t, r, "v_kms"), B: check.F(t, r, "b_kms"), LogN: math.Log10(check.F(t, r, "N_cm2"))})
	}
	return
}

// Intensities exp(−τ) of the invented sightlines, computed with numpy and scipy
// and given to 12 digits; their README allows 1e-10.
func TestAddTauSynthetic(t *testing.T) {
	lines, clouds := synthetic(t)
	most := 0.0
	for _, r := range check.CSV(t, check.Shared(t, "checks/synthetic_profiles.csv")) {
		l := lines[r["sightline"]+" "+r["line"]]
		wave := []float64{l.Wave * (1 + check.F(t, r, "v_kms")/atomic.C)}
		tau := []float64{0}
		for _, c := range clouds[r["sightline"]] {
			voigt.AddTau(tau, wave, l, c)
		}
		d := math.Abs(math.Exp(-tau[0]) - check.F(t, r, "I_intrinsic"))
		most = max(most, d)
		if !(d <= 1e-10) {
			t.Errorf("%s: exp(−τ) off by %.1e", r["id"], d)
		}
	}
	t.Logf("largest difference %.1e", most)
}

// Total equivalent widths of the same sightlines, good to 1e-9 as their README
// says: W = ∫ (1 − exp(−τ)) dλ by a plain sum. The damping wings beyond ±2000 km/s
// are optically thin and closed by hand: ∫ τ dλ = Σ τ₀ a b²/(√π L) each side.
func TestAddTauWidth(t *testing.T) {
	lines, clouds := synthetic(t)
	for _, r := range check.CSV(t, check.Shared(t, "checks/synthetic_lines.csv")) {
		l := lines[r["sightline"]+" "+r["line"]]
		const half, step = 2000.0, 0.02 // km/s; the step is 1/20 of the narrowest b
		wave, tau := grid(l.Wave*(1-half/atomic.C), l.Wave*(1+half/atomic.C), 2*half/step+1), make([]float64, 2*half/step+1)
		w := 0.0
		for _, c := range clouds[r["sightline"]] {
			voigt.AddTau(tau, wave, l, c)
			a, tau0 := voigt.Damping(l.Gamma, l.Wave, c.B), voigt.Tau0(c.N(), l.F, l.Wave, c.B)
			w += tau0 * a * c.B * c.B / math.SqrtPi * (1/(half-c.V) + 1/(half+c.V))
		}
		for i, x := range tau {
			if i == 0 || i == len(tau)-1 {
				x /= 2
			}
			w -= math.Expm1(-x) * step
		}
		got, want := w*l.Wave/atomic.C*1e3, check.F(t, r, "W_total_mA")
		if d := rel(got, want); !(d <= 1e-9) {
			t.Errorf("%s %s: W = %.10g mÅ, want %.10g, off by %.1e", r["sightline"], r["line"], got, want, d)
		}
	}
}

// A line with structure whose strengths add up to 1, for tests.
var split = atomic.Line{Wave: 5891.5833, F: 0.6408, Gamma: 6.16e7, Parts: []atomic.Part{
	{Strength: 0.3125, DV: -0.65}, {Strength: 0.3125, DV: -0.63}, {Strength: 0.375, DV: 1.07}}}

// Structure is a sum of shifted lines; ∫ τ dv = N f λ / ColumnPerTau, whatever the
// parts, the velocity and the damping.
func TestAddTauParts(t *testing.T) {
	c := voigt.Cloud{V: 37, B: 0.9, LogN: 11.3}
	wave := grid(5890, 5894, 4001)
	got, want := make([]float64, len(wave)), make([]float64, len(wave))
	voigt.AddTau(got, wave, split, c)
	for _, p := range split.Parts {
		one := split
		one.Parts, one.F = nil, split.F*p.Strength
		voigt.AddTau(want, wave, one, voigt.Cloud{V: c.V + p.DV, B: c.B, LogN: c.LogN})
	}
	for i := range got { // the shift is added in another order: ε of the velocity
		if d := math.Abs(got[i] - want[i]); !(d <= 1e-13*(1+want[i])) {
			t.Fatalf("τ(%.4f) = %.15g, parts added by hand %.15g", wave[i], got[i], want[i])
		}
	}
	split := split
	split.Gamma = 0 // no wings, so that the sum is complete
	clear(got)
	voigt.AddTau(got, wave, split, c)
	sum := 0.0
	for _, x := range got {
		sum += x
	}
	n := sum * (4.0 / 4000) * atomic.C / split.Wave * voigt.ColumnPerTau / (split.F * split.Wave)
	if d := rel(n, c.N()); !(d <= 1e-12) { // 4001 roundings; the sum itself converges exponentially
		t.Errorf("∫ τ dv gives N = %.13g, want %.13g, off by %.1e", n, c.N(), d)
	}
}

// Order and length of the slice do not matter.
func TestAddTauAnyOrder(t *testing.T) {
	wave := grid(5880, 5903, 1000)
	c := voigt.Cloud{V: -12, B: 1.4, LogN: 13}
	up, down := make([]float64, 1000), make([]float64, 1000)
	voigt.AddTau(up, wave, split, c)
	for i, j := 0, len(wave)-1; i < j; i, j = i+1, j-1 {
		wave[i], wave[j] = wave[j], wave[i]
	}
	voigt.AddTau(down, wave, split, c)
	for i := range up {
		if d := rel(down[len(down)-1-i], up[i]); !(d <= 2e-14) {
			t.Fatalf("τ[%d] = %g, backwards %g", i, up[i], down[len(down)-1-i])
		}
	}
	if tau := []float64{0}; true {
		voigt.AddTau(tau, wave[:1], split, voigt.Cloud{B: 0, LogN: 12})
		if !math.IsNaN(tau[0]) {
			t.Errorf("b = 0 gives τ = %g, want NaN", tau[0])
		}
	}
}

// Analytic derivatives against central differences by Richardson's rule of order
// h⁴ (steps h and h/2, h ≈ 1e-3 of the scale): rounding ε/h of τ and h⁴ both leave
// about 1e-11 of the largest derivative.
func TestAddTauGrad(t *testing.T) {
	wave := grid(5885, 5898, 700)
	n := len(wave)
	for _, c := range []voigt.Cloud{
		{V: 3, B: 0.8, LogN: 12.5}, {V: -40, B: 6, LogN: 15}, {V: 0, B: 0.05, LogN: 12},
	} {
		for _, l := range []atomic.Line{split, {Wave: 5891.5833, F: 0.6, Gamma: 0}, {Wave: 5891.5833, F: 0.6, Gamma: 4e9}} {
			g := voigt.Gradient{LogN: make([]float64, n), V: make([]float64, n), B: make([]float64, n)}
			tau := make([]float64, n)
			voigt.AddTauGrad(tau, g, wave, l, c)
			plain := make([]float64, n)
			voigt.AddTau(plain, wave, l, c)
			for i := range tau {
				if d := rel(tau[i], plain[i]); !(d <= 1e-14) {
					t.Fatalf("τ of AddTauGrad differs from AddTau by %.1e", d)
				}
			}
			at := func(dn, dv, db float64) []float64 {
				s := make([]float64, n)
				voigt.AddTau(s, wave, l, voigt.Cloud{V: c.V + dv, B: c.B + db, LogN: c.LogN + dn})
				return s
			}
			compare := func(what string, got []float64, h float64, at func(float64) []float64) {
				t.Helper()
				a, b, c, d := at(h), at(-h), at(h/2), at(-h/2)
				off, scale := 0.0, 0.0
				for i := range got {
					wide, narrow := (a[i]-b[i])/(2*h), (c[i]-d[i])/h
					want := narrow + (narrow-wide)/3
					off, scale = max(off, math.Abs(got[i]-want)), max(scale, math.Abs(want))
				}
				if !(off <= 1e-9*scale) {
					t.Errorf("%+v γ %.0e: ∂τ/∂%s off by %.1e of %.1e", c, l.Gamma, what, off, scale)
				}
			}
			h := 2e-3 * c.B
			compare("logN", g.LogN, 2e-3, func(d float64) []float64 { return at(d, 0, 0) })
			compare("v", g.V, h, func(d float64) []float64 { return at(0, d, 0) })
			compare("b", g.B, h, func(d float64) []float64 { return at(0, 0, d) })
		}
	}
}

func TestAddTauAllocations(t *testing.T) {
	wave, tau := grid(5890, 5893, 500), make([]float64, 500)
	g := voigt.Gradient{LogN: make([]float64, 500), V: make([]float64, 500), B: make([]float64, 500)}
	c := voigt.Cloud{V: 1, B: 1, LogN: 12}
	if n := testing.AllocsPerRun(20, func() {
		voigt.AddTau(tau, wave, split, c)
		voigt.AddTauGrad(tau, g, wave, split, c)
		voigt.AddTauGrad(nil, voigt.Gradient{V: g.V}, wave, split, c)
	}); n != 0 {
		t.Errorf("%g allocations", n)
	}
}

// Handbook numbers: N_a(v) = 3.768e14 τ/(fλ) (Savage & Sembach 1991, ApJ 379, 245) and
// N = 1.130e20 W/(fλ²), W in Å (Spitzer 1978); both from memory, to the digits printed.
func TestConstants(t *testing.T) {
	for _, tc := range []struct {
		got  float64
		want string
	}{
		{voigt.ColumnPerTau, "3.768e+14"}, {voigt.ColumnPerWidth, "1.130e+20"},
	} {
		if got := fmt.Sprintf("%.3e", tc.got); got != tc.want {
			t.Errorf("constant %s, want %s", got, tc.want)
		}
	}
	// The checks' own value, from CODATA 2018.
	if d := rel(voigt.ColumnPerTau*codata2018, 3.76788494e14*codata2018*codata2018); !(d <= 5e-9) {
		t.Errorf("ColumnPerTau = %.9e, off by %.1e from the checks' 3.76788494e14", voigt.ColumnPerTau, d)
	}
	if !math.IsNaN(voigt.Tau0(1e12, 0.1, 4000, 0)) || !math.IsNaN(voigt.Tau0(1e12, 0.1, 4000, math.NaN())) ||
		!math.IsNaN(voigt.Damping(1e8, 4000, -1)) {
		t.Error("b ≤ 0 must give NaN")
	}
}

func ExampleTau0() {
	// H I Lyα through N = 10¹³ cm⁻² with b = 10 km/s.
	fmt.Printf("τ₀ = %.3f\n", voigt.Tau0(1e13, 0.4164, 1215.67, 10))
	// Output: τ₀ = 0.758
}

func ExampleDamping() {
	// The same line has γ = 6.265e8 s⁻¹.
	a := voigt.Damping(6.265e8, 1215.67, 10)
	fmt.Printf("a = %.2e, H(a, 0) = %.5f\n", a, voigt.H(a, 0))
	// Output: a = 6.06e-04, H(a, 0) = 0.99932
}

func ExampleAddTau() {
	// One cloud in one line, on five wavelengths a Doppler width apart.
	line := atomic.Line{Wave: 4000, F: 0.5, Gamma: 1e8}
	wave, tau := make([]float64, 5), make([]float64, 5)
	for i := range wave {
		wave[i] = line.Wave * (1 + (10+2*float64(i-2))/atomic.C)
	}
	voigt.AddTau(tau, wave, line, voigt.Cloud{V: 10, B: 2, LogN: 12})
	for i, w := range wave {
		fmt.Printf("%.3f Å  τ = %.4f\n", w, tau[i])
	}
	// Output:
	// 4000.080 Å  τ = 0.0280
	// 4000.107 Å  τ = 0.5511
	// 4000.133 Å  τ = 1.4947
	// 4000.160 Å  τ = 0.5511
	// 4000.187 Å  τ = 0.0280
}
