package cog

import "math"

// A valley is χ² over log N of each level and y = ln b, on surfaces: fast enough
// to be looked at from all sides.
type valley struct {
	d          *data
	surf       []*surface // one a point
	ymin, ymax float64

	x0     []float64   // where solutions start
	m, r   []float64   // model, residuals
	j      [][]float64 // derivatives by each column
	normal [][]float64 // JᵀJ
	step   []float64
	slope  []float64 // −½ ∂χ²/∂x
	trial  []float64
}

func newValley(d *data, bmin, bmax float64) *valley {
	n := len(d.pts)
	v := &valley{d: d, ymin: math.Log(bmin), ymax: math.Log(bmax),
		m: make([]float64, n), r: make([]float64, n), step: make([]float64, d.cols), slope: make([]float64, d.cols), trial: make([]float64, d.cols), x0: make([]float64, d.cols)}
	most := 0.
	best := make([]float64, d.cols)
	for i, p := range d.pts[:d.gauss] {
		sn := p.W / d.sigma(i)
		most = math.Max(most, sn)
		if sn > best[d.col[i]] {
			best[d.col[i]] = sn
			v.x0[d.col[i]] = math.Log10(Linear(p.W, p.Line))
		}
	}
	// the error of a surface, 6e-5 coarse⁴ of W at worst, is at most 1/30 of the error of a width
	coarse := math.Max(0.4, math.Min(math.Pow(550/most, 0.25), 2))
	for i := range d.pts {
		v.surf = append(v.surf, newSurface(&d.pts[i].Line, 21, bmin, bmax, coarse))
	}
	for range d.cols {
		v.j = append(v.j, make([]float64, n))
		v.normal = append(v.normal, make([]float64, d.cols))
	}
	return v
}

// chi2 returns χ² at x, y; with derivatives it leaves r and j behind.
func (v *valley) chi2(x []float64, y float64, derivatives bool) float64 {
	for c := range v.j {
		if derivatives {
			clear(v.j[c])
		}
	}
	for i, s := range v.surf {
		c := v.d.col[i]
		w, slope := s.width(x[c], y)
		v.m[i] = w
		if derivatives {
			v.j[c][i] = slope
		}
	}
	v.d.residuals(v.r, v.m)
	var sum float64
	for _, r := range v.r {
		sum += r * r
	}
	if derivatives {
		for c := range v.j {
			v.d.derivatives(v.j[c], v.m)
		}
	}
	return sum
}

// solve minimizes χ² over x at y, but for column hold (−1: none), in place, by
// damped Gauss–Newton steps, and returns it.
func (v *valley) solve(x []float64, y float64, hold int) float64 {
	if v.d.cols == 1 && hold == 0 {
		return v.chi2(x, y, false)
	}
	damp := 0.
	now := v.chi2(x, y, true)
	for range 60 {
		gain := v.gaussNewton(x, hold, damp)
		if !(gain > 1e-7) {
			break
		}
		next := v.chi2(v.trial, y, false)
		if next <= now {
			copy(x, v.trial)
			if now-next < 1e-7 {
				now = next
				break
			}
			now = v.chi2(x, y, true)
			if damp *= 0.2; damp < 1e-3 {
				damp = 0
			}
			continue
		}
		damp = math.Max(4*damp, 1e-2)
		if damp > 1e8 {
			break
		}
		v.chi2(x, y, true)
	}
	return now
}

// gaussNewton sets trial to x plus a step, at most one dex in each column, and
// returns by how much it should lower χ².
func (v *valley) gaussNewton(x []float64, hold int, damp float64) (gain float64) {
	n := v.d.cols
	for a := range n {
		var g float64
		for i, r := range v.r {
			g -= v.j[a][i] * r
		}
		v.step[a], v.slope[a] = g, g
		for b := range a + 1 {
			var s float64
			for i := range v.r {
				s += v.j[a][i] * v.j[b][i]
			}
			v.normal[a][b], v.normal[b][a] = s, s
		}
	}
	for a := range n {
		if a == hold {
			v.step[a] = 0
			for b := range n {
				v.normal[a][b], v.normal[b][a] = 0, 0
			}
			v.normal[a][a] = 1
		}
		v.normal[a][a] = v.normal[a][a]*(1+damp) + 1e-30
	}
	solveSymmetric(v.normal, v.step)
	for a := range n {
		v.trial[a] = math.Max(v.x0[a]-3, math.Min(x[a]+math.Max(-1, math.Min(v.step[a], 1)), mostN))
		gain += v.slope[a] * (v.trial[a] - x[a])
	}
	return gain
}

// solveSymmetric solves a x = b in place of b by Gaussian elimination; a, small
// and positive definite, becomes triangular.
func solveSymmetric(a [][]float64, b []float64) {
	n := len(b)
	for k := range n {
		for i := k + 1; i < n; i++ {
			f := a[i][k] / a[k][k]
			for j := k + 1; j < n; j++ {
				a[i][j] -= f * a[k][j]
			}
			b[i] -= f * b[k]
		}
	}
	for k := n - 1; k >= 0; k-- {
		for j := k + 1; j < n; j++ {
			b[k] -= a[k][j] * b[j]
		}
		b[k] /= a[k][k]
	}
}

// A bottom is the lowest χ² at one b.
type bottom struct {
	y, chi2 float64
	x       []float64
}

// scan returns the bottom of the valley at n values of ln b, ascending.
func (v *valley) scan(n int) []bottom {
	out := make([]bottom, n)
	x := append([]float64(nil), v.x0...)
	for i := n - 1; i >= 0; i-- { // thin lines first; each solution starts the next
		y := v.ymin + float64(i)/float64(n-1)*(v.ymax-v.ymin)
		c := v.solve(x, y, -1)
		out[i] = bottom{y, c, append([]float64(nil), x...)}
	}
	return out
}

// crossing follows the bottom of the valley from b0 in direction dir (±1) of ln b until
// χ² has risen to target. It returns false, and the bound, if it never does.
func (v *valley) crossing(b0 bottom, target, dir, first float64) (float64, bool) {
	x := append([]float64(nil), b0.x...)
	end := v.ymax
	if dir < 0 {
		end = v.ymin
	}
	a, fa := b0.y, math.Min(b0.chi2-target, 0)
	step := first
	for {
		if a == end {
			return end, false
		}
		c := a + dir*step
		if dir*(c-end) > 0 {
			c = end
		}
		fc := v.solve(x, c, -1) - target
		if fc > 0 {
			f := func(y float64) float64 { return v.solve(x, y, -1) - target }
			return root(f, a, fa, c, fc, 1e-6), true
		}
		a, fa = c, fc
		step = math.Min(2*step, 0.3)
	}
}
