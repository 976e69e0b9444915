package voigt

import "math"

// Fill computes H and its derivatives for one damping a and many distances u:
//
//	h[i]  = H(a, u[i])
//	hu[i] = ∂H/∂u = 2 (aL − uH)
//	ha[i] = ∂H/∂a = 2 (uL + aH) − 2/√π,   L = Im w(u + ia).
//
// All slices have the length of u, or Fill panics; hu and ha may be nil. h is as
// accurate as H. In the wings (|z| ≥ 8) the derivatives come from a series of
// their own and keep 12 digits; nearer the centre they are good to 2e-13 of the
// larger of their terms.
//
// Where u ascends, the ranges of the different series are found once and each is
// run through in a plain loop; any other order, NaN included, is done point by
// point. Source: w′ = −2zw + 2i/√π, DLMF 7.10.2, https://dlmf.nist.gov/7.10.
func Fill(h, hu, ha []float64, a float64, u []float64) {
	n := len(u)
	if len(h) != n || (hu != nil && len(hu) != n) || (ha != nil && len(ha) != n) {
		panic("voigt: Fill: slices differ in length")
	}
	plain := hu == nil && ha == nil
	// A derivative that nobody asked for is written to h, then overwritten by h.
	if hu == nil {
		hu = h
	}
	if ha == nil {
		ha = h
	}
	r := run{h, hu, ha, u, a}
	if !(a >= 0 && a < 1e100) || !ascends(u) || n > 0 && (u[0] < -1e100 || u[n-1] > 1e100) {
		r.point()
		return
	}
	all := r
	r8, r9, r5, r3 := near, far9, far5, far3
	if a > thick { // the series go by |z|; in the strip |u| does as well
		r8, r9, r5, r3 = reach(near, a), reach(far9, a), reach(far5, a), reach(far3, a)
	}
	r.upTo(-r3).series3()
	r.upTo(-r5).series5()
	r.upTo(-r9).series9()
	r.upTo(-r8).series14()
	core := r.below(r8)
	switch {
	case a <= thin && plain:
		core.taylor8H()
	case a <= thin:
		core.taylor8()
	case a <= thick:
		core.taylor14()
	default:
		core.trapezoid()
	}
	r.below(r9).series14()
	r.below(r5).series9()
	r.below(r3).series5()
	r.series3()
	if a < tiny { // exp(−u²) shows: as in upper and beyond
		all.upTo(-gone)
		all.upTo(-near).addGauss()
		all.upTo(-sharp).taylor14()
		all.below(sharp)
		all.below(near).taylor14()
		all.below(gone).addGauss()
	}
}

// A run is a stretch of Fill's work that one method does.
type run struct {
	h, hu, ha, u []float64
	a            float64
}

// upTo takes the leading elements u ≤ x off the run.
func (r *run) upTo(x float64) run {
	return r.cut(count(r.u, x, true))
}

// below takes the leading elements u < x off the run.
func (r *run) below(x float64) run {
	return r.cut(count(r.u, x, false))
}

func (r *run) cut(n int) run {
	first := run{r.h[:n], r.hu[:n], r.ha[:n], r.u[:n], r.a}
	r.h, r.hu, r.ha, r.u = r.h[n:], r.hu[n:], r.ha[n:], r.u[n:]
	return first
}

// count returns how many elements of the ascending u are below x, or at most x.
func count(u []float64, x float64, orEqual bool) int {
	lo, hi := 0, len(u)
	for lo < hi {
		mid := int(uint(lo+hi) >> 1)
		if u[mid] < x || orEqual && u[mid] == x {
			lo = mid + 1
		} else {
			hi = mid
		}
	}
	return lo
}

// reach returns the |u| at which |u + ia| = r, 0 if a is larger.
func reach(r, a float64) float64 { return math.Sqrt(max(0, (r-a)*(r+a))) }

