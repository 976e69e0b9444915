package cog

import "math"

const contourSteps = 36 // values of b on each branch

// contours traces χ² = minimum + delta around the best solution and around others
// that lie within it but apart.
func (f *fit) contours(delta float64) {
	lo, hi := f.contour(delta, f.bottom)
	for _, b := range f.others {
		if b.chi2 < f.bottom.chi2+delta && (b.y < lo || b.y > hi) {
			f.contour(delta, b)
		}
	}
}

// contour traces one closed curve in the plane of b and log N of the first
// detected level, with all other columns free: up along the branch of large N, back
// along that of small N. Where it runs into a bound of b it is cut there. It returns
// the range of ln b.
func (f *fit) contour(delta float64, from bottom) (lo, hi float64) {
	v := f.valley
	target := f.bottom.chi2 + delta
	lo, loOpen := f.closing(from, delta, -1)
	hi, hiOpen := f.closing(from, delta, 1)
	out := Contour{Delta: delta}
	if loOpen || hiOpen {
		out.Open = "b"
	}
	x := append([]float64(nil), from.x...)
	var back []float64
	for i := range contourSteps + 1 {
		// crowded towards the ends, where the branches meet at right angles
		t := (1 - math.Cos(math.Pi*float64(i)/contourSteps)) / 2
		y := lo + t*(hi-lo)
		at := bottom{y, v.solve(x, y, -1), x}
		up, down := x[0], x[0]
		if !(i == 0 && !loOpen || i == contourSteps && !hiOpen) {
			up, down = v.edge(at, 0, target, 1), v.edge(at, 0, target, -1)
		}
		if up >= mostN {
			out.Open = "b, log N"
			up = mostN
		}
		out.B = append(out.B, math.Exp(y))
		out.LogN = append(out.LogN, up)
		back = append(back, down)
	}
	for i := contourSteps; i >= 0; i-- {
		if i == contourSteps && !hiOpen {
			continue
		}
		out.B = append(out.B, out.B[i])
		out.LogN = append(out.LogN, back[i])
	}
	if loOpen { // the last edge, along the bound
		out.B = append(out.B, out.B[0])
		out.LogN = append(out.LogN, out.LogN[0])
	}
	f.res.Contours = append(f.res.Contours, out)
	return lo, hi
}
