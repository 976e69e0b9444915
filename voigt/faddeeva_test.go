package voigt_test

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"path/filepath"
	"testing"

	"lacuna/internal/check"
	"lacuna/voigt"
)

// What Faddeeva, H and Fill promise; the tests print what they reach.
const promise = 1e-13

// rel is the relative error of got; 0 must be hit exactly.
func rel(got, want float64) float64 {
	if got == want {
		return 0
	}
	return math.Abs(got-want) / math.Abs(want)
}

// worst keeps the largest error and where it was; a NaN counts as infinite.
type worst struct {
	err  float64
	a, u float64
}

func (w *worst) see(a, u, err float64) {
	if math.IsNaN(err) {
		err = math.Inf(1)
	}
	if err > w.err {
		*w = worst{err, a, u}
	}
}

func (w worst) demand(t *testing.T, what string, tol float64) {
	t.Helper()
	t.Logf("%-24s %.1e at a = %g, u = %g", what, w.err, w.a, w.u)
	if !(w.err <= tol) {
		t.Errorf("%s: off by %.1e at a = %g, u = %g, allowed %.0e", what, w.err, w.a, w.u, tol)
	}
}

// 200 values of 30 digits by mpmath, in the hard places named there.
func TestFaddeevaTable(t *testing.T) {
	var re, im, h worst
	for _, row := range check.CSV(t, filepath.Join("testdata", "voigt_function.csv")) {
		a, u := check.F(t, row, "a"), check.F(t, row, "u")
		w := voigt.Faddeeva(complex(u, a))
		re.see(a, u, rel(real(w), check.F(t, row, "H")))
		im.see(a, u, rel(imag(w), check.F(t, row, "im_w")))
		h.see(a, u, rel(voigt.H(a, u), check.F(t, row, "H")))
	}
	re.demand(t, "Re w", promise)
	im.demand(t, "Im w", promise)
	h.demand(t, "H", promise)
}

// Published w(z), source in each row; the rows from memory are background.
func TestFaddeevaPublished(t *testing.T) {
	var re, im worst
	for _, row := range check.CSV(t, filepath.Join("testdata", "voigt_published.csv")) {
		if row["status"] == "memory" {
			continue
		}
		a, u := check.F(t, row, "a"), check.F(t, row, "u")
		w := voigt.Faddeeva(complex(u, a))
		re.see(a, u, rel(real(w), check.F(t, row, "H_published")))
		im.see(a, u, rel(imag(w), check.F(t, row, "im_w_published")))
	}
	re.demand(t, "Re w", promise)
	im.demand(t, "Im w", promise)
}

// edges are the places where the method changes, and hard ones between.
func edges() (a, u []float64) {
	for _, x := range []float64{1e-8, 3e-6, 1e-3, 1. / 64, 0.05, 1. / 8, 0.3, 1, 2.7, 6.3, 8, 12, 50, 100} {
		a = append(a, math.Nextafter(x, 0), x, math.Nextafter(x, 1e9))
	}
	a = append(a, 1e-10, 1e-12, 1e-30)
	u = []float64{0, 1e-12, 1e-6, 0.2, 0.7, 0.9241388730, 1.5, 2.25, 3, 4.1, 5.3, 6.2, 7.1}
	for k := range 12 { // between and at the nodes
		x := float64(k)*44.25/64 + 0.5/64
		u = append(u, math.Nextafter(x, 0), x, x+0.25/64)
	}
	for _, x := range []float64{8, 12, 50, 1000} {
		u = append(u, math.Nextafter(x, 0), x, x*1.01)
	}
	return a, append(u, 1e4)
}

// Against the long-arithmetic reference of this package's tests: every
// combination of the edges, and a seeded scatter over the promised range.
func TestFaddeevaScan(t *testing.T) {
	var re, im worst
	see := func(a, u float64) {
		wr, wi := ref(a, u)
		w := voigt.Faddeeva(complex(u, a))
		re.see(a, u, rel(real(w), wr))
		im.see(a, u, rel(imag(w), wi))
	}
	as, us := edges()
	step := 1
	if testing.Short() {
		step = 7
	}
	for i, a := range as {
		for j := i % step; j < len(us); j += step {
			see(a, us[j])
		}
	}
	r := rand.New(rand.NewPCG(8, 15))
	for range 300 / step {
		a := math.Pow(10, -8+10*r.Float64())
		u := math.Pow(10, -6+10*r.Float64())
		see(a, u)
		see(a, 10*r.Float64())
		see(math.Pow(10, -8+4*r.Float64()), 4+6*r.Float64()) // Re w ≪ Im w
		see(0.1+r.Float64()*0.2, 8*r.Float64())
	}
	re.demand(t, "Re w", promise)
	im.demand(t, "Im w", promise)
}

// On the real axis w = exp(−u²) + i (2/√π) F(u).
func TestFaddeevaRealAxis(t *testing.T) {
	var re, im worst
	for u := 1e-9; u < 30; u = u*1.05 + 1e-3 {
		_, wi := ref(0, u)
		w := voigt.Faddeeva(complex(u, 0))
		e := expMinusSquare(u)
		if e > 1e-300 { // below, doubles thin out
			re.see(0, u, rel(real(w), e))
		}
		im.see(0, u, rel(imag(w), wi))
	}
	re.demand(t, "exp(−u²)", promise)
	im.demand(t, "Dawson", promise)
	// F has its maximum 0.5410442246 at 0.9241388730: DLMF 7.8 gives 0.541 and 0.924;
	// ten digits from memory.
	if got := imag(voigt.Faddeeva(0.9241388730)) * math.Sqrt(math.Pi) / 2; !(math.Abs(got-0.5410442246) <= 1e-10) {
		t.Errorf("F(0.924) = %.12f", got)
	}
}

