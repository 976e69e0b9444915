package voigt

import "math"

// Where each scheme holds; see the package's table of errors in the tests.
const (
	near  = 8.0      // |z| from which the asymptotic series serves
	thin  = 1.0 / 64 // damping up to which 8 Taylor coefficients do
	thick = 1.0 / 8  // damping up to which 14 Taylor coefficients do

	// Below this damping exp(−z²) still shows beside the asymptotic series of
	// Re w at |u| = 8; above it, less than one part in 10¹⁷.
	tiny = 1e-10
	// From this u on, 8 coefficients do not give 13 digits of exp(−u²), which is
	// all of Re w when a is tiny.
	sharp = 4.0
	// exp(−u²) is zero in doubles from here on.
	gone = 27.5
)

const (
	sqrtPi     = 1.772453850905516027298167483341145182798 // √π
	twoBySqrt  = 2 / sqrtPi
	overSqrtPi = 1 / sqrtPi
)

// Faddeeva returns the Faddeeva function
//
//	w(z) = exp(−z²) erfc(−iz) = (i/π) ∫ exp(−t²) / (z − t) dt   (Im z > 0),
//
// whose real part is the Voigt function, H(a, u) = Re w(u + ia).
//
// Accuracy: real and imaginary part each within 1e-13 (relative) for
// 1e-8 ≤ Im z ≤ 1e2, |Re z| ≤ 1e4, also where one is ten orders below the other;
// on the real axis w = exp(−x²) + i (2/√π) F(x) with F Dawson's integral. In the
// lower half plane w(z) = 2 exp(−z²) − w(−z), which overflows to ±Inf and loses
// relative accuracy near the zeros of w.
//
// Special cases: a NaN in z gives NaN + NaN i; w = 0 at infinity in the upper
// half plane and at Re z = ±Inf; w has no limit towards −i∞ but along the
// imaginary axis itself, where it is +Inf.
//
// Method: Taylor series about tabulated nodes on the real axis (Im z ≤ 1/8), the
// asymptotic series in 1/z² (|z| ≥ 8), else the trapezoidal rule with its pole
// term (Chiarella & Reichel 1968, Math. Comp. 22, 137; Matta & Reichel 1971,
// Math. Comp. 25, 339, both cited from memory). Definitions and symmetries: DLMF
// 7.2.3, 7.4.3, 7.7.2, https://dlmf.nist.gov/7.
func Faddeeva(z complex128) complex128 {
	u, a := real(z), imag(z)
	if u != u || a != a {
		return complex(math.NaN(), math.NaN())
	}
	if math.Signbit(a) && a != 0 {
		return lower(u, -a)
	}
	re, im := upper(a, math.Abs(u))
	return complex(re, math.Copysign(im, u))
}

// H returns the Voigt function
//
//	H(a, u) = (a/π) ∫ exp(−t²) / ((u − t)² + a²) dt = Re w(u + ia),
//
// for damping a = γλ/(4πb) and distance u from the line centre in Doppler
// widths. H(0, 0) = 1 and ∫ H du = √π for every a ≥ 0. Accuracy and method as
// Faddeeva; H(0, u) = exp(−u²); a < 0 continues the function analytically.
//
// Source: DLMF 7.19.1–7.19.4, https://dlmf.nist.gov/7.19 (there H(a,u) with this
// normalisation).
func H(a, u float64) float64 {
	if a >= 0 && u == u {
		re, _ := upper(a, math.Abs(u))
		return re
	}
	return real(Faddeeva(complex(u, a)))
}

// upper returns w(u + ia) for a ≥ 0, u ≥ 0, neither NaN.
func upper(a, u float64) (re, im float64) {
	if u < near && a <= thick {
		if a <= thin && (u < sharp || a >= tiny) {
			return taylor8(a, u)
		}
		return taylor14(a, u)
	}
	return beyond(a, u)
}

// beyond is upper outside the tabulated strip.
func beyond(a, u float64) (re, im float64) {
	m := u*u + a*a
	if a > thick && m < near*near {
		return trapezoid(a, u)
	}
	if m > 1e200 {
		return farthest(a, u)
	}
	re, im = far(a, u, m)
	if a < tiny && u < gone {
		re += gauss(u)
	}
	return re, im
}

// farthest returns i/(√π z), for |z| so large that |z|² may overflow.
func farthest(a, u float64) (re, im float64) {
	s := max(a, u)
	if math.IsInf(s, 1) {
		return 0, 0
	}
	a, u = a/s, u/s
	q := sqrtPi * (a*a + u*u)
	return a / q / s, u / q / s
}

// lower returns w(u − ia) for a > 0: 2 exp(−z²) − w(−z).
func lower(u, a float64) complex128 {
	if math.IsInf(a, 1) {
		if u == 0 {
			return complex(math.Inf(1), 0)
		}
		return complex(math.NaN(), math.NaN())
	}
	wr, wi := upper(a, math.Abs(u)) // w(−z) = w(−u + ia)
	wi = math.Copysign(wi, -u)
	if math.IsInf(u, 0) {
		return complex(-wr, -wi)
	}
	// −z² = (a − u)(a + u) + 2iua
	x := 2 * math.Exp((a-u)*(a+u))
	if x == 0 {
		return complex(-wr, -wi)
	}
	if u == 0 {
		return complex(x-wr, 0)
	}
	sin, cos := sincosProduct(2*u, a)
	return complex(x*cos-wr, x*sin-wi)
}

// sincosProduct returns sin and cos of xy with the rounding error of the
// product put back.
func sincosProduct(x, y float64) (sin, cos float64) {
	p := x * y
	e := math.FMA(x, y, -p)
	s, c := math.Sincos(p)
	return s + e*c, c - e*s
}

// gauss returns exp(−u²) with the rounding error of u² put back.
func gauss(u float64) float64 {
	q := u * u
	return math.Exp(-q) * (1 - math.FMA(u, u, -q))
}
