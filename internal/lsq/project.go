package lsq

import (
	"errors"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
)

// A Projector takes parameters that enter linearly out of a fit: of the model
// A(x) c + …, with k columns of A, the best c follows from x, and what is fitted
// are the residuals that no c can mend,
//
//	r = (1 − QQᵀ) y,   ∂r/∂x_j ≈ −(1 − QQᵀ) (∂A/∂x_j) c,   A = Q R,
//
// with y the data less any part without linear parameters. This is variable
// projection (Golub & Pereyra 1973, SIAM J. Numer. Anal. 10, 413) with the
// derivative of Kaufman 1975 (BIT 15, 49), both from memory; the term left out
// vanishes with the residuals. χ² and the covariance of x are those of the joint
// fit; of the m residuals, m − k are independent.
//
// In Problem.Eval: Factor A, find c with Coef, and make r and jac with Residuals
// and Jacobian. The zero value is ready; nothing is allocated once it has grown.
type Projector struct {
	m, k int
	q    []float64 // k orthonormal columns, one after the other
	r    []float64 // R, k × k
	t    []float64
}

// Factor factorizes the m × k matrix a, which is not changed: Gram–Schmidt, each
// column twice. It reports columns that depend on each other, or are not finite.
func (p *Projector) Factor(a *mat.Dense) error {
	m, k := a.Dims()
	if m < k {
		return errors.New("least squares: fewer points than linear parameters")
	}
	p.m, p.k = m, k
	p.q, p.r = sized(p.q, m*k), sized(p.r, k*k)
	clear(p.r)
	src := a.RawMatrix()
	for j := range k {
		q := p.column(j)
		for i := range q {
			q[i] = src.Data[i*src.Stride+j]
		}
		whole := blas64.Nrm2(vec(q))
		for range 2 {
			for l := range j {
				d := floats.Dot(p.column(l), q)
				p.r[l*k+j] += d
				floats.AddScaled(q, -d, p.column(l))
			}
		}
		left := blas64.Nrm2(vec(q))
		if !(left > 1e-13*whole) || math.IsInf(whole, 0) {
			return errors.New("least squares: the linear parameters cannot be told apart")
		}
		p.r[j*k+j] = left
		floats.Scale(1/left, q)
	}
	return nil
}

func (p *Projector) column(j int) []float64 { return p.q[j*p.m : (j+1)*p.m] }

// Coef sets c (k long) to the linear parameters that make |A c − y|² smallest.
func (p *Projector) Coef(c, y []float64) {
	p.lengths(len(c) == p.k && len(y) == p.m)
	for j := range c {
		c[j] = floats.Dot(p.column(j), y)
	}
	blas64.Trsv(blas.NoTrans, blas64.Triangular{Uplo: blas.Upper, Diag: blas.NonUnit, N: p.k, Stride: p.k, Data: p.r}, vec(c))
}

// Residuals replaces y (m long) by (1 − QQᵀ) y.
func (p *Projector) Residuals(y []float64) {
	p.lengths(len(y) == p.m)
	for j := range p.k {
		q := p.column(j)
		floats.AddScaled(y, -floats.Dot(q, y), q)
	}
}

// Jacobian replaces d (m × n) by (1 − QQᵀ) d. Put −(∂A/∂x_j) c into its column j.
func (p *Projector) Jacobian(d *mat.Dense) {
	m, n := d.Dims()
	p.lengths(m == p.m)
	p.t = sized(p.t, n)
	raw := d.RawMatrix()
	for j := range p.k {
		q, t := p.column(j), p.t
		clear(t)
		for i, v := range q {
			floats.AddScaled(t, v, raw.Data[i*raw.Stride:i*raw.Stride+n])
		}
		for i, v := range q {
			floats.AddScaled(raw.Data[i*raw.Stride:i*raw.Stride+n], -v, t)
		}
	}
}

func (p *Projector) lengths(ok bool) {
	if !ok {
		panic("lsq: Projector: lengths do not fit the factorized matrix")
	}
}

// LogDet returns ln |det R| = ½ ln det AᵀA.
func (p *Projector) LogDet() float64 {
	s := 0.0
	for j := range p.k {
		s += math.Log(p.r[j*p.k+j])
	}
	return s
}
