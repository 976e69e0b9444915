package cog_test

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"lacuna/atomic"
	"lacuna/cog"
	"lacuna/internal/check"
	"lacuna/voigt"
)

// The check tables were made with π e²/(mₑ c) = 0.026540088560 cm² Hz (CODATA
// 2018); ours is π rₑ c of CODATA 2022, smaller by 2e-10 … 2e-9 in N. Columns are
// scaled by the ratio so that both integrate the same τ₀.
var constants = math.Log10(0.026540088560 / (math.Pi * atomic.ElectronRadius * atomic.C * 1e5))

// Width promises 1e-11; the tables are good to 1e-10 (their README: an independent
// recomputation) and printed with ten digits or more.
const tableTol = 1e-9

func rel(got, want float64) float64 { return math.Abs(got/want - 1) }

func isNear(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if d := rel(got, want); !(d <= tol) {
		t.Errorf("%s = %.14g, want %.14g: off by %.1e, allowed %.0e", what, got, want, d, tol)
	}
}

// unit is a line whose width has any wanted a and τ₀ at b = 1 km/s and N = 10¹²;
// its width is F λ/c, F in units of b.
func unit(a, tau0 float64) atomic.Line {
	l := atomic.Line{Name: "unit", Wave: 5000, F: 1}
	l.Gamma = a / voigt.Damping(1, l.Wave, 1)
	l.F = tau0 / voigt.Tau0(1e12, 1, l.Wave, 1)
	return l
}

func integral(a, tau0 float64) float64 {
	l := unit(a, tau0)
	return cog.Width(l, 12, 1) * atomic.C / l.Wave
}

// curve_of_growth.csv: 600 widths by Gauss–Legendre panels to |u| > 1e7, mpmath
// and numpy, from the linear part to lines 680 Å wide.
func TestWidthAgainstTable(t *testing.T) {
	worst, id := 0., ""
	for _, r := range check.CSV(t, check.Shared(t, "checks/curve_of_growth.csv")) {
		l := atomic.Line{Wave: check.F(t, r, "lambda_vac_A"), F: check.F(t, r, "f"), Gamma: check.F(t, r, "gamma_s")}
		w := cog.Width(l, check.F(t, r, "logN")+constants, check.F(t, r, "b_kms"))
		isNear(t, r["id"]+" "+r["line"]+" (mÅ)", w*1e3, check.F(t, r, "W_mA"), tableTol)
		if d := rel(w*1e3, check.F(t, r, "W_mA")); !(d <= worst) {
			worst, id = d, r["id"]
		}
	}
	t.Logf("worst relative difference %.2e at %s", worst, id)
}

// curve_of_growth_limits.csv: undamped lines to 25 digits, and damped ones with
// the limit 2 √(√π a τ₀).
func TestWidthLimits(t *testing.T) {
	for _, r := range check.CSV(t, check.Shared(t, "checks/curve_of_growth_limits.csv")) {
		a, tau0 := check.F(t, r, "a"), check.F(t, r, "tau0")
		got := integral(a, tau0)
		isNear(t, r["id"]+" F", got, check.F(t, r, "F"), tableTol)
		if r["case"] == "voigt_damping" {
			isNear(t, r["id"]+" F/damping limit", got/(2*math.Sqrt(math.Sqrt(math.Pi)*a*tau0)), check.F(t, r, "F_over_damping"), tableTol)
		}
	}
}

// F/F_lin = 1 − τ₀/2√2 + τ₀²/6√3 − …, 0.96559 at τ₀ = 0.1 (the series of
// 1 − e^−τ, term by term).
func TestWidthLinearPart(t *testing.T) {
	for _, tau0 := range []float64{1e-12, 1e-6, 1e-3, 0.01, 0.1} {
		want, term := 0., 1.
		for n := 1; n < 12; n++ {
			want += term / math.Sqrt(float64(n))
			term *= -tau0 / float64(n+1)
		}
		isNear(t, "F/F_lin", integral(0, tau0)/(math.Sqrt(math.Pi)*tau0), want, 1e-11)
	}
}

