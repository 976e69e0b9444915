package budget

import "math"

// linearBelow is the relative error below which an error in dex is simply
// σ/(N ln 10); from there on the two sides are taken apart (common practice, no
// source).
const linearBelow = 0.2

// Log10 returns log₁₀ n of a linear number, in dex. Each shift becomes
// D/(X ln 10), so that keys stay comparable. With s = σ/X:
//
//	s < 0.2   symmetric, s/ln 10
//	s ≥ 0.2   Up = log₁₀(1+s), Lo = −log₁₀(1−s); Lo = +Inf (open) if s ≥ 1
//
// Limits stay limits, with what is behind them; the ends of an interval are
// transformed one by one, and an interval that reaches 0 becomes an upper limit.
// A value or a limit at or below 0 has no logarithm: X is NaN. Make a limit of a
// non-detection (Limit) before taking its logarithm.
func Log10(n Number) Number {
	n = n.Plain()
	const ln10 = math.Ln10
	out := n.clone()
	if n.Is(Interval) {
		lo, hi := n.ends()
		if lo <= 0 {
			out.Flag = out.Flag&^Interval | Upper
			out.X, out.Up, out.Lo = hi, 0, 0
			return Log10(out)
		}
		a, b := math.Log10(lo), math.Log10(hi)
		out.X, out.Up, out.Lo = a+(b-a)/2, (b-a)/2, (b-a)/2
		out.scaleShifts(1 / (n.X * ln10))
		return out
	}
	if !(n.X > 0) || math.IsInf(n.X, 0) {
		return Number{X: math.NaN(), Flag: n.Flag &^ reading, From: out.From}
	}
	out.X = math.Log10(n.X)
	out.scaleShifts(1 / (n.X * ln10))
	out.Up, out.Lo = 0, 0
	if n.Flag&reading != 0 {
		return out
	}
	su, sl := n.ErrUp()/n.X, n.ErrLo()/n.X
	if su == sl && su < linearBelow {
		if n.Err() == 0 && su > 0 { // symmetric errors that came as Up and Lo
			out.Up, out.Lo = su/ln10, sl/ln10
		}
		return out
	}
	out.Up = math.Log1p(su) / ln10
	out.Lo = math.Inf(1)
	if sl < 1 {
		out.Lo = -math.Log1p(-sl) / ln10
	}
	return out
}

// Pow10 returns 10ⁿ of a logarithm in dex, the inverse of Log10: shifts become
// D·X·ln 10; an error in dex that is asymmetric, or symmetric but 20 % or more in
// the column, gives Up = X(10^up − 1) and Lo = X(1 − 10^−lo), which are dropped
// again where they are equal. Columns beyond a float64 are NaN.
func Pow10(n Number) Number {
	n = n.Plain()
	const ln10 = math.Ln10
	out := n.clone()
	if n.Is(Interval) {
		lo, hi := n.ends()
		a, b := math.Pow(10, lo), math.Pow(10, hi)
		out.X, out.Up, out.Lo = a+(b-a)/2, (b-a)/2, (b-a)/2
		out.scaleShifts(out.X * ln10)
		if math.IsInf(out.X, 0) {
			out.X = math.NaN()
		}
		return out
	}
	out.X = math.Pow(10, n.X)
	if math.IsNaN(out.X) || math.IsInf(out.X, 0) {
		return Number{X: math.NaN(), Flag: n.Flag &^ reading, From: out.From}
	}
	out.scaleShifts(out.X * ln10)
	out.Up, out.Lo = 0, 0
	if n.Flag&reading != 0 {
		return out
	}
	up, lo := n.ErrUp(), n.ErrLo()
	if up == lo && up < linearBelow/ln10 {
		if n.Err() == 0 && up > 0 {
			out.Up, out.Lo = out.X*up*ln10, out.X*lo*ln10
		}
		return out
	}
	out.Up = out.X * math.Expm1(up*ln10)
	out.Lo = -out.X * math.Expm1(-lo*ln10) // lo = +Inf: as far as 0
	if e := n.Err() * out.X * ln10; nearly(out.Up, e) && (nearly(out.Lo, e) || math.IsInf(lo, 1)) {
		out.Up, out.Lo = 0, 0 // it was symmetric in the column
	}
	return out
}

// nearly allows for the rounding of one Log10 and one Pow10.
func nearly(a, b float64) bool { return math.Abs(a-b) <= 1e-12*math.Max(math.Abs(a), math.Abs(b)) }

func (n *Number) scaleShifts(k float64) {
	for i := range n.Shifts {
		n.Shifts[i].D *= k
	}
}
