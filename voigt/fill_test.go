package voigt_test

import (
	"math"
	"math/big"
	"math/rand/v2"
	"slices"
	"testing"

	"lacuna/voigt"
)

var dampings = []float64{0, 1e-12, 1e-8, 1e-4, 0.01, 1. / 64, 0.02, 1. / 8, 0.2, 1, 5, 7.9, 8, 11, 30, 60, 400, 2000}

func grid(lo, hi float64, n int) []float64 {
	u := make([]float64, n)
	for i := range u {
		u[i] = lo + (hi-lo)*float64(i)/float64(n-1)
	}
	return u
}

// Fill and H are the same function; at a border of ranges they may choose
// different series.
func TestFillIsH(t *testing.T) {
	u := slices.Concat([]float64{-1e90, -1e5, -1000, -50}, grid(-30, 30, 2401), grid(40, 60, 50), grid(990, 1010, 9), []float64{1e7, 1e99})
	h, hu, ha := make([]float64, len(u)), make([]float64, len(u)), make([]float64, len(u))
	var w worst
	for _, a := range dampings {
		for _, withHu := range []bool{false, true} {
			for _, withHa := range []bool{false, true} {
				du, da := hu, ha
				if !withHu {
					du = nil
				}
				if !withHa {
					da = nil
				}
				voigt.Fill(h, du, da, a, u)
				for i := range u {
					w.see(a, u[i], rel(h[i], voigt.H(a, u[i])))
				}
			}
		}
	}
	w.demand(t, "Fill against H", 2e-14)
}

// An order that does not ascend gives the same, point by point, and so do NaN,
// infinities and dampings below zero.
func TestFillAnyOrder(t *testing.T) {
	u := grid(-60, 60, 1501)
	r := rand.New(rand.NewPCG(2, 7))
	r.Shuffle(len(u), func(i, j int) { u[i], u[j] = u[j], u[i] })
	u = append(u, math.NaN(), math.Inf(1), math.Inf(-1), 1e200)
	sorted := slices.Clone(u[:1501])
	slices.Sort(sorted)
	n := len(u)
	h, hu, ha := make([]float64, n), make([]float64, n), make([]float64, n)
	sh, su, sa := make([]float64, 1501), make([]float64, 1501), make([]float64, 1501)
	var eh, eu, ea worst
	for _, a := range dampings {
		voigt.Fill(h, hu, ha, a, u)
		voigt.Fill(sh, su, sa, a, sorted)
		for i, x := range u[:1501] {
			k, _ := slices.BinarySearch(sorted, x)
			eh.see(a, x, rel(h[i], sh[k]))
			eu.see(a, x, rel(hu[i], su[k]))
			ea.see(a, x, rel(ha[i], sa[k]))
		}
		if !math.IsNaN(h[1501]) || h[1502] != 0 || h[1503] != 0 || hu[1502] != 0 || ha[1503] != 0 {
			t.Errorf("a = %g at NaN, +Inf, −Inf: H %v, H_u %v, H_a %v", a, h[1501:1504], hu[1501:1504], ha[1501:1504])
		}
		if !(rel(h[1504], voigt.H(a, 1e200)) <= promise) {
			t.Errorf("H(%g, 1e200) = %g", a, h[1504])
		}
	}
	eh.demand(t, "H", 2e-14)
	eu.demand(t, "H_u", 1e-12)
	ea.demand(t, "H_a", 1e-12)
	voigt.Fill(h[:2], hu[:2], nil, -0.5, []float64{-1, 1})
	if want := voigt.H(-0.5, 1); h[0] != want || h[1] != want || hu[0] != -hu[1] {
		t.Errorf("H(-0.5, ±1) = %v, want %g twice; H_u %v", h[:2], want, hu[:2])
	}
}

