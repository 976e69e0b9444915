package cog

import "math"

// edge returns the value of column c at which, at y and with the other columns
// free, χ² has risen to target, above (side 1) or below (−1) the bottom there. x
// holds the bottom and is left as it was.
func (v *valley) edge(at bottom, c int, target, side float64) float64 {
	x := append([]float64(nil), at.x...)
	a, fa := at.x[c], math.Min(at.chi2-target, 0)
	if fa == 0 {
		return a
	}
	v.chi2(at.x, at.y, true)
	var h float64
	for _, d := range v.j[c] {
		h += d * d
	}
	step := math.Max(math.Min(math.Sqrt(-fa/math.Max(h, 1e-12)), 0.5), 1e-6)
	f := func(z float64) float64 {
		x[c] = z
		return v.solve(x, at.y, c) - target
	}
	for {
		b := a + side*step
		if b > mostN || b < v.x0[c]-6 {
			return b
		}
		if fb := f(b); fb > 0 {
			return root(f, a, fa, b, fb, 1e-6)
		} else {
			a, fa = b, fb
		}
		step *= 2
	}
}

// extreme returns the largest (side 1) or smallest (−1) value of column c with χ² at
// most target for y in lo .. hi, where the bottom lies below target.
func (v *valley) extreme(c int, target, side, lo, hi float64, from bottom) float64 {
	x := append([]float64(nil), from.x...)
	f := func(y float64) float64 {
		chi2 := v.solve(x, y, -1)
		return side * v.edge(bottom{y, chi2, x}, c, target, side)
	}
	const n = 8
	var ys, fs [n + 1]float64
	best := 0
	for i := range ys {
		ys[i] = lo + float64(i)/n*(hi-lo)
		fs[i] = f(ys[i])
		if fs[i] > fs[best] {
			best = i
		}
	}
	if hi-lo < 1e-9 {
		return side * fs[best]
	}
	// golden section between the neighbours
	a, b := ys[max(best-1, 0)], ys[min(best+1, n)]
	const g = 0.6180339887498949
	p, q := b-g*(b-a), a+g*(b-a)
	fp, fq := f(p), f(q)
	for range 14 {
		if fp >= fq {
			b, q, fq = q, p, fp
			p = b - g*(b-a)
			fp = f(p)
		} else {
			a, p, fp = p, q, fq
			q = a + g*(b-a)
			fq = f(q)
		}
	}
	return side * math.Max(fs[best], math.Max(fp, fq))
}

// root finds the zero of f between a (f ≤ 0) and b (f > 0) by the Illinois form of
// regula falsi, to tol.
func root(f func(float64) float64, a, fa, b, fb, tol float64) float64 {
	side := 0
	for range 60 {
		if math.Abs(b-a) <= tol {
			break
		}
		c := (a*fb - b*fa) / (fb - fa)
		if !(c > math.Min(a, b) && c < math.Max(a, b)) {
			c = a + (b-a)/2
		}
		fc := f(c)
		switch {
		case math.Abs(fc) < 1e-7:
			return c
		case fc > 0:
			b, fb = c, fc
			if side == 1 {
				fa /= 2
			}
			side = 1
		default:
			a, fa = c, fc
			if side == -1 {
				fb /= 2
			}
			side = -1
		}
	}
	return a + (b-a)/2
}
