package cog

import (
	"math"

	"lacuna/atomic"
)

// A surface is W(log N, b) of one line for the many evaluations that scans, error
// intervals and contours need: ln W on a grid of log₁₀N and ln b, computed where
// it is looked at, with its slopes. Between the nodes the edges of a cell are
// cubic (Hermite) and the inside blends them (Coons 1967, MIT report MAC-TR-41,
// from memory), which is good to (h_x h_y)²/64 of the fourth mixed derivative,
// 6e-5 of W at worst with the steps below. The best fit itself never uses it.
//
// Below the grid the line is thin and W exactly linear; above it, and outside in b,
// W is computed directly.
type surface struct {
	line           *atomic.Line
	x0, dx, y0, dy float64
	nx, ny         int
	node           []node
	evals          int
}

// A node holds ln W and its slopes per step; f = 0 before it is computed (ln W of
// an interstellar line is far below 0).
type node struct{ f, fx, fy float64 }

const (
	stepX = 0.14 // dex in N
	stepY = 0.14 // in ln b
)

// newSurface covers log₁₀N up to top for b between bmin and bmax; coarse
// lengthens the steps, and the error with their fourth power.
func newSurface(l *atomic.Line, top, bmin, bmax, coarse float64) *surface {
	s := &surface{line: l, dx: stepX * coarse, y0: math.Log(bmin)}
	s.ny = int(math.Ceil(math.Log(bmax/bmin)/(stepY*coarse))) + 1
	s.dy = math.Log(bmax/bmin) / float64(s.ny-1)
	// τ₀ = 1e-6 at the smallest b
	s.x0 = -6 - math.Log10(newBlob(l, 0, 0, bmin).tau0)
	s.nx = int(math.Ceil(math.Max(top-s.x0, 1)/s.dx)) + 1
	s.node = make([]node, s.nx*s.ny)
	return s
}

func (s *surface) at(i, j int) node {
	n := &s.node[j*s.nx+i]
	if n.f == 0 {
		s.evals++
		b := math.Exp(s.y0 + float64(j)*s.dy)
		w, dx, db := WidthGrad(*s.line, s.x0+float64(i)*s.dx, b)
		*n = node{math.Log(w), dx / w * s.dx, db * b / w * s.dy}
	}
	return *n
}

// width returns W (Å) and ∂W/∂log₁₀N at column x and y = ln b.
func (s *surface) width(x, y float64) (w, slope float64) {
	u, v := (x-s.x0)/s.dx, (y-s.y0)/s.dy
	if u < 0 {
		w = math.Pow(10, x) / Linear(1, *s.line)
		return w, w * math.Ln10
	}
	i, j := min(int(u), s.nx-2), min(int(v), s.ny-2)
	if !(u <= float64(s.nx-1)) || !(v >= -1e-9 && v <= float64(s.ny-1)+1e-9) {
		w, slope, _ = WidthGrad(*s.line, x, math.Exp(y))
		return w, slope
	}
	u -= float64(i)
	v -= float64(j)
	a, b, c, d := s.at(i, j), s.at(i+1, j), s.at(i, j+1), s.at(i+1, j+1)
	bottom, dbottom := hermite(u, a.f, a.fx, b.f, b.fx)
	top, dtop := hermite(u, c.f, c.fx, d.f, d.fx)
	left, _ := hermite(v, a.f, a.fy, c.f, c.fy)
	right, _ := hermite(v, b.f, b.fy, d.f, d.fy)
	f := (1-v)*(bottom-(1-u)*a.f-u*b.f) + v*(top-(1-u)*c.f-u*d.f) + (1-u)*left + u*right
	fu := (1-v)*(dbottom+a.f-b.f) + v*(dtop+c.f-d.f) - left + right
	w = math.Exp(f)
	return w, w * fu / s.dx
}

// hermite is the cubic with values a, b and slopes da, db at t = 0 and 1, and its
// slope at t.
func hermite(t, a, da, b, db float64) (f, df float64) {
	c2 := 3*(b-a) - 2*da - db
	c3 := 2*(a-b) + da + db
	return a + t*(da+t*(c2+t*c3)), da + t*(2*c2+3*t*c3)
}
