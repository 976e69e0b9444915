package voigt_test

import (
	"math"
	"math/big"
	"testing"
)

// An independent w(z) in long arithmetic, for scans: the power series
//
//	w(z) = Σ (iz)ⁿ / Γ(n/2 + 1)    (DLMF 7.6.3 in other words)
//
// up to |z| = 12.5, and Laplace's continued fraction (DLMF 7.9.3)
//
//	w(z) = (i/√π) / (z − ½/(z − 1/(z − (3/2)/(z − …))))
//
// beyond 10, cut after 90 steps. Both are compared where they overlap.
const refBits = 512 // e^(|z|²) ≤ 2^208 cancels down to e^(−|z|²), 53 bits of that are wanted

func bf(x float64) *big.Float { return new(big.Float).SetPrec(refBits).SetFloat64(x) }
func b0() *big.Float          { return new(big.Float).SetPrec(refBits) }

type cplx struct{ re, im *big.Float }

func (a cplx) add(b cplx) cplx { return cplx{b0().Add(a.re, b.re), b0().Add(a.im, b.im)} }
func (a cplx) sub(b cplx) cplx { return cplx{b0().Sub(a.re, b.re), b0().Sub(a.im, b.im)} }
func (a cplx) mul(b cplx) cplx {
	return cplx{
		b0().Sub(b0().Mul(a.re, b.re), b0().Mul(a.im, b.im)),
		b0().Add(b0().Mul(a.re, b.im), b0().Mul(a.im, b.re)),
	}
}
func (a cplx) over(x *big.Float) cplx { return cplx{b0().Quo(a.re, x), b0().Quo(a.im, x)} }
func (a cplx) inv() cplx {
	n := b0().Add(b0().Mul(a.re, a.re), b0().Mul(a.im, a.im))
	return cplx{b0().Quo(a.re, n), b0().Neg(b0().Quo(a.im, n))}
}
func (a cplx) f64() (re, im float64) {
	re, _ = a.re.Float64()
	im, _ = a.im.Float64()
	return
}

// bigSqrtPi is √π by Gauss and Legendre's arithmetic-geometric mean.
var bigSqrtPi = func() *big.Float {
	a, b, t, p := bf(1), b0().Quo(bf(1), b0().Sqrt(bf(2))), bf(0.25), 1.0
	for range 10 {
		m := b0().Quo(b0().Add(a, b), bf(2))
		d := b0().Sub(a, m)
		t.Sub(t, b0().Mul(bf(p), b0().Mul(d, d)))
		b.Sqrt(b0().Mul(a, b))
		a, p = m, 2*p
	}
	s := b0().Add(a, b)
	return b0().Sqrt(b0().Quo(b0().Mul(s, s), b0().Mul(bf(4), t)))
}()

func refW(z cplx) cplx {
	re, im := z.f64()
	if math.Hypot(re, im) <= 12 {
		return refSeries(z)
	}
	return refFraction(z)
}

func refSeries(z cplx) cplx {
	minus := cplx{bf(-1), bf(0)}.mul(z.mul(z)) // −z²
	even := cplx{bf(1), bf(0)}                 // (−z²)ᵏ/k!
	odd := cplx{b0().Neg(z.im), b0().Set(z.re)}.over(b0().Quo(bigSqrtPi, bf(2)))
	sum := even.add(odd) // odd: iz(−z²)ᵏ/Γ(k+3/2)
	m2, _ := minus.f64()
	for k := 1.0; k < 5000; k++ {
		even = even.mul(minus).over(bf(k))
		odd = odd.mul(minus).over(bf(k + 0.5))
		sum = sum.add(even).add(odd)
		if k > math.Abs(m2) && small(even) && small(odd) {
			break
		}
	}
	return sum
}

func small(a cplx) bool {
	tiny := func(x *big.Float) bool { return x.Sign() == 0 || x.MantExp(nil) < -320 }
	return tiny(a.re) && tiny(a.im)
}

func refFraction(z cplx) cplx {
	t := z
	for k := 90.0; k >= 1; k-- {
		t = z.sub(cplx{bf(k / 2), bf(0)}.mul(t.inv()))
	}
	w := t.inv().over(bigSqrtPi)
	return cplx{b0().Neg(w.im), w.re}
}

// ref returns w(u + ia) rounded to doubles.
func ref(a, u float64) (re, im float64) { return refW(cplx{bf(u), bf(a)}).f64() }

func TestReferencesAgree(t *testing.T) {
	for _, z := range [][2]float64{{1e-8, 12}, {1e-3, 11.3}, {0.1, 12.4}, {3, 11}, {11.5, 0.01}} {
		p, q := cplx{bf(z[1]), bf(z[0])}, cplx{bf(z[1]), bf(z[0])}
		ar, ai := refSeries(p).f64()
		br, bi := refFraction(q).f64()
		// the fraction is a Gauss–Hermite rule: it lacks exp(−z²) ≤ 1e-47
		if !(math.Abs(ar/br-1) <= 3e-16) || !(math.Abs(ai/bi-1) <= 3e-16) {
			t.Errorf("a=%g u=%g: series %g %g, fraction %g %g", z[0], z[1], ar, ai, br, bi)
		}
	}
}

// expMinusSquare is exp(−u²) in long arithmetic, by the series of exp(u²).
func expMinusSquare(u float64) float64 {
	q := b0().Mul(bf(u), bf(u))
	sum, t := bf(1), bf(1)
	for k := 1.0; k < 4000; k++ {
		t.Quo(t.Mul(t, q), bf(k))
		sum.Add(sum, t)
		if k > u*u && small(cplx{t, t}) {
			break
		}
	}
	e, _ := b0().Quo(bf(1), sum).Float64()
	return e
}
