package voigt

import "math"

// trapezoid returns w(u + ia) for a > 1/8, |z| < 8, u ≥ 0, by the trapezoidal
// rule with step h = ½ on the integral of Faddeeva. Nodes are kh or (k+½)h,
// whichever lie farther from u. The pair ±t gives
//
//	2iz/(z² − t²) = [2a(|z|² + t²) + 2iu(|z|² − t²)] / |z² − t²|²,
//
// and the pole at t = z adds ∓2 exp(−z²) E/(1 ∓ E), E = exp(2πiz/h) (upper sign:
// nodes kh). What is left is of order exp(−π²/h²) = 7e-18.
func trapezoid(a, u float64) (re, im float64) {
	f := 2 * u
	f -= math.Floor(f + 0.5) // steps from the nearest kh, −½ … ½
	m := u*u + a*a
	dif, x4 := (u-a)*(u+a), 4*u*u*a*a // |z² − t²|² = (u² − a² − t²)² + 4u²a²
	on := f >= 0.25 || f <= -0.25
	nodes := &offNodes
	if on { // t = 0 has no partner: half of what its pair will give
		nodes = &onNodes
		g := nodes[0][1] / (dif*dif + x4)
		re = -g * m / 2
		im = re
	}
	for k := range nodes {
		t := nodes[k][0]
		d := dif - t
		g := nodes[k][1] / (d*d + x4)
		re += g * (m + t)
		im += g * (m - t)
	}
	re, im = 2*a*re, 2*u*im
	e := -dif - 4*math.Pi*a       // log |exp(−z²) E|
	if e < -42 || a > 2*math.Pi { // nothing in 10¹⁶, or the pole beyond the strip π/h
		return re, im
	}
	phase := 2 * math.Pi * f // of E, whole turns taken off
	sin, cos := math.Sincos(phase - 2*u*a)
	g := 2 * math.Exp(e)
	nr, ni := g*cos, g*sin
	sin, cos = math.Sincos(phase)
	g = math.Exp(-4 * math.Pi * a)
	dr, di := 1+g*cos, g*sin
	if on {
		nr, ni, dr, di = -nr, -ni, 1-g*cos, -g*sin
	}
	g = 1 / (dr*dr + di*di)
	return re + g*(nr*dr+ni*di), im + g*(ni*dr-nr*di)
}
