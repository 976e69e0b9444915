// Package continuum finds the star's light around a line: where it lies, how
// well, and how noisy the pixels truly are.
package continuum

// Noise is what was measured on line-free pixels, against what the error array claims.
type Noise struct {
	Ratio    float64   // rms of the residuals over the tabulated error; 1 when FromScatter
	Rho      []float64 // correlation at lag 1, 2, …
	Pixels   int       // line-free pixels used
	FromData bool      // no error array: the scatter of the residuals is the error
}

// A Model is a continuum over one piece of spectrum.
type Model struct {
	Domain   [2]float64 // Å, vacuum, mapped to −1..1
	Degree   int
	Coef     []float64    // Legendre
	Cov      []float64    // row-major covariance of Coef, correlated noise included
	Alt      [][]float64  // Legendre coefficients of the other placements (degree ±1, windows ±20 %)
	Given    []float64    // a user's continuum on the pixels of the piece, or nil; Coef then multiplies it
	GivenErr float64      // its stated relative error
	Windows  [][2]float64 // Å, used
	Used     int          // pixels fitted
	Dropped  int          // pixels rejected
	Sigma    []float64    // 1σ error of each pixel of the piece, as audited (tabulated × Ratio, or scatter)
	Noise    Noise
	By       string // "Legendre, degree by BIC", "user's column", …
	Notes    []string
}
