package cog

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"lacuna/internal/lsq"
)

// exact is the likelihood on exact widths, for package lsq: its parameters are
// log₁₀N of each level and ln b.
type exact struct {
	d    *data
	m    []float64
	dx   []float64 // ∂m/∂log₁₀N of its own level
	dy   []float64 // ∂m/∂ln b
	work []float64
}

func newExact(d *data) *exact {
	n := len(d.pts)
	return &exact{d: d, m: make([]float64, n), dx: make([]float64, n), dy: make([]float64, n), work: make([]float64, n)}
}

// Points is the number of residuals.
func (e *exact) Points() int { return len(e.d.pts) }

// Eval sets the residuals and their derivatives.
func (e *exact) Eval(x, r []float64, jac *mat.Dense) {
	e.model(x)
	e.d.residuals(r, e.m)
	for c := range e.d.cols {
		for i := range e.work {
			e.work[i] = 0
			if e.d.col[i] == c {
				e.work[i] = e.dx[i]
			}
		}
		e.d.derivatives(e.work, e.m)
		jac.SetCol(c, e.work)
	}
	copy(e.work, e.dy)
	e.d.derivatives(e.work, e.m)
	jac.SetCol(e.d.cols, e.work)
}

func (e *exact) model(x []float64) {
	b := math.Exp(x[e.d.cols])
	for i := range e.d.pts {
		w, dx, db := WidthGrad(e.d.pts[i].Line, x[e.d.col[i]], b)
		e.m[i], e.dx[i], e.dy[i] = w, dx, db*b
	}
}

// polish minimizes χ² on exact widths from log₁₀N x and y, with y in ylo .. yhi (equal:
// fixed; then fewer points than parameters will do).
func (e *exact) polish(x []float64, y, ylo, yhi float64, ws *lsq.Workspace) (lsq.Solution, error) {
	n := e.d.cols
	start := append(append([]float64(nil), x...), y)
	lo, hi := make([]float64, n+1), make([]float64, n+1)
	for c := range n {
		lo[c], hi[c] = x[c]-4, math.Min(x[c]+4, mostN)
	}
	lo[n], hi[n] = ylo, yhi
	var p lsq.Problem = e
	if len(e.d.pts) < n+1 {
		p = padded{e}
	}
	return lsq.Fit(p, start, lo, hi, lsq.Options{Tol: 1e-13}, ws)
}

// padded adds a residual that is always 0.
type padded struct{ *exact }

func (p padded) Points() int { return len(p.d.pts) + 1 }

func (p padded) Eval(x, r []float64, jac *mat.Dense) {
	n := len(p.d.pts)
	j := mat.NewDense(n, p.d.cols+1, nil)
	p.exact.Eval(x, r[:n], j)
	for i := range n {
		for c := range p.d.cols + 1 {
			jac.Set(i, c, j.At(i, c))
		}
	}
	r[n] = 0
	for c := range p.d.cols + 1 {
		jac.Set(n, c, 0)
	}
}

// response returns G with δp = G δW: how each parameter follows each measured
// width, (JᵀJ)⁻¹ Jᵀ L⁻¹, with ln b fixed unless free. One row a parameter, that of
// ln b last; rows are 0 where nothing moves.
func (e *exact) response(x []float64, free bool) (g [][]float64, cov []float64) {
	d := e.d
	n, k := len(d.pts), d.cols
	if free {
		k++
	}
	jac := mat.NewDense(n, d.cols+1, nil)
	r := make([]float64, n)
	e.Eval(x, r, jac)
	j := jac.Slice(0, n, 0, k)
	var normal mat.SymDense
	normal.SymOuterK(1, j.T())
	g = make([][]float64, d.cols+1)
	for p := range g {
		g[p] = make([]float64, d.gauss)
	}
	cov = make([]float64, (d.cols+1)*(d.cols+1))
	var chol mat.Cholesky
	if !chol.Factorize(&normal) {
		return g, cov
	}
	var inv mat.SymDense
	if chol.InverseTo(&inv) != nil {
		return g, cov
	}
	unit := make([]float64, d.gauss)
	for i := range d.gauss { // −Jᵀ L⁻¹ e_i: residuals grow with W
		clear(unit)
		unit[i] = 1
		d.whiten(unit)
		for p := range k {
			var s float64
			for q := range k {
				var t float64
				for l, u := range unit {
					t += j.At(l, q) * u
				}
				s -= inv.At(p, q) * t
			}
			g[p][i] = s
		}
	}
	for p := range k {
		for q := range k {
			cov[p*(d.cols+1)+q] = inv.At(p, q)
		}
	}
	return g, cov
}
