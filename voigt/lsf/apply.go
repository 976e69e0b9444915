package lsf

import "gonum.org/v1/gonum/floats"

// Apply sets dst[i] to the flux of pixel i for the transmission t on the
// sub-grid: len(dst) pixels, len(t) = len(r.Sub), or it panics. No allocation.
func (r Response) Apply(dst, t []float64) {
	r.check(dst, t)
	for i, w := range r.Weight {
		first := r.First[i]
		dst[i] = floats.Dot(w, t[first:first+len(w)])
	}
}

// ApplyWithin is Apply for a t that is zero outside the indices from ≤ j < to,
// whatever t holds there. It touches only the pixels that see this range, sets
// the others to 0, and returns the range of pixels that it touched.
func (r Response) ApplyWithin(dst, t []float64, from, to int) (first, last int) {
	r.check(dst, t)
	first, last = r.Seeing(from, to)
	clear(dst[:first])
	clear(dst[last:])
	for i := first; i < last; i++ {
		w, f := r.Weight[i], r.First[i]
		lo, hi := max(from, f), min(to, f+len(w))
		dst[i] = floats.Dot(w[lo-f:hi-f], t[lo:hi])
	}
	return first, last
}

// Seeing returns the range of pixels first ≤ i < last whose weights touch the
// sub-grid indices from ≤ j < to.
func (r Response) Seeing(from, to int) (first, last int) {
	n := len(r.First)
	if from >= to {
		return 0, 0
	}
	lo, hi := 0, n // first pixel whose end lies beyond from
	for lo < hi {
		if mid := (lo + hi) / 2; r.First[mid]+len(r.Weight[mid]) <= from {
			lo = mid + 1
		} else {
			hi = mid
		}
	}
	first, hi = lo, n
	for lo < hi { // first pixel that starts at or beyond to
		if mid := (lo + hi) / 2; r.First[mid] < to {
			lo = mid + 1
		} else {
			hi = mid
		}
	}
	return first, lo
}

// Outside flags the pixels that draw more than the fraction tol of their light
// from wavelengths outside lo … hi (Å): where the transmission is known or
// trusted only inside, as at the end of an order or of a template, they suffer
// from its edge.
func (r Response) Outside(lo, hi, tol float64) []bool {
	flag := make([]bool, len(r.First))
	from, to := atLeast(r.Sub, lo), atLeast(r.Sub, hi)
	for i, w := range r.Weight {
		f := r.First[i]
		a, b := min(max(from-f, 0), len(w)), min(max(to-f, 0), len(w))
		flag[i] = floats.Sum(w[:a])+floats.Sum(w[b:]) > tol
	}
	return flag
}

func (r Response) check(dst, t []float64) {
	if len(dst) != len(r.First) || len(t) != len(r.Sub) {
		panic("lsf: the slices do not fit the response")
	}
}