// Derivatives against central differences of the reference in long arithmetic:
// steps of 2⁻⁶⁰ leave an error of 1e-36 and keep 400 bits of the difference.
func TestFillDerivatives(t *testing.T) {
	step := b0().SetMantExp(bf(1), -60)
	twice := b0().Mul(bf(2), step)
	diff := func(a, u float64) (hu, ha float64) {
		at := func(du, da *big.Float) *big.Float {
			return refW(cplx{b0().Add(bf(u), du), b0().Add(bf(a), da)}).re
		}
		neg, zero := b0().Neg(step), b0()
		hu, _ = b0().Quo(b0().Sub(at(step, zero), at(neg, zero)), twice).Float64()
		ha, _ = b0().Quo(b0().Sub(at(zero, step), at(zero, neg)), twice).Float64()
		return
	}
	var nearU, nearA, farU, farA worst
	r := rand.New(rand.NewPCG(5, 5))
	for range 60 {
		a := math.Pow(10, -8+10*r.Float64())
		for _, u := range []float64{8 * r.Float64(), -8 * r.Float64(), 8 + 30*r.Float64(), -math.Pow(10, 1+3*r.Float64())} {
			var h, hu, ha [1]float64
			voigt.Fill(h[:], hu[:], ha[:], a, []float64{u})
			wu, wa := diff(a, u)
			if math.Hypot(a, u) >= 8 {
				farU.see(a, u, rel(hu[0], wu))
				farA.see(a, u, rel(ha[0], wa))
				continue
			}
			// 2(aL − uH) and 2(uL + aH) − 2/√π, relative to the larger term
			l := math.Abs(imag(voigt.Faddeeva(complex(u, a))))
			nearU.see(a, u, math.Abs(hu[0]-wu)/max(math.Abs(a*l), math.Abs(u)*h[0]))
			nearA.see(a, u, math.Abs(ha[0]-wa)/max(2*math.Abs(u)*l+2*a*h[0], 1))
		}
	}
	nearU.demand(t, "H_u, |z| < 8", 2*promise)
	nearA.demand(t, "H_a, |z| < 8", 2*promise)
	farU.demand(t, "H_u, |z| ≥ 8", 1e-12)
	farA.demand(t, "H_a, |z| ≥ 8", 1e-12)
}

// ∫ H du = √π for every a: DLMF 7.19.1 integrated over u. H has the Fourier
// transform exp(−k²/4 − a|k|), so a plain sum of step ¼ errs by exp(−(4π)²). The
// wings beyond ±L follow from H = a/(√π u²) [1 + (3/2 − a²)/u² + …].
func TestFillNormalisation(t *testing.T) {
	const half, step = 4000, 0.25
	u := grid(-half, half, 2*half/step+1)
	h := make([]float64, len(u))
	for _, a := range []float64{0, 1e-6, 0.01, 0.1, 0.5, 2} {
		voigt.Fill(h, nil, nil, a, u)
		sum := 0.0
		for _, x := range h {
			sum += x * step
		}
		sum -= step * h[0] // half weights at the ends
		sum += 2 * a / (math.Sqrt(math.Pi) * half) * (1 + (1.5-a*a)/(3*half*half))
		// The half weight at the ends leaves h²/12 of the slope there, 2e-13 at a = 2.
		if d := rel(sum, math.Sqrt(math.Pi)); !(d <= 1e-12) {
			t.Errorf("a = %g: ∫H du = %.15g, off by %.1e", a, sum, d)
		}
	}
}

func TestFillLengths(t *testing.T) {
	defer func() {
		if recover() == nil {
			t.Error("slices of different length were taken")
		}
	}()
	voigt.Fill(make([]float64, 2), nil, make([]float64, 3), 0.1, make([]float64, 2))
}

func FuzzFill(f *testing.F) {
	f.Add(0.01, -3.0, 0.5, 9.0)
	f.Add(0.0, -30.0, 8.0, 1e5)
	f.Add(-1.0, math.Inf(-1), math.NaN(), 8.0)
	f.Add(1e300, 1e300, 1e-300, 5e-324)
	f.Fuzz(func(t *testing.T, a, x, y, z float64) {
		u := []float64{x, y, z}
		var h, hu, ha [3]float64
		voigt.Fill(h[:], hu[:], ha[:], a, u)
		for i := range u {
			want := voigt.H(a, u[i])
			if math.IsNaN(want) != math.IsNaN(h[i]) {
				t.Fatalf("Fill(%g, %g) = %g, H = %g", a, u[i], h[i], want)
			}
			if a >= 0 && !math.IsNaN(want) {
				if !(h[i] >= 0 && h[i] <= 1) {
					t.Fatalf("H(%g, %g) = %g is outside 0 … 1", a, u[i], h[i])
				}
				if want > 1e-300 && !(rel(h[i], want) <= 2e-14) {
					t.Fatalf("Fill(%g, %g) = %g, H = %g", a, u[i], h[i], want)
				}
			}
		}
	})
}
