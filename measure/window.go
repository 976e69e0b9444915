package measure

import (
	"math"
)

// findWindow looks for the line within p.Window: from its deepest point outwards
// to where the flux has come back to within 1σ of the continuum for three pixels,
// which are kept, since the wings go on there. Another dip of three pixels or more
// beyond 1σ, and of 4σ together, less than a resolution element further on
// belongs to the same line.
func (w *work) findWindow() {
	lo, hi := -1, -1
	for i := range w.v {
		if w.v[i] >= w.p.Window[0] && w.v[i] <= w.p.Window[1] {
			if lo < 0 {
				lo = i
			}
			hi = i
		}
	}
	if lo < 0 || hi-lo < 4 {
		w.note("the range to search has fewer than five pixels: it is the window")
		return
	}
	noise := w.p.Continuum.Noise
	deepest, depth, sig := -1, 0.0, 0.0
	for i := lo; i <= hi; i++ {
		d, s, n := 0.0, 0.0, 0
		for j := max(i-1, lo); j <= min(i+1, hi); j++ {
			if !w.bad[j] {
				d, s, n = d+1-w.f[j], s+w.sigma[j]*w.sigma[j], n+1
			}
		}
		if n > 0 && (deepest < 0 || d/float64(n) > depth) {
			deepest, depth, sig = i, d/float64(n), math.Sqrt(s*noise.Tau(3))/float64(n)
		}
	}
	// The deepest of many triples of pixels: 4σ, not 3, to be a line.
	if deepest < 0 || !(depth >= 4*sig) {
		w.note("no line found from %.1f to %.1f km/s: the range searched is the window", w.p.Window[0], w.p.Window[1])
		return
	}
	a, b := w.walk(deepest, -1, lo), w.walk(deepest, 1, hi)
	vel := func(i int) float64 { return velocity(w.edge[i], w.p.Line.Wave) }
	w.out.Window = [2]float64{max(vel(a), w.p.Window[0]), min(vel(b+1), w.p.Window[1])}
	w.note("window found: %.1f to %.1f km/s", w.out.Window[0], w.out.Window[1])
	if a == lo || b == hi {
		w.note("the line reaches the end of the range searched")
	}
}

// walk goes from pixel i towards end and returns the last pixel of the line.
func (w *work) walk(i, step, end int) int {
	within := func(j int) bool { return !w.bad[j] && 1-w.f[j] < w.sigma[j] }
	gap := 3
	if w.p.FWHM > 0 {
		gap = max(gap, int(math.Ceil(w.p.FWHM/w.pixelAt(i))))
	}
	for {
		quiet, j := 0, i
		for j != end && quiet < 3 {
			j += step
			switch {
			case w.bad[j]:
			case within(j):
				quiet++
			default:
				quiet = 0
			}
		}
		if j == end {
			return end
		}
		next := w.dip(j, step, end, gap)
		if next < 0 {
			return j
		}
		i = next
	}
}

// dip looks up to gap pixels on for another part of the line and returns a pixel
// inside it, or −1.
func (w *work) dip(j, step, end, gap int) int {
	for k := j; k != end && (k-j)*step < gap; {
		k += step
		run, sum, v := 0, 0.0, 0.0
		q := k
		for ; q != end && !w.bad[q] && 1-w.f[q] >= w.sigma[q]; q += step {
			run, sum, v = run+1, sum+1-w.f[q], v+w.sigma[q]*w.sigma[q]
		}
		if run >= 3 && sum >= 4*math.Sqrt(v*w.p.Continuum.Noise.Tau(run)) {
			return q - step
		}
	}
	return -1
}

func (w *work) pixelAt(i int) float64 {
	return velocity(w.edge[i+1], w.p.Line.Wave) - velocity(w.edge[i], w.p.Line.Wave)
}