// Area is conserved: however a thin line is damped or split, W is that of the
// weak-line relation.
func TestWidthOfThinLines(t *testing.T) {
	for _, c := range benchLines {
		x := math.Log10(1e-9) - math.Log10(voigt.Tau0(1, c.line.F, c.line.Wave, c.b))
		isNear(t, c.name, cog.Linear(cog.Width(c.line, x, c.b), c.line), math.Pow(10, x), 1e-8)
	}
}

// cn_excitation_computed.csv: exact widths of five lines of the CN B–X (0,0) band
// for 20 clouds; wavelengths, f and γ as its README gives them.
func TestWidthCN(t *testing.T) {
	for _, r := range check.CSV(t, check.Shared(t, "checks/cn_excitation_computed.csv")) {
		for _, l := range cnLines {
			x := math.Log10(check.F(t, r, "N"+l.Level[2:]+"_cm2")) + constants
			isNear(t, r["id"]+" "+l.Name, 1e3*cog.Width(l, x, check.F(t, r, "b_kms")), check.F(t, r, "W_"+l.Name+"_mA"), tableTol)
		}
	}
}

func cnLine(name, level string, wave, f float64) atomic.Line {
	return atomic.Line{Name: name, Species: "CN", Level: level, Wave: wave, F: f, Gamma: 1.5e7}
}

var cnLines = []atomic.Line{
	cnLine("R(0)", "N=0", 3875.7060, 0.0342), cnLine("R(1)", "N=1", 3875.0960, 0.0228), cnLine("P(1)", "N=1", 3876.8613, 0.0114),
	cnLine("R(2)", "N=2", 3874.4668, 0.0205), cnLine("P(2)", "N=2", 3877.4084, 0.0137),
}

// synthetic_lines.csv: total widths of up to six clouds, the sum of their single
// widths, and the weak-line width.
func TestWidthOfClouds(t *testing.T) {
	clouds := map[string][]voigt.Cloud{}
	for _, r := range check.CSV(t, check.Shared(t, "checks/synthetic_components.csv")) {
		clouds[r["sightline"]] = append(clouds[r["sightline"]], voigt.Cloud{
			V: check.F(t, r, "v_kms"), B: check.F(t, r, "b_kms"), LogN: math.Log10(check.F(t, r, "N_cm2")) + constants})
	}
	for _, r := range check.CSV(t, check.Shared(t, "checks/synthetic_lines.csv")) {
		l := atomic.Line{Wave: check.F(t, r, "lambda_vac_A"), F: check.F(t, r, "f"), Gamma: check.F(t, r, "gamma_s")}
		cs := clouds[r["sightline"]]
		total := cog.WidthOf(l, cs)
		var sum float64
		for _, c := range cs {
			sum += cog.Width(l, c.LogN, c.B)
		}
		what := r["sightline"] + " " + r["line"]
		isNear(t, what+" total", 1e3*total, check.F(t, r, "W_total_mA"), tableTol)
		isNear(t, what+" singles", 1e3*sum, check.F(t, r, "W_sum_of_single_components_mA"), tableTol)
		if !(total <= sum*(1+1e-12)) {
			t.Errorf("%s: total %g above the sum of single widths %g", what, total, sum)
		}
		back := make([]voigt.Cloud, len(cs))
		for i, c := range cs {
			back[len(cs)-1-i] = c
		}
		isNear(t, what+" in the other order", cog.WidthOf(l, back), total, 1e-13)
	}
}

