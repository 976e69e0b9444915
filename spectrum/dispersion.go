package spectrum

import (
	"fmt"
	"math"
	"strings"

	"lacuna/spectrum/fits"
)

// A dispersion is the wavelength solution of one line of a multispec image, in
// the unit of WAT1. Its argument is the physical pixel, which counts from 1.
//
// Source: the multispec world coordinates of IRAF (help page "specwcs", 1993),
// with the two places where its text and its code differ taken from the code:
// functions are divided by the sum of their weights, and the Doppler factor
// divides the wavelength, also a logarithmic one.
type dispersion struct {
	aperture, beam int
	kind           int // −1 not calibrated, 0 linear, 1 log10, 2 functions
	w1, dw         float64
	nw             float64 // number of valid physical pixels
	z              float64
	parts          []part
}

// A part is one weighted function of a dispersion.
type part struct {
	weight, zero float64
	curve        curve
}

// A curve is one function W(P) of the physical pixel.
type curve struct {
	kind   int // as in the header: 1 Chebyshev … 6 sampled
	lo, hi float64
	c      []float64 // coefficients, or values
	x      []float64 // pixels of a sampled curve
}

// The function types of the header.
const (
	chebyshev = iota + 1
	legendre
	cubicSpline
	linearSpline
	pixelArray
	sampled
)

// at returns the wavelength of physical pixel p; NaN where a table does not
// reach it.
func (d *dispersion) at(p float64) float64 {
	w := d.w1 + d.dw*(p-1)
	switch d.kind {
	case 1:
		w = math.Pow(10, w)
	case 2:
		sum, weights := 0.0, 0.0
		for i := range d.parts {
			f := &d.parts[i]
			sum += f.weight * (f.zero + f.curve.at(p))
			weights += f.weight
		}
		w = sum / weights
	}
	return w / (1 + d.z)
}

// at evaluates the curve.
func (f *curve) at(p float64) float64 {
	switch f.kind {
	case chebyshev, legendre:
		return f.series((2*p - (f.hi + f.lo)) / (f.hi - f.lo))
	case cubicSpline, linearSpline:
		pieces := len(f.c) - 1
		if f.kind == cubicSpline {
			pieces -= 2
		}
		s := (p - f.lo) / (f.hi - f.lo) * float64(pieces)
		j := int(max(0, min(s, float64(pieces-1))))
		b := s - float64(j)
		a := 1 - b
		if f.kind == linearSpline {
			return a*f.c[j] + b*f.c[j+1]
		}
		return a*a*a*f.c[j] + (1+3*a*(1+a*b))*f.c[j+1] + (1+3*b*(1+a*b))*f.c[j+2] + b*b*b*f.c[j+3]
	}
	return f.table(p)
}

// series sums Chebyshev or Legendre polynomials of n by their recurrences.
func (f *curve) series(n float64) float64 {
	sum, last, now := 0.0, 1.0, n
	for k, c := range f.c {
		sum += c * last
		m := float64(k + 1)
		next := 2*n*now - last
		if f.kind == legendre {
			next = ((2*m+1)*n*now - m*last) / (m + 1)
		}
		last, now = now, next
	}
	return sum
}

// table interpolates linearly between the nearest entries, and half a pixel
// beyond the ends.
func (f *curve) table(p float64) float64 {
	if !(p >= f.pixel(0)-0.5) || !(p <= f.pixel(len(f.c)-1)+0.5) {
		return math.NaN()
	}
	return f.between(p)
}

// pixel returns the pixel of entry k.
func (f *curve) pixel(k int) float64 {
	if f.kind == sampled {
		return f.x[k]
	}
	return float64(k + 1)
}

// between lies on the straight line through the two entries next to p.
func (f *curve) between(p float64) float64 {
	lo, hi := 0, len(f.c)-2 // lo: the last entry with pixel ≤ p
	for lo < hi {
		if mid := (lo + hi + 1) / 2; f.pixel(mid) <= p {
			lo = mid
		} else {
			hi = mid - 1
		}
	}
	t := (p - f.pixel(lo)) / (f.pixel(lo+1) - f.pixel(lo))
	return f.c[lo] + t*(f.c[lo+1]-f.c[lo])
}

