package main

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// bounds are the Cramér–Rao bounds of one sightline: the least 1σ that an unbiased estimate
// can have, continuum, zero level and width of the profile unknown as in the fit.
type bounds struct {
	number [][3]float64 // v, b, log N of each cloud
	total  float64      // log₁₀ ΣN
	width  float64      // W of the first line, Å
}

// fisher sums slopes over pixels with the covariance of the noise, and the priors, and
// inverts. Columns: v, b, log N of each cloud, ln(width), and for each window its continuum
// and zero level.
func (s *sightline) fisher() (bounds, error) {
	k := 3 * len(s.clouds)
	n := k + 1
	for _, sc := range s.scenes {
		n += len(sc.continuum) + 1
	}
	info := mat.NewSymDense(n, nil)
	at := k + 1
	rho := s.rho()
	for w, sc := range s.scenes {
		var pix []int
		for i, m := range s.mask[w] {
			if !m {
				pix = append(pix, i)
			}
		}
		lin := len(sc.continuum) + 1
		x := mat.NewDense(len(pix), k+1+lin, nil)
		for j, col := range s.views[w].slope {
			for r, p := range pix {
				x.Set(r, j, col[p]/s.sigma)
			}
		}
		y := x
		if len(rho) > 0 {
			c := mat.NewSymDense(len(pix), nil)
			for r, p := range pix {
				c.SetSym(r, r, 1)
				for q := r + 1; q < len(pix) && pix[q]-p <= len(rho); q++ {
					c.SetSym(r, q, rho[pix[q]-p-1])
				}
			}
			var chol mat.Cholesky
			if !chol.Factorize(c) {
				return bounds{}, fmt.Errorf("the covariance of the noise is none")
			}
			y = new(mat.Dense)
			if err := chol.SolveTo(y, x); err != nil {
				return bounds{}, err
			}
		}
		var part mat.Dense
		part.Mul(x.T(), y)
		place := func(j int) int {
			if j <= k {
				return j
			}
			return at + j - k - 1
		}
		for a := range k + 1 + lin {
			for b := a; b < k+1+lin; b++ {
				i, j := place(a), place(b)
				info.SetSym(i, j, info.At(i, j)+part.At(a, b))
			}
		}
		z := at + lin - 1
		info.SetSym(z, z, info.At(z, z)+1/(zeroErr*zeroErr))
		at += lin
	}
	info.SetSym(k, k, info.At(k, k)+1/(widthErr*widthErr))
	// Unit diagonal first: the numbers have different units.
	d := make([]float64, n)
	for i := range d {
		d[i] = 1 / math.Sqrt(info.At(i, i))
	}
	for i := range n {
		for j := i; j < n; j++ {
			info.SetSym(i, j, info.At(i, j)*d[i]*d[j])
		}
	}
	var chol mat.Cholesky
	if !chol.Factorize(info) {
		return bounds{}, fmt.Errorf("the information matrix is singular")
	}
	var cov mat.SymDense
	if err := chol.InverseTo(&cov); err != nil {
		if _, poor := err.(mat.Condition); !poor {
			return bounds{}, err
		}
	}
	of := func(g []float64) float64 {
		v := 0.0
		for i := range g {
			for j := range g {
				v += g[i] * d[i] * g[j] * d[j] * cov.At(i, j)
			}
		}
		return math.Sqrt(v)
	}
	var out bounds
	sum := 0.0
	for _, g := range s.clouds {
		sum += math.Pow(10, g.logN)
	}
	total := make([]float64, k)
	for c, g := range s.clouds {
		var one [3]float64
		for q := range one {
			one[q] = d[3*c+q] * math.Sqrt(cov.At(3*c+q, 3*c+q))
		}
		out.number = append(out.number, one)
		total[3*c+2] = math.Pow(10, g.logN) / sum
	}
	out.total, out.width = of(total), of(s.views[0].width)
	return out, nil
}