func TestWidthOfIdentities(t *testing.T) {
	for _, c := range benchLines {
		one := cog.Width(c.line, c.logN, c.b)
		half := voigt.Cloud{V: -30, B: c.b, LogN: c.logN - math.Log10(2)}
		isNear(t, c.name+": two halves", cog.WidthOf(c.line, []voigt.Cloud{half, half}), one, 1e-11)
		void := voigt.Cloud{V: 12, B: 1, LogN: math.Inf(-1)}
		whole := voigt.Cloud{V: 5, B: c.b, LogN: c.logN}
		isNear(t, c.name+": with an empty cloud", cog.WidthOf(c.line, []voigt.Cloud{void, whole}), one, 1e-11)
		far := cog.WidthOf(c.line, []voigt.Cloud{{V: -2e4, B: c.b, LogN: c.logN}, {V: 2e4, B: c.b, LogN: c.logN}})
		if c.name != "damped" { // whose wings meet even there
			isNear(t, c.name+": two clouds far apart", far, 2*one, 1e-7)
		}
	}
	if w := cog.WidthOf(benchLines[0].line, nil); w != 0 {
		t.Errorf("no cloud has the width %g", w)
	}
}

// Widths with hyperfine structure over widths without, log N = 12, at b = 0.4, 0.7,
// 1 and 2 km/s (computed for the project with another program before this one
// was written; three digits, structure constants of Arimondo et al. 1977 and
// Falke et al. 2006).
func TestHyperfine(t *testing.T) {
	for _, tc := range []struct {
		line string
		want [4]float64
	}{
		{"Na I 5889.95", [4]float64{1.548, 1.271, 1.147, 1.033}},
		{"Na I 5895.92", [4]float64{1.554, 1.261, 1.131, 1.025}},
		{"K I 7698.96", [4]float64{1.136, 1.046, 1.021, 1.004}},
	} {
		split, err := atomic.Default().Find(tc.line)
		if err != nil {
			t.Fatal(err)
		}
		plain := split
		plain.Parts = nil
		for i, b := range []float64{0.4, 0.7, 1, 2} {
			got := cog.Width(split, 12, b) / cog.Width(plain, 12, b)
			if !(math.Abs(got-tc.want[i]) <= 0.0011) { // last digit, and f and structure that differ in theirs
				t.Errorf("%s, b = %g: W with structure over W without = %.4f, want %.3f", tc.line, b, got, tc.want[i])
			}
		}
	}
}

// Lyα at b = 10 km/s: widths computed for the project with another program; the
// damping relation N(H I) = 1.867e18 W² (Jenkins 1971, from memory; it follows
// from 2 √(√π a τ₀) and the line's f and γ).
func TestLymanAlpha(t *testing.T) {
	l, err := atomic.Default().Find("H I 1215.67")
	if err != nil {
		t.Fatal(err)
	}
	for _, tc := range []struct{ logN, w float64 }{{19.5, 4.117}, {20, 7.317}, {21, 23.121}} {
		w := cog.Width(l, tc.logN, 10)
		isNear(t, "W(Lyα)", w, tc.w, 1e-3)
		t.Logf("log N %g: %.4f Å, %g", tc.logN, w, tc.w)
		if tc.logN == 21 {
			isNear(t, "N from the damping relation", 1.867e18*w*w, 1e21, 2e-3)
		}
	}
	// the pure damping limit, where b no longer matters
	w := cog.Width(l, 22, 1)
	isNear(t, "N from the damping relation at 10²²", 1.867e18*w*w, 1e22, 1e-3)
}

