package measure

import "math"

// growth is the curve of growth of one Gaussian component without damping,
//
//	F(τ₀) = ∫ (1 − exp(−τ₀ e^{−u²})) du,  W_v = b F,  F → √π τ₀ for τ₀ → 0.
//
// The integrand is smooth and ends like a Gaussian, so plain sums converge
// exponentially: relative error below 1e-10 up to τ₀ = 1e6 (see the test).
func growth(tau0 float64) float64 {
	if !(tau0 >= 0) {
		return math.NaN()
	}
	step := 0.1
	if tau0 > 3 { // the walls of the profile get steep
		step = 0.1 / (1 + math.Log(tau0/3))
	}
	s := -math.Expm1(-tau0) / 2
	for k := 1; ; k++ {
		u := float64(k) * step
		t := tau0 * math.Exp(-u*u)
		s += -math.Expm1(-t)
		if t < 1e-16*tau0 || t < 1e-17 {
			break
		}
	}
	return 2 * s * step
}

// growthInverse returns τ₀ with F(τ₀) = f, NaN unless f ≥ 0, +Inf beyond τ₀ = 1e9.
func growthInverse(f float64) float64 {
	if !(f >= 0) {
		return math.NaN()
	}
	if f == 0 {
		return 0
	}
	lo, hi := f/math.Sqrt(math.Pi), f/math.Sqrt(math.Pi) // F ≤ √π τ₀
	for growth(hi) < f {
		if lo, hi = hi, 2*hi; hi > 1e9 {
			return math.Inf(1)
		}
	}
	for range 80 {
		mid := math.Sqrt(lo * hi)
		if mid == lo || mid == hi {
			break
		}
		if growth(mid) < f {
			lo = mid
		} else {
			hi = mid
		}
	}
	return hi
}

// unresolved gives log N_a(weak) − log N_a(strong), and log N − log N_a of either
// line, of one Gaussian component much narrower than the instrument, where N_a
// goes as W. ratio is fλ(strong)/fλ(weak), tau0 the optical depth of the weak line.
func unresolved(tau0, ratio float64) (delta, weak, strong float64) {
	lin := math.Sqrt(math.Pi) * tau0
	weak = math.Log10(lin / growth(tau0))
	strong = math.Log10(ratio * lin / growth(ratio*tau0))
	return strong - weak, weak, strong
}

// resolved is unresolved for an instrument of Gaussian profile whose full width
// at half maximum is fwhm times b: N_a = ∫ −ln(e^{−τ} ⊗ L).
func resolved(tau0, ratio, fwhm float64) (delta, weak, strong float64) {
	lin := math.Sqrt(math.Pi) * tau0
	weak = math.Log10(lin / apparent(tau0, fwhm))
	strong = math.Log10(ratio * lin / apparent(ratio*tau0, fwhm))
	return strong - weak, weak, strong
}

// apparent is ∫ −ln(e^{−τ} ⊗ L) dv/b, by sums with steps of a quarter of the
// narrower of b/√2 and the instrument's σ.
func apparent(tau0, fwhm float64) float64 {
	sigma := fwhm / (2 * math.Sqrt(2*math.Ln2))
	step := min(sigma, math.Sqrt2/2) / 4
	if tau0 > 3 {
		step /= 1 + math.Log(tau0/3)
	}
	far := math.Sqrt(math.Log(max(tau0, 1) * 1e17)) // no optical depth beyond
	n := int(far/step) + 1
	depth := make([]float64, n+1) // 1 − e^{−τ} at k·step
	trans := make([]float64, n+1)
	for k := range depth {
		u := float64(k) * step
		t := tau0 * math.Exp(-u*u)
		depth[k], trans[k] = -math.Expm1(-t), math.Exp(-t)
	}
	m := int(9*sigma/step) + 1
	l := make([]float64, m+1)
	norm := 0.0
	for j := range l {
		x := float64(j) * step / sigma
		l[j] = math.Exp(-x * x / 2)
		norm += l[j] * 2
	}
	norm -= l[0]
	total := 0.0
	for i := 0; i <= n+m; i++ {
		d, t := 0.0, 0.0
		for j := -m; j <= m; j++ {
			k, w := max(i-j, j-i), l[max(j, -j)]
			if k <= n {
				d += w * depth[k]
				t += w * trans[k]
			} else {
				t += w
			}
		}
		v := -math.Log1p(-d / norm)
		if d > norm/2 { // dark: the transmitted light keeps its digits
			v = -math.Log(t / norm)
		}
		if i > 0 {
			v *= 2
		}
		total += v
	}
	return total * step
}

// inverse finds the optical depth of the weak line at which curve gives delta,
// on the branch that starts at 0; NaN where it does not reach delta below τ₀ = 100.
func inverse(delta float64, curve func(tau0 float64) float64) float64 {
	if !(delta >= 0) {
		return math.NaN()
	}
	if delta == 0 {
		return 0
	}
	hi := 1e-3
	for curve(hi) < delta {
		if hi *= 2; hi > 100 {
			return math.NaN()
		}
	}
	lo := hi / 2
	if hi == 1e-3 {
		lo = 0
	}
	for range 40 {
		mid := (lo + hi) / 2
		if curve(mid) < delta {
			lo = mid
		} else {
			hi = mid
		}
		if hi-lo < 1e-10*hi {
			break
		}
	}
	return (lo + hi) / 2
}
