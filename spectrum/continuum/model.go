// Package continuum finds the star's light around a line: where it lies, how
// well, and how noisy the pixels truly are.
//
// The continuum is a Legendre polynomial, fitted by weighted least squares to
// pixels without lines. Its covariance and every error that follows from it use
// the noise as measured on those pixels, scatter and correlation, and not what
// the error array claims (see Noise). Wavelengths are vacuum Å, fluxes and
// errors in the unit of the file.
package continuum

import (
	"math"
	"sort"
)

// Noise is what was measured on line-free pixels, against what the error array claims.
type Noise struct {
	Ratio    float64    // rms of the residuals over the tabulated error; 1 when FromData
	Rho      []float64  // correlation at lag 1, 2, …
	Pixels   int        // line-free pixels used
	FromData bool       // no error array: the scatter of the residuals is the error
	Range    [2]float64 // Å, where it was measured

	raw []float64 // correlations before shrinking, for pooling
}

// A Model is a continuum over one piece of spectrum.
type Model struct {
	Domain   [2]float64 // Å, vacuum, mapped to −1..1
	Degree   int
	Coef     []float64    // Legendre
	Cov      []float64    // row-major covariance of Coef, correlated noise included
	Alt      [][]float64  // Legendre coefficients of the other placements (degree ±1, windows ±20 %)
	AltWhat  []string     // what each of Alt is
	Given    []float64    // a user's continuum on the pixels of the piece, or nil; Coef then multiplies it
	GivenErr float64      // its stated relative error
	Wave     []float64    // Å, pixels of the piece
	Windows  [][2]float64 // Å, used
	Used     int          // pixels fitted
	Dropped  int          // pixels inside the windows that were rejected
	Pixels   []bool       // the pixels of the piece that were fitted
	Sigma    []float64    // 1σ error of each pixel of the piece, as audited (tabulated × Ratio, or scatter)
	Noise    Noise
	By       string // "Legendre, degree by AICc", "user's column", …
	Notes    []string

	infl    []float64   // ∂Coef/∂flux, row-major len(Coef) × pixels; nil where Coef was not fitted
	altInfl [][]float64 // the same for each of Alt
}

// x maps a wavelength to −1..1 of the domain.
func (m Model) x(wave float64) float64 {
	return (2*wave - m.Domain[0] - m.Domain[1]) / (m.Domain[1] - m.Domain[0])
}

// At fills dst with the continuum at wave (Å). dst and wave have equal length.
func (m Model) At(dst, wave []float64) { m.eval(dst, wave, m.Coef) }

// AltAt is At for placement Alt[k].
func (m Model) AltAt(k int, dst, wave []float64) { m.eval(dst, wave, m.Alt[k]) }

func (m Model) eval(dst, wave, coef []float64) {
	if len(dst) != len(wave) {
		panic("continuum: dst and wave differ in length")
	}
	for i, w := range wave {
		dst[i] = legendreSum(coef, m.x(w)) * m.factor(w)
	}
}

// Basis fills dst with ∂C/∂Coef[k] at one wavelength: the Legendre polynomials
// P_k, times the user's continuum where there is one. With it the variance of
// the continuum is gᵀ Cov g, and so is that of anything linear in it.
func (m Model) Basis(dst []float64, wave float64) {
	legendre(dst, m.x(wave))
	if m.Given != nil {
		f := m.factor(wave)
		for k := range dst {
			dst[k] *= f
		}
	}
}

// factor is the user's continuum at wave, linear between pixels; 1 without one.
func (m Model) factor(wave float64) float64 {
	n := len(m.Given)
	if n == 0 {
		return 1
	}
	i := sort.SearchFloat64s(m.Wave, wave)
	switch {
	case i < n && m.Wave[i] == wave:
		return m.Given[i]
	case i == 0:
		return m.Given[0]
	case i == n:
		return m.Given[n-1]
	}
	t := (wave - m.Wave[i-1]) / (m.Wave[i] - m.Wave[i-1])
	return m.Given[i-1] + t*(m.Given[i]-m.Given[i-1])
}

// Pull adds to dst, pixel by pixel, how Σ g[k]·Coef[k] changes with the flux of
// each pixel of the piece; alt < 0 is the model itself, otherwise Alt[alt]. It
// reports false, and adds nothing, where the coefficients were not fitted to
// these pixels.
func (m Model) Pull(dst, g []float64, alt int) bool {
	infl := m.infl
	if alt >= 0 {
		if alt >= len(m.altInfl) {
			return false
		}
		infl = m.altInfl[alt]
	}
	n := len(dst)
	if infl == nil || len(infl) != len(g)*n {
		return false
	}
	for k, gk := range g {
		row := infl[k*n : (k+1)*n]
		for j, r := range row {
			dst[j] += gk * r
		}
	}
	return true
}

// Variance returns the variance of Σ gᵢFᵢ over consecutive pixels with errors
// sigma,
//
//	Σᵢⱼ gᵢ gⱼ σᵢ σⱼ ρ(|i−j|),
//
// with ρ as measured. Correlations come from here positive definite (see
// positive); for a Noise made elsewhere the result is never allowed below a
// thousandth of the value for independent pixels.
func (n Noise) Variance(g, sigma []float64) float64 {
	if len(g) != len(sigma) {
		panic("continuum: Variance: g and sigma differ in length")
	}
	white := 0.0
	for i, gi := range g {
		if gi != 0 {
			a := gi * sigma[i]
			white += a * a
		}
	}
	v := white
	for k, rho := range n.Rho {
		if rho == 0 {
			continue
		}
		s := 0.0
		for i := 0; i+k+1 < len(g); i++ {
			if g[i] != 0 && g[i+k+1] != 0 {
				s += g[i] * sigma[i] * g[i+k+1] * sigma[i+k+1]
			}
		}
		v += 2 * rho * s
	}
	if !(v >= 1e-3*white) && !math.IsNaN(white) {
		v = 1e-3 * white
	}
	return v
}

// Tau is 1 + 2 Σ ρ_k (1 − k/m): how much the variance of a sum of m pixels
// exceeds that of independent ones. m ≤ 0 stands for very many.
func (n Noise) Tau(m int) float64 {
	t := 1.0
	for k, rho := range n.Rho {
		w := 1.0
		if m > 0 {
			w = 1 - float64(k+1)/float64(m)
		}
		if w > 0 {
			t += 2 * rho * w
		}
	}
	return max(t, 1e-3)
}

// legendre fills p with P_0(x) … P_{n−1}(x).
func legendre(p []float64, x float64) {
	for k := range p {
		switch k {
		case 0:
			p[0] = 1
		case 1:
			p[1] = x
		default:
			f := float64(k)
			p[k] = ((2*f-1)*x*p[k-1] - (f-1)*p[k-2]) / f
		}
	}
}

func legendreSum(c []float64, x float64) float64 {
	p0, p1, s := 1.0, x, 0.0
	for k, ck := range c {
		switch k {
		case 0:
			s += ck
		case 1:
			s += ck * x
		default:
			f := float64(k)
			p0, p1 = p1, ((2*f-1)*x*p1-(f-1)*p0)/f
			s += ck * p1
		}
	}
	return s
}