func TestWidthGrad(t *testing.T) {
	for _, c := range benchLines {
		for _, dx := range []float64{-3, -1, 0, 1, 3} {
			x, b := c.logN+dx, c.b
			w, dN, dB := cog.WidthGrad(c.line, x, b)
			isNear(t, c.name+": W", w, cog.Width(c.line, x, b), 1e-11)
			const h = 1e-3 // error of the five-point rule h⁴; of W/h 1e-8
			d := func(f func(float64) float64) float64 {
				return (8*(f(h)-f(-h)) - (f(2*h) - f(-2*h))) / (12 * h)
			}
			numN := d(func(h float64) float64 { return cog.Width(c.line, x+h, b) })
			numB := d(func(h float64) float64 { return cog.Width(c.line, x, b+h*b) }) / b
			if !(math.Abs(dN-numN) <= 1e-7*w) {
				t.Errorf("%s, log N %g: ∂W/∂log N = %.12g, differences give %.12g", c.name, x, dN, numN)
			}
			if !(math.Abs(dB-numB)*b <= 1e-7*w) {
				t.Errorf("%s, log N %g: ∂W/∂b = %.12g, differences give %.12g", c.name, x, dB, numB)
			}
			if !(dN >= 0 && dB >= 0) {
				t.Errorf("%s: negative derivative %g, %g", c.name, dN, dB)
			}
		}
	}
}

func TestWidthDomain(t *testing.T) {
	l := benchLines[1].line
	nan := math.NaN()
	for _, tc := range []struct{ logN, b float64 }{{nan, 1}, {12, nan}, {12, 0}, {12, -1}, {12, math.Inf(1)}, {math.Inf(1), 1}, {400, 1}} {
		if w := cog.Width(l, tc.logN, tc.b); !math.IsNaN(w) {
			t.Errorf("Width(%g, %g) = %g, want NaN", tc.logN, tc.b, w)
		}
	}
	if w := cog.Width(l, math.Inf(-1), 1); w != 0 {
		t.Errorf("width of nothing: %g", w)
	}
	l.Gamma = nan
	if w := cog.Width(l, 12, 1); !math.IsNaN(w) {
		t.Errorf("width with γ = NaN: %g", w)
	}
}

func TestWidthDoesNotAllocate(t *testing.T) {
	for _, c := range benchLines {
		if n := testing.AllocsPerRun(10, func() { sinkW, _, _ = cog.WidthGrad(c.line, c.logN, c.b) }); n != 0 {
			t.Errorf("%s: %g allocations", c.name, n)
		}
	}
}

// Any cloud has a width between 0 and that of the weak-line relation, which grows
// with N and with b.
func FuzzWidth(f *testing.F) {
	f.Add(12.0, 1.0, 0.3, 1e8, 0.5, 0.7)
	f.Add(22.0, 0.01, 0.4, 6e8, 0.0, 0.0)
	f.Fuzz(func(t *testing.T, logN, b, fosc, gamma, dv, part float64) {
		l := atomic.Line{Wave: 3000, F: fosc, Gamma: gamma}
		if part > 0 && part < 1 && math.Abs(dv) < 1e3 {
			l.Parts = []atomic.Part{{Strength: part, DV: dv}, {Strength: 1 - part}}
		}
		if !(b > 1e-3 && b < 1e3 && fosc > 1e-8 && fosc < 10 && gamma >= 0 && gamma < 1e12 && logN > 0 && logN < 24) {
			return
		}
		w, dN, dB := cog.WidthGrad(l, logN, b)
		if !(w > 0 && dN >= 0 && dB >= 0) || !(cog.Linear(w, l) <= math.Pow(10, logN)*(1+1e-9)) {
			t.Fatalf("W = %g, derivatives %g %g", w, dN, dB)
		}
		if more := cog.Width(l, logN+0.01, b); !(more >= w*(1-1e-10)) {
			t.Fatalf("W falls from %.15g to %.15g", w, more)
		}
	})
}

func ExampleWidth() {
	k := atomic.Line{Name: "Ca II 3933.66", Wave: 3934.775, F: 0.6267, Gamma: 1.456e8}
	var row []string
	for _, logN := range []float64{11, 12, 13, 14} {
		row = append(row, milli(cog.Width(k, logN, 2)))
	}
	fmt.Println(strings.Join(row, "  "))
	// Output: 8.1 mÅ  49.7 mÅ  97.4 mÅ  131.6 mÅ
}
