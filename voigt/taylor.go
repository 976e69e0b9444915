package voigt

// Within the strip 0 ≤ a ≤ 1/8, |u| < 8 the function is expanded about the
// nearest node x on the real axis, w(x + ζ) = Σ (r_m + i s_m) ζ^m, ζ = d + ia.
// The two series have real coefficients and are summed apart,
//
//	Σ r_m ζ^m = r₀ + d r₁ + i a r₁,   likewise s,
//
// with r₀, r₁ from the recurrence for real coefficients (p = 2d, q = |ζ|²). So
// Re w = exp-part − a (Dawson part) never meets a number larger than itself,
// however small a is.

// taylor8 returns w(u + ia) for 0 ≤ a ≤ 1/64, 0 ≤ u < 8.
func taylor8(a, u float64) (re, im float64) {
	n := int(u*64 + 0.5)
	c := &nodes[n]
	d := u - float64(n)*(1.0/64)
	p, q := 2*d, d*d+a*a
	r1, s1 := c[14], c[15]
	r0, s0 := c[12], c[13]
	r1, r0 = r0+p*r1, c[10]-q*r1
	s1, s0 = s0+p*s1, c[11]-q*s1
	r1, r0 = r0+p*r1, c[8]-q*r1
	s1, s0 = s0+p*s1, c[9]-q*s1
	r1, r0 = r0+p*r1, c[6]-q*r1
	s1, s0 = s0+p*s1, c[7]-q*s1
	r1, r0 = r0+p*r1, c[4]-q*r1
	s1, s0 = s0+p*s1, c[5]-q*s1
	r1, r0 = r0+p*r1, c[2]-q*r1
	s1, s0 = s0+p*s1, c[3]-q*s1
	r1, r0 = r0+p*r1, c[0]-q*r1
	s1, s0 = s0+p*s1, c[1]-q*s1
	return r0 + d*r1 - a*s1, s0 + d*s1 + a*r1
}

// taylor14 returns w(u + ia) for 0 ≤ a ≤ 1/8, 0 ≤ u < 8.
func taylor14(a, u float64) (re, im float64) {
	n := int(u*64 + 0.5)
	c := &nodes[n]
	d := u - float64(n)*(1.0/64)
	p, q := 2*d, d*d+a*a
	r1, s1 := c[26], c[27]
	r0, s0 := c[24], c[25]
	r1, r0 = r0+p*r1, c[22]-q*r1
	s1, s0 = s0+p*s1, c[23]-q*s1
	r1, r0 = r0+p*r1, c[20]-q*r1
	s1, s0 = s0+p*s1, c[21]-q*s1
	r1, r0 = r0+p*r1, c[18]-q*r1
	s1, s0 = s0+p*s1, c[19]-q*s1
	r1, r0 = r0+p*r1, c[16]-q*r1
	s1, s0 = s0+p*s1, c[17]-q*s1
	r1, r0 = r0+p*r1, c[14]-q*r1
	s1, s0 = s0+p*s1, c[15]-q*s1
	r1, r0 = r0+p*r1, c[12]-q*r1
	s1, s0 = s0+p*s1, c[13]-q*s1
	r1, r0 = r0+p*r1, c[10]-q*r1
	s1, s0 = s0+p*s1, c[11]-q*s1
	r1, r0 = r0+p*r1, c[8]-q*r1
	s1, s0 = s0+p*s1, c[9]-q*s1
	r1, r0 = r0+p*r1, c[6]-q*r1
	s1, s0 = s0+p*s1, c[7]-q*s1
	r1, r0 = r0+p*r1, c[4]-q*r1
	s1, s0 = s0+p*s1, c[5]-q*s1
	r1, r0 = r0+p*r1, c[2]-q*r1
	s1, s0 = s0+p*s1, c[3]-q*s1
	r1, r0 = r0+p*r1, c[0]-q*r1
	s1, s0 = s0+p*s1, c[1]-q*s1
	return r0 + d*r1 - a*s1, s0 + d*s1 + a*r1
}
