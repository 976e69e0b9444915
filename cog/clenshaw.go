package cog

import "math"

// Clenshaw–Curtis quadrature on nested points cos(jπ/n): doubling n keeps every
// value. For functions that are analytic in a wide strip, as widths' integrands
// are, it converges as fast as Gauss's rule in practice (Trefethen 2008, SIAM
// Review 50, 67), and |Iₙ − Iₙ⁄₂| bounds the error of Iₙ⁄₂, whose square is about
// that of Iₙ.

const maxNodes = 128 // n of the finest rule; it has maxNodes+1 points

// ccNode[j] = cos(jπ/maxNodes), descending from 1 to −1.
var ccNode = func() (x [maxNodes + 1]float64) {
	for j := range x {
		x[j] = math.Sin(math.Pi * float64(maxNodes-2*j) / (2 * maxNodes)) // odd about the middle
	}
	return x
}()

// ccWeight[k] holds the weights of the rule with n = 8·2^k.
var ccWeight = [...][]float64{ccRule(8), ccRule(16), ccRule(32), ccRule(64), ccRule(128)}

// ccRule returns the n+1 weights for the interval −1 .. 1 (n even),
//
//	w_j = (c_j/n) [1 − Σ_{k=1}^{n/2} b_k cos(2jkπ/n)/(4k²−1)],
//
// c = 1 at both ends and 2 between, b = 1 for k = n/2 and 2 else.
// Source: Waldvogel 2006, BIT Numerical Mathematics 46, 195 (from memory).
func ccRule(n int) []float64 {
	w := make([]float64, n+1)
	for j := range w {
		sum := 1.
		for k := 1; k <= n/2; k++ {
			b := 2.
			if k == n/2 {
				b = 1
			}
			sum -= b * math.Cos(2*math.Pi*float64(j*k%n)/float64(n)) / float64(4*k*k-1)
		}
		c := 2.
		if j == 0 || j == n {
			c = 1
		}
		w[j] = c / float64(n) * sum
	}
	return w
}
