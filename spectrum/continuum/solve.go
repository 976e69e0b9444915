package continuum

import (
	"errors"
	"math"
)

var errSingular = errors.New("the pixels do not determine the polynomial")

// A basis holds P_k(x_i) of every pixel, pixel-major, and solves weighted least
// squares on any subset of them.
type basis struct {
	p int       // polynomials
	a []float64 // len(wave) × p
	g []float64 // scratch, p × p: the normal matrix, then its Cholesky factor
	b []float64 // scratch, p
}

func newBasis(x []float64, p int) *basis {
	s := &basis{p: p, a: make([]float64, len(x)*p), g: make([]float64, p*p), b: make([]float64, p)}
	for i, xi := range x {
		legendre(s.a[i*p:(i+1)*p], xi)
	}
	return s
}

// fit solves for the first len(coef) polynomials with weights w on the pixels
// with use. Legendre polynomials over windows that reach over the domain keep
// the normal matrix well conditioned (below 1e6 at degree 5 for two windows of a
// fifth each); one step of refinement takes away what squaring lost.
func (s *basis) fit(coef, y, w []float64, use []bool) error {
	p := len(coef)
	if err := s.factor(p, w, use); err != nil {
		return err
	}
	for k := range coef {
		coef[k] = 0
	}
	for range 2 {
		b := s.b[:p]
		for k := range b {
			b[k] = 0
		}
		for i, u := range use {
			if !u {
				continue
			}
			row := s.a[i*s.p : i*s.p+p]
			r := y[i]
			for k, c := range coef {
				r -= c * row[k]
			}
			r *= w[i]
			for k, a := range row {
				b[k] += a * r
			}
		}
		s.backsolve(p, b)
		for k := range coef {
			coef[k] += b[k]
		}
	}
	for _, c := range coef {
		if math.IsNaN(c) || math.IsInf(c, 0) {
			return errSingular
		}
	}
	return nil
}

// factor puts the Cholesky factor of AᵀWA into s.g.
func (s *basis) factor(p int, w []float64, use []bool) error {
	g := s.g[:p*p]
	for k := range g {
		g[k] = 0
	}
	for i, u := range use {
		if !u {
			continue
		}
		row := s.a[i*s.p : i*s.p+p]
		wi := w[i]
		for k, a := range row {
			a *= wi
			for l := 0; l <= k; l++ {
				g[k*p+l] += a * row[l]
			}
		}
	}
	return cholesky(g, p)
}

func (s *basis) backsolve(p int, b []float64) {
	g := s.g
	for k := range p {
		for l := range k {
			b[k] -= g[k*p+l] * b[l]
		}
		b[k] /= g[k*p+k]
	}
	for k := p - 1; k >= 0; k-- {
		for l := k + 1; l < p; l++ {
			b[k] -= g[l*p+k] * b[l]
		}
		b[k] /= g[k*p+k]
	}
}

// influence returns ∂coef/∂y, row-major p × pixels: (AᵀWA)⁻¹ AᵀW on the used
// pixels, 0 elsewhere.
func (s *basis) influence(p int, w []float64, use []bool) ([]float64, error) {
	if err := s.factor(p, w, use); err != nil {
		return nil, err
	}
	n := len(use)
	out := make([]float64, p*n)
	b := s.b[:p]
	for i, u := range use {
		if !u {
			continue
		}
		for k, a := range s.a[i*s.p : i*s.p+p] {
			b[k] = a * w[i]
		}
		s.backsolve(p, b)
		for k := range b {
			out[k*n+i] = b[k]
		}
	}
	return out, nil
}

// cholesky factors the lower triangle of g (p × p) in place.
func cholesky(g []float64, p int) error {
	for k := range p {
		d := g[k*p+k]
		top := d
		for l := range k {
			d -= g[k*p+l] * g[k*p+l]
		}
		if !(d > 1e-13*top) {
			return errSingular
		}
		d = math.Sqrt(d)
		g[k*p+k] = d
		for i := k + 1; i < p; i++ {
			v := g[i*p+k]
			for l := range k {
				v -= g[i*p+l] * g[k*p+l]
			}
			g[i*p+k] = v / d
		}
	}
	return nil
}

// sandwich returns M Σ Mᵀ, the covariance of coefficients with influence infl on
// pixels whose covariance is σᵢσⱼρ(|i−j|).
func sandwich(infl, sigma []float64, p int, noise Noise) []float64 {
	n := len(sigma)
	cov := make([]float64, p*p)
	for k := range p {
		a := infl[k*n : (k+1)*n]
		for l := range k + 1 {
			b := infl[l*n : (l+1)*n]
			v := 0.0
			for i := range n {
				if a[i] != 0 {
					v += a[i] * b[i] * sigma[i] * sigma[i]
				}
			}
			for q, rho := range noise.Rho {
				if rho == 0 {
					continue
				}
				lag, s := q+1, 0.0
				for i := 0; i+lag < n; i++ {
					s += sigma[i] * sigma[i+lag] * (a[i]*b[i+lag] + a[i+lag]*b[i])
				}
				v += rho * s
			}
			cov[k*p+l], cov[l*p+k] = v, v
		}
	}
	return cov
}
