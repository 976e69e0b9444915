package spectrum

import (
	"math"
	"slices"
)

// compareRough sets a function against w1 and dw, which describe its ends: where
// they disagree a number in the header is wrong.
func (s *Segment) compareRough(d *dispersion) {
	if d.kind != 2 || d.dw == 0 {
		return
	}
	for i := range d.parts {
		if k := d.parts[i].curve.bentAt(d.dw); k >= 0 {
			s.note("entry %d of the dispersion, %g, is out of line with those beside it: the header may be damaged", k+1, d.parts[i].curve.c[k])
		}
	}
	lo, hi := d.at(1)*(1+d.z), d.at(d.nw)*(1+d.z)
	tol := roughPixels * math.Abs(d.dw)
	if a, b := d.w1, d.w1+d.dw*(d.nw-1); math.Abs(lo-a) > tol || math.Abs(hi-b) > tol {
		s.note("the dispersion function runs from %.3f to %.3f, but w1, dw and nw of the header say %.3f to %.3f: one of them is wrong", lo, hi, a, b)
	}
}

// roughPixels is how far w1 and dw may lie from the function. Those of TRES and
// UCLES spectra agree to 1e-9 of a pixel; others may have rounded them.
const roughPixels = 0.1

// bentAt looks for entries of a table, or knots of a linear spline, that lie off
// the cubic through the two entries on either side by more than a part of a pixel
// (step, in the unit of the table) and ten times what is usual in it; −1 for none.
func (f *curve) bentAt(step float64) int {
	n := len(f.c)
	if n < 9 || f.kind < linearSpline {
		return -1
	}
	x := func(k int) float64 {
		if f.kind == linearSpline {
			return f.lo + (f.hi-f.lo)*float64(k)/float64(n-1)
		}
		return f.pixel(k)
	}
	off := make([]float64, 0, n)
	for k := 2; k+2 < n; k++ {
		sum := 0.0 // Lagrange
		for _, i := range []int{k - 2, k - 1, k + 1, k + 2} {
			w := 1.0
			for _, j := range []int{k - 2, k - 1, k + 1, k + 2} {
				if j != i {
					w *= (x(k) - x(j)) / (x(i) - x(j))
				}
			}
			sum += w * f.c[i]
		}
		off = append(off, math.Abs(f.c[k]-sum))
	}
	usual := slices.Clone(off)
	slices.Sort(usual)
	worst := 0
	for i := range off {
		if off[i] > off[worst] {
			worst = i
		}
	}
	if off[worst] > bentPixels*math.Abs(step) && off[worst] > 10*usual[len(usual)/4] {
		return worst + 2
	}
	return -1
}

// bentPixels is how far a table entry may lie off its neighbours.
const bentPixels = 0.3
