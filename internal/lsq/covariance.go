package lsq

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// Directions with singular values below this part of the largest, columns scaled
// to equal length, count as not determined: their errors would be rounding noise.
const rankTol = 1e-11

// covariance fills Cov and Undetermined from the Jacobian at the
// solution, by a singular value decomposition with scaled columns.
func (s *Solution) covariance(ws *Workspace) {
	n := len(s.X)
	s.Cov = make([]float64, n*n)
	k := len(ws.free)
	if k == 0 {
		return
	}
	scale := make([]float64, k)
	a := mat.NewDense(ws.m, k, nil)
	for l, j := range ws.free {
		col := mat.Col(nil, j, ws.now.jac)
		norm := mat.Norm(mat.NewVecDense(ws.m, col), 2)
		if norm > 0 {
			scale[l] = 1 / norm
			for i, v := range col {
				a.Set(i, l, v*scale[l])
			}
		}
	}
	var svd mat.SVD
	if !svd.Factorize(a, mat.SVDThin) {
		s.Undetermined = append(s.Undetermined, ws.free...)
		for _, j := range ws.free {
			s.Cov[j*n+j] = math.Inf(1)
		}
		return
	}
	values := svd.Values(nil)
	var v mat.Dense
	svd.VTo(&v)
	for l, j := range ws.free {
		for o, i := range ws.free[:l+1] {
			sum := 0.0
			for d, sv := range values {
				if sv > rankTol*values[0] {
					sum += v.At(l, d) * v.At(o, d) / (sv * sv)
				}
			}
			sum *= scale[l] * scale[o]
			s.Cov[j*n+i], s.Cov[i*n+j] = sum, sum
		}
		for d, sv := range values {
			if !(sv > rankTol*values[0]) && math.Abs(v.At(l, d)) > 1e-3 {
				s.Undetermined = append(s.Undetermined, j)
				s.Cov[j*n+j] = math.Inf(1)
				break
			}
		}
	}
}
