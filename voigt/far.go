package voigt

// For |z| ≥ 8 the asymptotic series
//
//	w(z) = (i/√π)(1/z) (1 + V),  V = Σ_{m≥1} (2m−1)!! / (2z²)^m
//
// (DLMF 7.12.1) is summed in ζ = 1/z² with real coefficients, so that the
// imaginary part of V keeps its relative accuracy when a is tiny. V also gives
// the derivative without cancellation, w′ = −(2i/√π) V.
const (
	f1  = 1.0 / 2
	f2  = f1 * 3 / 2
	f3  = f2 * 5 / 2
	f4  = f3 * 7 / 2
	f5  = f4 * 9 / 2
	f6  = f5 * 11 / 2
	f7  = f6 * 13 / 2
	f8  = f7 * 15 / 2
	f9  = f8 * 17 / 2
	f10 = f9 * 19 / 2
	f11 = f10 * 21 / 2
	f12 = f11 * 23 / 2
	f13 = f12 * 25 / 2
	f14 = f13 * 27 / 2
)

// Radii |z| from which 9, 5 and 3 terms give 13 digits of w; from 8 on it takes 14.
const (
	far9, far5, far3 = 12.0, 50.0, 1000.0
)

// invert returns 1/z = x − iy and ζ = 1/z² = c + is, |ζ|² = q.
func invert(a, u float64) (x, y, c, s, q float64) {
	t := 1 / (u*u + a*a)
	x, y = u*t, a*t
	return x, y, (x - y) * (x + y), -2 * x * y, t * t
}

// sum14 returns V to 14 terms.
func sum14(c, s, q float64) (vr, vi float64) {
	p := 2 * c
	r1, r0 := f13+p*f14, f12-q*f14
	r1, r0 = r0+p*r1, f11-q*r1
	r1, r0 = r0+p*r1, f10-q*r1
	r1, r0 = r0+p*r1, f9-q*r1
	r1, r0 = r0+p*r1, f8-q*r1
	r1, r0 = r0+p*r1, f7-q*r1
	r1, r0 = r0+p*r1, f6-q*r1
	r1, r0 = r0+p*r1, f5-q*r1
	r1, r0 = r0+p*r1, f4-q*r1
	r1, r0 = r0+p*r1, f3-q*r1
	r1, r0 = r0+p*r1, f2-q*r1
	r1, r0 = r0+p*r1, f1-q*r1
	r1, r0 = r0+p*r1, -q*r1
	return r0 + c*r1, s * r1
}

// sum9 returns V to 9 terms.
func sum9(c, s, q float64) (vr, vi float64) {
	p := 2 * c
	r1, r0 := f8+p*f9, f7-q*f9
	r1, r0 = r0+p*r1, f6-q*r1
	r1, r0 = r0+p*r1, f5-q*r1
	r1, r0 = r0+p*r1, f4-q*r1
	r1, r0 = r0+p*r1, f3-q*r1
	r1, r0 = r0+p*r1, f2-q*r1
	r1, r0 = r0+p*r1, f1-q*r1
	r1, r0 = r0+p*r1, -q*r1
	return r0 + c*r1, s * r1
}

// sum5 returns V to 5 terms.
func sum5(c, s, q float64) (vr, vi float64) {
	p := 2 * c
	r1, r0 := f4+p*f5, f3-q*f5
	r1, r0 = r0+p*r1, f2-q*r1
	r1, r0 = r0+p*r1, f1-q*r1
	r1, r0 = r0+p*r1, -q*r1
	return r0 + c*r1, s * r1
}

// sum3 returns V to 3 terms.
func sum3(c, s, q float64) (vr, vi float64) {
	p := 2 * c
	r1, r0 := f2+p*f3, f1-q*f3
	r1, r0 = r0+p*r1, -q*r1
	return r0 + c*r1, s * r1
}

// far returns w(u + ia) for m = u² + a² ≥ 64.
func far(a, u, m float64) (re, im float64) {
	x, y, c, s, q := invert(a, u)
	var vr, vi float64
	switch {
	case m >= far3*far3:
		vr, vi = sum3(c, s, q)
	case m >= far5*far5:
		vr, vi = sum5(c, s, q)
	case m >= far9*far9:
		vr, vi = sum9(c, s, q)
	default:
		vr, vi = sum14(c, s, q)
	}
	return overSqrtPi * (y + y*vr - x*vi), overSqrtPi * (x + x*vr + y*vi)
}

func (r run) series14() {
	u := r.u
	h, hu, ha, a := r.h[:len(u)], r.hu[:len(u)], r.ha[:len(u)], r.a
	for i, u := range u {
		x, y, c, s, q := invert(a, u)
		vr, vi := sum14(c, s, q)
		ha[i], hu[i] = twoBySqrt*vr, twoBySqrt*vi
		h[i] = overSqrtPi * (y + y*vr - x*vi)
	}
}

func (r run) series9() {
	u := r.u
	h, hu, ha, a := r.h[:len(u)], r.hu[:len(u)], r.ha[:len(u)], r.a
	for i, u := range u {
		x, y, c, s, q := invert(a, u)
		vr, vi := sum9(c, s, q)
		ha[i], hu[i] = twoBySqrt*vr, twoBySqrt*vi
		h[i] = overSqrtPi * (y + y*vr - x*vi)
	}
}

func (r run) series5() {
	u := r.u
	h, hu, ha, a := r.h[:len(u)], r.hu[:len(u)], r.ha[:len(u)], r.a
	for i, u := range u {
		x, y, c, s, q := invert(a, u)
		vr, vi := sum5(c, s, q)
		ha[i], hu[i] = twoBySqrt*vr, twoBySqrt*vi
		h[i] = overSqrtPi * (y + y*vr - x*vi)
	}
}

func (r run) series3() {
	u := r.u
	h, hu, ha, a := r.h[:len(u)], r.hu[:len(u)], r.ha[:len(u)], r.a
	for i, u := range u {
		x, y, c, s, q := invert(a, u)
		vr, vi := sum3(c, s, q)
		ha[i], hu[i] = twoBySqrt*vr, twoBySqrt*vi
		h[i] = overSqrtPi * (y + y*vr - x*vi)
	}
}
