package measure

import "math"

// mostTau stands for an optical depth without an upper end.
const mostTau = 1e9

// blurred is the depth at velocity v of a Gaussian component seen through an
// instrument with a Gaussian profile of b_inst (2σ² = b_inst²),
//
//	D(v) = ∫ (1 − exp(−τ₀ e^(−x²/b²))) e^(−(v−x)²/b_inst²) dx / (√π b_inst),
//
// by the trapezoidal rule, exact to 1e-4 for b_inst above a tenth of the
// component's width: both factors are smooth and vanish at the ends.
func blurred(v, tau0, b, inst float64) float64 {
	const n = 40
	reach := b * math.Sqrt(math.Log1p(tau0)+16) // τ < 1e-7 beyond
	h := reach / n
	sum := 0.0
	for i := range n + 1 { // the component is symmetric
		x := h * float64(i)
		k, l := (v-x)/inst, (v+x)/inst
		g := math.Exp(-k * k)
		switch {
		case i == 0:
		case v == 0:
			g *= 2
		default:
			g += math.Exp(-l * l)
		}
		sum -= math.Expm1(-tau0*math.Exp(-x*x/(b*b))) * g
	}
	return sum * h / (math.Sqrt(math.Pi) * inst)
}

// blurredTau is the τ₀ with which a component has the central depth given.
func blurredTau(depth, b, inst float64) float64 {
	if !(inst > 0.1*b) { // resolved
		return min(-math.Log1p(-min(depth, 1)), mostTau)
	}
	lo, hi := math.Log(1e-8), math.Log(mostTau)
	for range 24 { // to 2e-6
		if mid := (lo + hi) / 2; blurred(0, math.Exp(mid), b, inst) < depth {
			lo = mid
		} else {
			hi = mid
		}
	}
	return math.Exp(hi)
}

// blurredWidth is the full width at half depth of a component.
func blurredWidth(tau0, b, inst float64) float64 {
	if !(inst > 0.1*b) { // where 1 − e^−τ is half of its peak
		half := -math.Log1p(math.Expm1(-tau0) / 2)
		return 2 * b * math.Sqrt(math.Log(tau0/half))
	}
	half := blurred(0, tau0, b, inst) / 2
	lo, hi := 0.0, 10*(inst+b*math.Sqrt(1+math.Log1p(tau0)))
	for range 16 { // to 1e-4
		if mid := (lo + hi) / 2; blurred(mid, tau0, b, inst) > half {
			lo = mid
		} else {
			hi = mid
		}
	}
	return lo + hi
}
