package cog

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// data is what the widths say, ready for a likelihood:
//
//	χ² = (W − M)ᵀ C⁻¹ (W − M) − 2 Σ ln Φ((W_lim − M)/σ),
//
// C = diag(Err²) + Σ over shared shifts d dᵀ for the measured widths, detected or
// not; the sum over other people's upper limits, W_lim = Sigma σ, Φ the normal
// integral: the probability that the data stay below W_lim.
type data struct {
	pts   []Point // measured first, then limits
	col   []int   // the level each belongs to
	cols  int
	gauss int         // number of measured ones
	low   [][]float64 // Cholesky factor of C: C = L Lᵀ
}

// newData orders the points of some levels and factors their covariance.
func newData(levels []Level, use []int) (*data, error) {
	d := &data{cols: len(use)}
	for _, limits := range []bool{false, true} {
		for c, k := range use {
			for _, p := range levels[k].Points {
				if p.Limit == limits {
					d.pts = append(d.pts, p)
					d.col = append(d.col, c)
				}
			}
		}
		if !limits {
			d.gauss = len(d.pts)
		}
	}
	if d.gauss == 0 {
		return d, nil
	}
	c := mat.NewSymDense(d.gauss, nil)
	for i := range d.gauss {
		for j := range i + 1 {
			c.SetSym(i, j, d.covariance(i, j))
		}
	}
	var chol mat.Cholesky
	if !chol.Factorize(c) || !(chol.Cond() < 1e13) {
		return nil, fmt.Errorf("curve of growth: the errors of the widths leave no freedom between some of them; each needs a private error above 0")
	}
	var l mat.TriDense
	chol.LTo(&l)
	for i := range d.gauss {
		row := make([]float64, i+1)
		for j := range row {
			row[j] = l.At(i, j)
		}
		d.low = append(d.low, row)
	}
	return d, nil
}

// covariance of measured widths i and j.
func (d *data) covariance(i, j int) float64 {
	var sum float64
	if i == j {
		sum = d.pts[i].Err * d.pts[i].Err
	}
	for k, s := range d.pts[i].Common {
		for l, t := range d.pts[j].Common {
			if s.Key == t.Key && (s.Key != "" || i == j && k == l) {
				sum += s.D * t.D
			}
		}
	}
	return sum
}

// sigma is the total error of a measured width, or σ of a limit.
func (d *data) sigma(i int) float64 {
	if i < d.gauss {
		return math.Sqrt(d.covariance(i, i))
	}
	return limitSigma(d.pts[i])
}

// limitSigma is the 1σ error behind someone else's limit.
func limitSigma(p Point) float64 {
	if p.Err > 0 {
		return p.Err
	}
	if p.Sigma > 0 {
		return p.W / p.Sigma
	}
	return p.W / 3
}

// whiten replaces r by L⁻¹ r, for the measured widths.
func (d *data) whiten(r []float64) {
	for i, row := range d.low {
		x := r[i]
		for j, l := range row[:i] {
			x -= l * r[j]
		}
		r[i] = x / row[i]
	}
}

// residuals turns model widths m into residuals r with Σ r² = χ².
func (d *data) residuals(r, m []float64) {
	for i := range d.gauss {
		r[i] = d.pts[i].W - m[i]
	}
	d.whiten(r[:d.gauss])
	for i := d.gauss; i < len(d.pts); i++ {
		r[i] = math.Sqrt(-2 * logPhi((d.pts[i].W-m[i])/d.sigma(i)))
	}
}

// derivatives turns ∂m/∂p into ∂r/∂p at the model m.
func (d *data) derivatives(dr, m []float64) {
	for i := range d.gauss {
		dr[i] = -dr[i]
	}
	d.whiten(dr[:d.gauss])
	for i := d.gauss; i < len(d.pts); i++ {
		s := d.sigma(i)
		z := (d.pts[i].W - m[i]) / s
		r := math.Sqrt(-2 * logPhi(z))
		if r == 0 {
			dr[i] = 0
			continue
		}
		// φ/Φ, which tends to −z for negative z
		hazard := math.Exp(-z*z/2-logPhi(z)) / math.Sqrt(2*math.Pi)
		dr[i] *= hazard / (r * s)
	}
}

// logPhi is the logarithm of the normal integral, for any z.
func logPhi(z float64) float64 {
	if z > -30 {
		return math.Log(math.Erfc(-z/math.Sqrt2) / 2)
	}
	// ln φ(z) − ln(−z) and two terms of the asymptotic series, DLMF 7.12.1
	return -z*z/2 - math.Log(-z*math.Sqrt(2*math.Pi)) + math.Log1p(-1/(z*z)+3/(z*z*z*z))
}