// ascends reports whether no element is below its predecessor and none is NaN.
func ascends(u []float64) bool {
	last := math.Inf(-1)
	for _, x := range u {
		if !(x >= last) {
			return false
		}
		last = x
	}
	return true
}

// point does any a and u, one by one.
func (r run) point() {
	a := r.a
	for i, u := range r.u {
		m := u*u + a*a
		switch {
		case !(a >= 0 && m >= near*near): // inside, lower half plane, NaN
			w := Faddeeva(complex(u, a))
			r.hu[i], r.ha[i] = derivatives(a, u, real(w), imag(w))
			r.h[i] = real(w)
		case m < 1e200:
			one := run{r.h[i : i+1], r.hu[i : i+1], r.ha[i : i+1], r.u[i : i+1], a}
			one.series14()
			if a < tiny {
				one.addGauss()
			}
		default: // derivatives of order |z|⁻²
			r.hu[i], r.ha[i] = 0, 0
			r.h[i] = H(a, u)
		}
	}
}

// addGauss adds exp(−u²) to what the series gave, for hardly any damping. Its
// part of ∂H/∂a is of order a exp(−u²) and left out.
func (r run) addGauss() {
	for i, u := range r.u {
		h, g := r.h[i], gauss(u)
		r.hu[i] -= 2 * u * g
		r.h[i] = h + g
	}
}

// derivatives returns ∂H/∂u and ∂H/∂a from w(u + ia) = re + i im.
func derivatives(a, u, re, im float64) (hu, ha float64) {
	return 2 * (a*im - u*re), 2*(u*im+a*re) - twoBySqrt
}

func (r run) taylor8() {
	u := r.u
	h, hu, ha, a := r.h[:len(u)], r.hu[:len(u)], r.ha[:len(u)], r.a
	for i, u := range u {
		re, im := taylor8(a, math.Abs(u))
		hu[i], ha[i] = derivatives(a, u, re, math.Copysign(im, u))
		h[i] = re
	}
}

// taylor8H is taylor8 for H alone, written out: most calls want no more.
func (r run) taylor8H() {
	u := r.u
	h, a := r.h[:len(u)], r.a
	aa := a * a
	for i, u := range u {
		u = math.Abs(u)
		n := int(u*64 + 0.5)
		c := &nodes[n]
		d := u - float64(n)*(1.0/64)
		p, q := 2*d, d*d+aa
		r1, r0 := c[12]+p*c[14], c[10]-q*c[14]
		s1, s0 := c[13]+p*c[15], c[11]-q*c[15]
		r1, r0 = r0+p*r1, c[8]-q*r1
		s1, s0 = s0+p*s1, c[9]-q*s1
		r1, r0 = r0+p*r1, c[6]-q*r1
		s1, s0 = s0+p*s1, c[7]-q*s1
		r1, r0 = r0+p*r1, c[4]-q*r1
		s1, s0 = s0+p*s1, c[5]-q*s1
		r1, r0 = r0+p*r1, c[2]-q*r1
		s1, s0 = s0+p*s1, c[3]-q*s1
		r1, r0 = r0+p*r1, c[0]-q*r1
		h[i] = r0 + d*r1 - a*(s0+p*s1)
	}
}

func (r run) taylor14() {
	u := r.u
	h, hu, ha, a := r.h[:len(u)], r.hu[:len(u)], r.ha[:len(u)], r.a
	for i, u := range u {
		re, im := taylor14(a, math.Abs(u))
		hu[i], ha[i] = derivatives(a, u, re, math.Copysign(im, u))
		h[i] = re
	}
}

func (r run) trapezoid() {
	u := r.u
	h, hu, ha, a := r.h[:len(u)], r.hu[:len(u)], r.ha[:len(u)], r.a
	for i, u := range u {
		re, im := trapezoid(a, math.Abs(u))
		hu[i], ha[i] = derivatives(a, u, re, math.Copysign(im, u))
		h[i] = re
	}
}
