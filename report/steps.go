package report

import (
	"math"
	"sort"
)

// pixelEdges returns the lower and upper edge of each pixel: half-way to its
// neighbours, and where a neighbour is missing as far as on the other side. A
// pixel followed by more than 1.6 times the usual distance ends a run.
func pixelEdges(v []float64) (lo, hi []float64, joined []bool) {
	n := len(v)
	lo, hi, joined = make([]float64, n), make([]float64, n), make([]bool, n)
	if n == 0 {
		return
	}
	usual := 1.0
	if n > 1 {
		d := make([]float64, n-1)
		for i := range d {
			d[i] = v[i+1] - v[i]
		}
		sort.Float64s(d)
		usual = d[len(d)/2]
	}
	for i := range v {
		before, after := usual, usual
		if i > 0 && v[i]-v[i-1] <= 1.6*usual {
			before, joined[i] = v[i]-v[i-1], true
		}
		if i+1 < n && v[i+1]-v[i] <= 1.6*usual {
			after = v[i+1] - v[i]
		}
		lo[i], hi[i] = v[i]-before/2, v[i]+after/2
	}
	return lo, hi, joined
}

// outline returns the steps of the pixels for which keep is true, as one curve
// with NaN between runs: each pixel is level from edge to edge.
func outline(v, y []float64, keep func(i int) bool) (ox, oy []float64) {
	lo, hi, joined := pixelEdges(v)
	open := false
	for i := range v {
		if !keep(i) || !finite(v[i], y[i]) {
			open = false
			continue
		}
		if !(open && joined[i]) && len(ox) > 0 {
			ox, oy = append(ox, math.NaN()), append(oy, math.NaN())
		}
		ox, oy = append(ox, lo[i], hi[i]), append(oy, y[i], y[i])
		open = true
	}
	return ox, oy
}

// spans returns the edges of each run of pixels for which keep is true.
func spans(v []float64, keep func(i int) bool) [][2]float64 {
	lo, hi, joined := pixelEdges(v)
	var out [][2]float64
	open := false
	for i := range v {
		switch {
		case !keep(i):
			open = false
			continue
		case open && joined[i]:
			out[len(out)-1][1] = hi[i]
		default:
			out = append(out, [2]float64{lo[i], hi[i]})
		}
		open = true
	}
	return out
}

// value returns a[i], or 0 where the slice is shorter.
func value[T any](a []T, i int) (x T) {
	if i < len(a) {
		x = a[i]
	}
	return x
}