// parseDispersion reads the text of one specN:
//
//	aperture beam type w1 dw nw z low high [function …]
func parseDispersion(text string) (*dispersion, error) {
	words := strings.Fields(text)
	if len(words) < 7 {
		return nil, fmt.Errorf("%d numbers, at least 7 are needed", len(words))
	}
	v := make([]float64, len(words))
	for i, w := range words {
		x, ok := fits.ParseNumber(w)
		if !ok && i != 7 && i != 8 { // the aperture's limits may be INDEF
			return nil, fmt.Errorf("'%.40s' is not a number", w)
		}
		v[i] = x
	}
	for _, i := range []int{0, 1, 2, 5} {
		if v[i] != math.Trunc(v[i]) || math.Abs(v[i]) > 1e9 {
			return nil, fmt.Errorf("%s = %g is not an integer", []string{"aperture", "beam", "dtype", "", "", "nw"}[i], v[i])
		}
	}
	d := &dispersion{aperture: int(v[0]), beam: int(v[1]), kind: int(v[2]), w1: v[3], dw: v[4], nw: v[5], z: v[6]}
	if !(1+d.z > 0) {
		return nil, fmt.Errorf("1+z = %g is not positive", 1+d.z)
	}
	switch d.kind {
	case -1:
		return d, nil
	case 0, 1:
		if len(v) > 9 {
			return nil, fmt.Errorf("%d numbers too many", len(v)-9)
		}
		if d.dw == 0 {
			return nil, fmt.Errorf("dw = 0: all pixels would have one wavelength")
		}
		if end := d.w1 + d.dw*(d.nw-1); d.kind == 1 && !(d.w1 < 8 && end < 8) {
			return nil, fmt.Errorf("dtype 1 says log10 wavelengths, but w1 = %g: 10^%g is not a wavelength", d.w1, d.w1)
		}
	case 2:
		if len(v) < 10 {
			return nil, fmt.Errorf("dtype 2 without a function")
		}
		parts, err := parseParts(v[9:])
		if err != nil {
			return nil, err
		}
		d.parts = parts
		weights := 0.0
		for _, p := range parts {
			weights += p.weight
		}
		if weights == 0 {
			return nil, fmt.Errorf("the weights add up to 0")
		}
	default:
		return nil, fmt.Errorf("dtype %d is not known (-1, 0, 1, 2)", d.kind)
	}
	if !(d.nw >= 2) {
		return nil, fmt.Errorf("nw = %g valid pixels, at least 2 are needed", d.nw)
	}
	return d, nil
}

// parseParts reads functions until the numbers end.
func parseParts(v []float64) ([]part, error) {
	if len(v) == 0 {
		return nil, nil
	}
	if len(v) < 4 {
		return nil, fmt.Errorf("%d numbers are left over, too few for a function", len(v))
	}
	p := part{weight: v[0], zero: v[1], curve: curve{kind: int(v[2])}}
	n := v[3]
	if v[2] != math.Trunc(v[2]) || n != math.Trunc(n) || !(n >= 1) || n > 1e6 {
		return nil, fmt.Errorf("function type %g with %g coefficients", v[2], n)
	}
	var sizes []int // numbers that the function may take
	head := 4
	switch p.curve.kind {
	case chebyshev, legendre:
		sizes, head = []int{int(n)}, 6
	case cubicSpline:
		sizes, head = []int{int(n) + 3}, 6
	case linearSpline:
		sizes, head = []int{int(n) + 1}, 6
	case pixelArray:
		sizes = []int{int(n)}
	case sampled: // n counts pairs, or the numbers in them
		sizes, head = []int{2 * int(n), 2 * int(n/2)}, 5
	default:
		return nil, fmt.Errorf("function type %g is not known (1 to 6)", v[2])
	}
	var first error
	for _, size := range sizes {
		rest, err := p.take(v[3:], head-3, size)
		if err == nil {
			var more []part
			if more, err = parseParts(rest); err == nil {
				return append([]part{p}, more...), nil
			}
		}
		if first == nil {
			first = err
		}
	}
	return nil, first
}

// take reads head numbers of parameters and then size values or coefficients.
func (p *part) take(v []float64, head, size int) (rest []float64, err error) {
	f := &p.curve
	if len(v) < head+size {
		return nil, fmt.Errorf("function of type %d needs %d numbers, %d are left", f.kind, head+size, len(v))
	}
	values := v[head : head+size]
	switch f.kind {
	case sampled:
		f.x, f.c = nil, nil
		for k := 0; k+1 < size; k += 2 {
			if k > 0 && !(values[k] > values[k-2]) {
				return nil, fmt.Errorf("sampled pixels %g and %g do not ascend", values[k-2], values[k])
			}
			f.x, f.c = append(f.x, values[k]), append(f.c, values[k+1])
		}
	case pixelArray:
		f.c = values
	default:
		f.lo, f.hi, f.c = v[1], v[2], values
		if !(f.hi > f.lo) {
			return nil, fmt.Errorf("function of type %d from pixel %g to %g", f.kind, f.lo, f.hi)
		}
	}
	if (f.kind == sampled || f.kind == pixelArray) && len(f.c) < 2 {
		return nil, fmt.Errorf("a table of %d entries", len(f.c))
	}
	return v[head+size:], nil
}
