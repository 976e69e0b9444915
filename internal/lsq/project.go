package lsq

import (
	"errors"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
	"gonum.org/v1/gonum/mat"
)

// A Projector takes parameters that enter linearly out of a fit: of the model
// A(x) c + …, with k columns of A, the best c follows from x, and what is fitted
// are the m − k residuals that no c can mend,
//
//	r = Q₂ᵀ y,   ∂r/∂x_j ≈ −Q₂ᵀ (∂A/∂x_j) c,   A = [Q₁ Q₂] R,
//
// with y the data less any part without linear parameters. This is variable
// projection (Golub & Pereyra 1973, SIAM J. Numer. Anal. 10, 413) with the
// derivative of Kaufman 1975 (BIT 15, 49), both from memory; the term left out
// vanishes with the residuals. χ² and the covariance of x are those of the joint
// fit.
//
// In Problem.Eval: Factor A, find c with Coef, and fill r and jac with Residuals
// and Jacobian. The zero value is ready; nothing is allocated once it has grown.
type Projector struct {
	m, k    int
	qr, tau []float64
	y, work []float64
}

// Factor factorizes the m × k matrix a, which is not changed. It reports columns
// that depend on each other, or are not finite.
func (p *Projector) Factor(a *mat.Dense) error {
	m, k := a.Dims()
	if m < k {
		return errors.New("least squares: fewer points than linear parameters")
	}
	p.m, p.k = m, k
	p.qr, p.tau, p.y = sized(p.qr, m*k), sized(p.tau, k), sized(p.y, m)
	qr := general(p.qr, m, k)
	src := a.RawMatrix()
	for i := range m {
		copy(qr.Data[i*k:(i+1)*k], src.Data[i*src.Stride:])
	}
	norms := 0.0
	for j := range k {
		norms = max(norms, blas64.Nrm2(blas64.Vector{N: m, Inc: k, Data: qr.Data[j:]}))
	}
	p.room(qr, k)
	lapack64.Geqrf(qr, p.tau, p.work, len(p.work))
	for j := range k {
		if !(math.Abs(qr.Data[j*k+j]) > 1e-13*norms) {
			return errors.New("least squares: the linear parameters cannot be told apart")
		}
	}
	return nil
}

// room grows the work array to what cols columns need.
func (p *Projector) room(qr blas64.General, cols int) {
	p.work = sized(p.work, max(1, len(p.work)))
	lapack64.Geqrf(qr, p.tau, p.work, -1) // asks only: the answer comes in work[0]
	need := p.work[0]
	c := blas64.General{Rows: p.m, Cols: cols, Stride: cols}
	lapack64.Ormqr(blas.Left, blas.Trans, qr, p.tau, c, p.work, -1)
	p.work = sized(p.work, max(len(p.work), int(max(need, p.work[0]))))
}

func (p *Projector) turn(c blas64.General) {
	lapack64.Ormqr(blas.Left, blas.Trans, general(p.qr, p.m, p.k), p.tau, c, p.work, len(p.work))
}

// Coef sets c (k long) to the linear parameters that make |A c − y|² smallest.
func (p *Projector) Coef(c, y []float64) {
	p.lengths(len(c) == p.k && len(y) == p.m)
	copy(p.y, y)
	p.turn(general(p.y, p.m, 1))
	copy(c, p.y)
	lapack64.Trtrs(blas.NoTrans, upper(general(p.qr, p.k, p.k)), general(c, p.k, 1))
}

// Residuals sets r (m − k long) to Q₂ᵀ y.
func (p *Projector) Residuals(r, y []float64) {
	p.lengths(len(r) == p.m-p.k && len(y) == p.m)
	copy(p.y, y)
	p.turn(general(p.y, p.m, 1))
	copy(r, p.y[p.k:])
}

// Jacobian sets jac ((m − k) × n) to Q₂ᵀ d; d (m × n) is overwritten. Put
// −(∂A/∂x_j) c into column j of d.
func (p *Projector) Jacobian(jac, d *mat.Dense) {
	m, n := d.Dims()
	rows, cols := jac.Dims()
	p.lengths(m == p.m && rows == m-p.k && cols == n)
	p.room(general(p.qr, p.m, p.k), n)
	raw := d.RawMatrix()
	p.turn(raw)
	for i := range rows {
		copy(jac.RawRowView(i), raw.Data[(i+p.k)*raw.Stride:][:n])
	}
}

func (p *Projector) lengths(ok bool) {
	if !ok {
		panic("lsq: Projector: lengths do not fit the factorized matrix")
	}
}
