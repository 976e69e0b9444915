package cog_test

import (
	"fmt"
	"math"
	"testing"

	"lacuna/atomic"
	"lacuna/cog"
	"lacuna/internal/check"
	"lacuna/voigt"
)

// N = 1.12958e20 W/(f λ²), Å: the constant of the weak-line relation, six digits.
func TestLinear(t *testing.T) {
	isNear(t, "N(W = 1 Å, f = 1, λ = 1 Å)", cog.Linear(1, atomic.Line{F: 1, Wave: 1}), 1.12958e20, 5e-6)
}

// doublet_ratio.csv: undamped lines 2:1; corrections of either line, and the
// method backwards.
func TestDoubletTable(t *testing.T) {
	for _, r := range check.CSV(t, check.Shared(t, "checks/doublet_ratio.csv")) {
		tau := check.F(t, r, "tau_weak")
		weak, strong := unit(0, tau), unit(0, 2*tau)
		ww, ws := cog.Width(weak, 12, 1), cog.Width(strong, 12, 1)
		isNear(t, r["id"]+" ratio", ws/ww, check.F(t, r, "doublet_ratio"), tableTol)
		for _, l := range []struct {
			line atomic.Line
			w    float64
			col  string
		}{{weak, ww, "logN_corr_weak"}, {strong, ws, "logN_corr_strong"}} {
			got, err := cog.Correction(l.line, l.w, 1)
			// 1e-12 in W is 1e-12/(dlnW/dlnN) in N: 20 times that on the flat part
			if want := check.F(t, r, l.col); err != nil || !(math.Abs(got-want) <= 1e-10) {
				t.Errorf("%s %s: %.12g, want %.12g (%v)", r["id"], l.col, got, want, err)
			}
		}
		x, b, err := cog.DoubletRatio(strong, weak, ws, ww)
		if err != nil {
			t.Errorf("%s: %v", r["id"], err)
			continue
		}
		// on the flat part dR/dlnN is 0.003 and W is good to 1e-11
		if !(math.Abs(x-12) <= 1e-6 && math.Abs(b-1) <= 1e-6) {
			t.Errorf("%s (ratio %s): log N = %.9f, b = %.9f, want 12, 1", r["id"], r["doublet_ratio"], x, b)
		}
	}
}

// Ratios that no cloud gives are refused, not guessed.
func TestDoubletRefuses(t *testing.T) {
	strong, weak := unit(1e-3, 2), unit(1e-3, 1)
	for _, ratio := range []float64{0.9, 1, 2, 2.3, math.NaN(), -1, 1.01} {
		x, b, err := cog.DoubletRatio(strong, weak, 0.03*ratio, 0.03)
		if err == nil {
			t.Errorf("ratio %g gives log N = %g, b = %g", ratio, x, b)
		}
	}
	if _, _, err := cog.DoubletRatio(weak, strong, 0.03, 0.02); err == nil {
		t.Error("lines in the wrong order were taken")
	}
}

// A damped doublet has the ratio √2 (2 √(√π a τ₀) grows as √N).
func TestDampedDoublet(t *testing.T) {
	strong, weak := unit(0.01, 2e9), unit(0.01, 1e9)
	isNear(t, "ratio", cog.Width(strong, 12, 1)/cog.Width(weak, 12, 1), math.Sqrt2, 1e-5)
}

func TestInvert(t *testing.T) {
	for _, c := range benchLines {
		for x := c.logN - 6; x < c.logN+5; x += 0.37 {
			for _, b := range []float64{0.1, c.b, 30} {
				w := cog.Width(c.line, x, b)
				got, err := cog.Invert(c.line, w, b)
				if err != nil {
					t.Fatalf("%s: %v", c.name, err)
				}
				// 1e-12 in W, and 1e-11 of Width itself, over the slope of the flat part
				_, slope, _ := cog.WidthGrad(c.line, x, b)
				if tol := 3e-11 * w / slope; !(math.Abs(got-x) <= tol+1e-14*x) {
					t.Errorf("%s: log N %.3f, b %g: came back off by %.1e, allowed %.1e", c.name, x, b, got-x, tol)
				}
			}
		}
	}
	undamped := unit(0, 1)
	for _, tc := range []struct {
		w, b float64
		l    atomic.Line
	}{{0, 1, undamped}, {-1, 1, undamped}, {math.NaN(), 1, undamped}, {math.Inf(1), 1, undamped}, {0.01, 0, undamped}, {0.01, math.NaN(), undamped},
		{0.01, 1, atomic.Line{Wave: 5000}}, {0.01, 1, atomic.Line{F: 1}}, {3, 1, undamped}} {
		if x, err := cog.Invert(tc.l, tc.w, tc.b); err == nil || !math.IsNaN(x) {
			t.Errorf("W = %g, b = %g: log N = %g, %v", tc.w, tc.b, x, err)
		}
	}
}

func TestCurve(t *testing.T) {
	l := benchLines[1].line
	x := []float64{math.Log10(l.F*l.Wave*1e-8) + 9, math.Log10(l.F*l.Wave*1e-8) + 13.5}
	y := cog.Curve(l, 1.5, x)
	for i, logN := range []float64{9, 13.5} {
		isNear(t, "W/λ", math.Pow(10, y[i]), cog.Width(l, logN, 1.5)/l.Wave, 1e-12)
	}
	// On the linear part W/λ = (π rₑ) f N λ, λ in cm: one straight line for all lines.
	isNear(t, "W/λ on the linear part", math.Pow(10, y[0]), math.Pi*atomic.ElectronRadius*math.Pow(10, x[0]), 1e-3)
}

func TestTooSmallWidthIsThin(t *testing.T) {
	l := unit(1e-3, 1)
	x, err := cog.Invert(l, 1e-12, 1)
	if err != nil {
		t.Fatal(err)
	}
	isNear(t, "N", math.Pow(10, x), cog.Linear(1e-12, l), 1e-9)
	isNear(t, "τ₀ of the unit line", voigt.Tau0(1e12, l.F, l.Wave, 1), 1, 1e-14)
}

func ExampleCorrection() {
	k := atomic.Line{Name: "Ca II 3933.66", Wave: 3934.775, F: 0.6267, Gamma: 1.456e8}
	for _, w := range []float64{0.005, 0.050, 0.100} {
		c, _ := cog.Correction(k, w, 2)
		fmt.Printf("%3.0f mÅ: log N = %.2f + %.2f\n", 1e3*w, math.Log10(cog.Linear(w, k)), c)
	}
	// Output:
	//   5 mÅ: log N = 10.76 + 0.02
	//  50 mÅ: log N = 11.76 + 0.24
	// 100 mÅ: log N = 12.07 + 1.01
}
