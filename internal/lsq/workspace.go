package lsq

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/lapack/lapack64"
	"gonum.org/v1/gonum/mat"
)

const blasTrans = blas.Trans

// A Workspace is the memory of an iteration. The zero value is ready; it serves
// one Fit at a time and grows to the largest.
type Workspace struct {
	m, n      int
	now, next point
	free, at  []int
	scale     []float64 // D, by parameter
	qr        []float64 // J of the free parameters, then its factors
	tau       []float64
	qtr       []float64 // Qᵀ r
	stack     []float64 // [R; √λ D]
	rhs       []float64
	p         []float64 // step of the free parameters
	work      []float64
}

// A point is a place in parameter space with all that is known there.
type point struct {
	x, r []float64
	jac  *mat.Dense
	chi2 float64
}

// fit makes room for m residuals of n parameters.
func (ws *Workspace) fit(m, n int) {
	ws.scale = sized(ws.scale, n)
	clear(ws.scale)
	if ws.m == m && ws.n == n {
		return
	}
	ws.m, ws.n = m, n
	for _, p := range []*point{&ws.now, &ws.next} {
		p.x, p.r = sized(p.x, n), sized(p.r, m)
		var data []float64
		if p.jac != nil {
			data = p.jac.RawMatrix().Data
		}
		p.jac = mat.NewDense(m, n, sized(data, m*n))
	}
	ws.qr, ws.qtr, ws.tau = sized(ws.qr, m*n), sized(ws.qtr, m), sized(ws.tau, n)
	ws.stack, ws.rhs, ws.p = sized(ws.stack, 2*n*n), sized(ws.rhs, 2*n), sized(ws.p, n)
	if cap(ws.free) < n {
		ws.free = make([]int, 0, n)
	}
	if cap(ws.at) < n {
		ws.at = make([]int, n)
	}
	ws.at = ws.at[:n]
	// The most that the factorizations ask for.
	var query [1]float64
	size := 1.0
	for _, rows := range []int{m, 2 * n} {
		a := general(make([]float64, rows*n), rows, n)
		lapack64.Geqrf(a, ws.tau, query[:], -1)
		size = max(size, query[0])
		lapack64.Ormqr(blas.Left, blas.Trans, a, ws.tau, general(make([]float64, rows), rows, 1), query[:], -1)
		size = max(size, query[0])
	}
	ws.work = sized(ws.work, int(size))
}

func sized(s []float64, n int) []float64 {
	if cap(s) < n {
		return make([]float64, n)
	}
	return s[:n]
}

func general(data []float64, rows, cols int) blas64.General {
	return blas64.General{Rows: rows, Cols: cols, Stride: cols, Data: data[:rows*cols]}
}

func vec(s []float64) blas64.Vector { return blas64.Vector{N: len(s), Inc: 1, Data: s} }

func upper(g blas64.General) blas64.Triangular {
	return blas64.Triangular{Uplo: blas.Upper, Diag: blas.NonUnit, N: g.Cols, Stride: g.Stride, Data: g.Data}
}

// factor computes J = QR of the free parameters, Qᵀr and D.
func (ws *Workspace) factor() {
	k := len(ws.free)
	a := general(ws.qr, ws.m, k)
	jac := ws.now.jac.RawMatrix()
	norm := ws.p[:k]
	clear(norm)
	for i := range ws.m {
		row, src := a.Data[i*k:(i+1)*k], jac.Data[i*jac.Stride:]
		for l, j := range ws.free {
			row[l] = src[j]
			norm[l] += src[j] * src[j]
		}
	}
	for l, j := range ws.free {
		ws.scale[j] = max(ws.scale[j], math.Sqrt(norm[l]))
	}
	lapack64.Geqrf(a, ws.tau[:k], ws.work, len(ws.work))
	copy(ws.qtr, ws.now.r)
	lapack64.Ormqr(blas.Left, blas.Trans, a, ws.tau[:k], general(ws.qtr, ws.m, 1), ws.work, len(ws.work))
}

// step sets p to the minimum of |R p + Qᵀr|² + λ |D p|².
func (ws *Workspace) step(lambda float64) {
	k := len(ws.free)
	stack := general(ws.stack, 2*k, k)
	clear(stack.Data)
	root := math.Sqrt(lambda)
	for i := range k {
		copy(stack.Data[i*k+i:(i+1)*k], ws.qr[i*k+i:(i+1)*k])
		d := ws.scale[ws.free[i]]
		if d == 0 { // no derivative so far: any damping keeps it in place
			d = 1
		}
		stack.Data[(k+i)*k+i] = root * d
	}
	rhs := general(ws.rhs, 2*k, 1)
	for i, q := range ws.qtr[:k] {
		rhs.Data[i] = -q
	}
	clear(rhs.Data[k:])
	lapack64.Geqrf(stack, ws.tau[:k], ws.work, len(ws.work))
	lapack64.Ormqr(blas.Left, blas.Trans, stack, ws.tau[:k], rhs, ws.work, len(ws.work))
	lapack64.Trtrs(blas.NoTrans, upper(stack), general(rhs.Data, k, 1))
	copy(ws.p[:k], rhs.Data[:k])
}

// gain returns by how much the linear model lowers χ² for the step taken (now to
// next, free parameters), |Qᵀr|² − |R p + Qᵀr|².
func (ws *Workspace) gain() float64 {
	k := len(ws.free)
	p := ws.rhs[:k]
	for l, j := range ws.free {
		p[l] = ws.next.x[j] - ws.now.x[j]
	}
	sum := 0.0
	for i := range k { // (q + Rp)² − q² = Rp (2q + Rp)
		rp := floats.Dot(ws.qr[i*k+i:(i+1)*k], p[i:])
		sum -= rp * (2*ws.qtr[i] + rp)
	}
	return sum
}
