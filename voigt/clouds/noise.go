package clouds

import (
	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/lapack/lapack64"
)

// noise is the correlation of the rows of a window: the Cholesky factor L of its
// banded matrix, row by row, L_ij at [i(band+1) + band + j − i]. Masked pixels are
// rows and columns left out of the matrix, not of its factor.
type noise struct {
	band  int // 0: independent
	chol  []float64
	share float64 // part of the correlations that could be kept
	tau   float64 // 1 + 2 Σ ρ
}

func newNoise(pix []int, rho []float64) noise {
	n := noise{share: 1, tau: 1}
	for len(rho) > 0 && rho[len(rho)-1] == 0 {
		rho = rho[:len(rho)-1]
	}
	if len(rho) == 0 || len(pix) < 2 {
		return n
	}
	n.band = min(len(rho), len(pix)-1)
	for ; ; n.share *= 0.9 { // a truncated list of correlations need not be positive definite
		width := n.band + 1
		n.chol = make([]float64, len(pix)*width)
		for i, p := range pix {
			n.chol[i*width+n.band] = 1
			for j := max(0, i-n.band); j < i; j++ {
				if lag := p - pix[j]; lag <= len(rho) {
					n.chol[i*width+n.band+j-i] = n.share * rho[lag-1]
				}
			}
		}
		a := blas64.SymmetricBand{Uplo: blas.Lower, N: len(pix), K: n.band, Stride: width, Data: n.chol}
		if _, ok := lapack64.Pbtrf(a); ok {
			break
		}
	}
	for _, r := range rho {
		n.tau += 2 * n.share * r
	}
	n.tau = max(n.tau, 0.05)
	return n
}

// whiten replaces the rows of x (cols numbers each) by L⁻¹ x.
func (n noise) whiten(x []float64, cols int) {
	if n.band == 0 {
		return
	}
	width := n.band + 1
	rows := len(x) / cols
	for i := range rows {
		l := n.chol[i*width : (i+1)*width]
		row := x[i*cols : (i+1)*cols]
		for j := max(0, i-n.band); j < i; j++ {
			if k := l[n.band+j-i]; k != 0 {
				floats.AddScaled(row, -k, x[j*cols:(j+1)*cols])
			}
		}
		floats.Scale(1/l[n.band], row)
	}
}