func TestFaddeevaSymmetry(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 1))
	for range 2000 {
		a := math.Pow(10, -9+11*r.Float64())
		u := math.Pow(10, -6+10*r.Float64())
		z := complex(u, a)
		w, v := voigt.Faddeeva(z), voigt.Faddeeva(-cmplx.Conj(z))
		if v != cmplx.Conj(w) { // w(−z*) = w(z)*, DLMF 7.4.3
			t.Fatalf("w(%v) = %v but w(−z*) = %v", z, w, v)
		}
		if h := voigt.H(a, -u); h != real(w) {
			t.Fatalf("H(%g, %g) = %g, Re w = %g", a, -u, h, real(w))
		}
	}
}

// On the axis H(a, 0) = exp(a²) erfc(a) (DLMF 7.19.3); want: the same in long
// arithmetic, and for the double functions where they do not lose digits.
func TestHOnAxis(t *testing.T) {
	var w worst
	for a := 1e-9; a < 100; a *= 1.5 {
		want, _ := ref(a, 0)
		w.see(a, 0, rel(voigt.H(a, 0), want))
		if a < 1 {
			if d := rel(voigt.H(a, 0), math.Exp(a*a)*math.Erfc(a)); !(d <= 1e-15*8) { // three roundings
				t.Errorf("H(%g, 0) differs from exp(a²) erfc(a) by %.1e", a, d)
			}
		}
	}
	w.demand(t, "H(a, 0)", promise)
}

// In the lower half plane w(z) = 2 exp(−z²) − w(−z): there the reference series
// holds as well. Near the zeros of w only an error relative to the larger term can
// be asked.
func TestFaddeevaLowerHalfPlane(t *testing.T) {
	var w worst
	r := rand.New(rand.NewPCG(3, 9))
	for range 300 {
		a, u := 6*r.Float64(), 8*r.Float64()-4
		wr, wi := ref(-a, u)
		got := voigt.Faddeeva(complex(u, -a))
		scale := max(math.Hypot(wr, wi), real(voigt.Faddeeva(complex(0, 0.5))))
		w.see(-a, u, math.Hypot(real(got)-wr, imag(got)-wi)/scale)
	}
	w.demand(t, "w below the axis", 2e-13) // e^(a²−u²) with an exponent up to 36: 36 ε of rounding twice
	if got := voigt.H(-2, 1); real(voigt.Faddeeva(1-2i)) != got {
		t.Errorf("H(-2, 1) = %g is not Re w(1 − 2i)", got)
	}
}

func TestFaddeevaSpecial(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	for _, z := range []complex128{complex(nan, 1), complex(1, nan), complex(nan, nan), complex(inf, nan), complex(nan, inf), complex(nan, -1)} {
		w := voigt.Faddeeva(z)
		if !math.IsNaN(real(w)) || !math.IsNaN(imag(w)) {
			t.Errorf("w(%v) = %v, want NaN", z, w)
		}
		if h := voigt.H(imag(z), real(z)); !math.IsNaN(h) {
			t.Errorf("H of %v = %g, want NaN", z, h)
		}
	}
	for _, z := range []complex128{complex(inf, 1), complex(-inf, 0), complex(inf, 1e-300), complex(0, inf), complex(3, inf), complex(inf, inf), complex(inf, -2)} {
		if w := voigt.Faddeeva(z); w != 0 {
			t.Errorf("w(%v) = %v, want 0", z, w)
		}
	}
	if w := voigt.Faddeeva(complex(0, -inf)); real(w) != inf || imag(w) != 0 {
		t.Errorf("w(−i∞) = %v, want +Inf", w)
	}
	if w := voigt.Faddeeva(complex(1, -inf)); !math.IsNaN(real(w)) {
		t.Errorf("w(1 − i∞) = %v, want NaN", w)
	}
	if w := voigt.Faddeeva(complex(0, -100)); real(w) != inf || imag(w) != 0 {
		t.Errorf("w(−100i) = %v, want +Inf: 2 exp(10⁴)", w)
	}
	if w := voigt.Faddeeva(0); w != 1 {
		t.Errorf("w(0) = %v, want 1", w)
	}
	// i/(√π z) where |z|² overflows, or nearly
	for _, z := range []complex128{complex(1e200, 1e180), complex(1e101, 1e99), complex(-3e160, 1e170), complex(0, 1e300), complex(5e-9, 1e155)} {
		want := complex(0, 1/math.Sqrt(math.Pi)) / z
		if w := voigt.Faddeeva(z); !(rel(real(w), real(want)) <= 1e-15*4) || !(math.Abs(imag(w)-imag(want)) <= 1e-15*4*cmplx.Abs(want)) {
			t.Errorf("w(%v) = %v, want %v", z, w, want)
		}
	}
}

func TestNoAllocation(t *testing.T) {
	u, h, hu, ha := make([]float64, 300), make([]float64, 300), make([]float64, 300), make([]float64, 300)
	for i := range u {
		u[i] = float64(i-150) / 3
	}
	sink := 0.0
	for name, f := range map[string]func(){
		"Faddeeva": func() { sink += real(voigt.Faddeeva(complex(sink, 0.01))) },
		"H":        func() { sink += voigt.H(0.3, 1) },
		"Fill":     func() { voigt.Fill(h, hu, ha, 0.01, u) },
		"Fill H":   func() { voigt.Fill(h, nil, nil, 0.05, u) },
		"Fill 1":   func() { voigt.Fill(h, nil, ha, 1, u) },
	} {
		if n := testing.AllocsPerRun(20, f); n != 0 {
			t.Errorf("%s allocates %g times", name, n)
		}
	}
}
