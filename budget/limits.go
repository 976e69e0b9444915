package budget

import "math"

// DetectionSigma is the significance from which a sum of non-detections counts as
// detected (common practice, no source).
const DetectionSigma = 3

// SumColumns returns the sum of linear column densities (cm⁻², none of which can
// be negative in truth), some of which may be limits:
//
//	value + value       value
//	value + upper       interval from the value to the value plus the limit
//	value + lower       lower limit
//	upper + upper       Σ best values ± σ where all are our own non-detections,
//	                    else the sum of the limits
//	upper + lower       lower limit: the upper limit adds nothing
//	interval + …        end by end, in the same way
//	none + …            none
//
// Our own non-detections (Limit) enter any sum as their N ± σ, unless the result
// is a limit anyway. A sum of nothing but non-detections is a value where it
// reaches max(Conf) σ, else an upper limit at Σ + Conf σ with N ± σ behind it.
// Conf of a result is the smallest of the limits that shape it, 0 if one of
// those is unknown. Shared shifts add before they are squared. Of no numbers the
// sum is none.
func SumColumns(n ...Number) Number {
	switch len(n) {
	case 0:
		return Number{X: math.NaN()}
	case 1:
		return n[0].Plain()
	}
	plain := make([]Number, len(n))
	foreign, lower, known, values := false, false, 0., 0
	for i, a := range n {
		a = a.Plain()
		switch {
		case a.Is(Lower):
			lower = true
		case a.Is(Upper) && a.Behind != nil:
			known = math.Max(known, a.Conf)
		case a.Is(Upper):
			foreign = true
		default:
			values++
		}
		plain[i] = a
	}
	onlyLimits := values == 0 && foreign // no better than the sum of the limits
	own := 0
	for i, a := range plain {
		if a.Is(Upper) && a.Behind != nil && !lower && !onlyLimits {
			plain[i] = *a.Behind
			plain[i].Flag |= a.Flag &^ Upper
			own++
		}
	}
	out := rangeSum(ones(len(plain)), plain, true)
	if own == len(n) {
		if !(known > 0) {
			known = DetectionSigma
		}
		if out.X < known*out.Err() {
			return Limit(out, math.Max(out.X, 0)+known*out.Err(), known)
		}
	}
	if out.Is(Marginal) && out.X >= DetectionSigma*out.Err() {
		out.Flag &^= Marginal
	}
	return out
}

// Ratio returns log x − log h of two logarithms (dex), either of which may be a
// limit:
//
//	        h value    h upper   h lower   h interval
//	value   value      lower     upper     interval
//	upper   upper      none      upper     upper
//	lower   lower      lower     none      lower
//	interval interval  lower     upper     interval
//
// where none has X = NaN. What x and h share cancels exactly. An interval is
// not a shift: two ratios to one interval do not lose it when they are
// subtracted, so form the ratio of the two columns itself.
func Ratio(x, h Number) Number {
	return rangeSum([]float64{1, -1}, []Number{x.Plain(), h.Plain()}, false)
}

// rangeSum adds w·n (w = ±1) end by end. Limits of quantities that cannot be
// negative (positive) have 0 as their other end.
func rangeSum(w []float64, n []Number, positive bool) Number {
	out := combine(w, n)
	out.Behind = nil
	var lo, hi float64
	limits := false
	for i, a := range n {
		l, h := a.ends()
		if positive && a.Is(Upper) {
			l = math.Min(0, h)
		}
		if w[i] < 0 {
			l, h = -h, -l
		}
		lo += l
		hi += h
		limits = limits || a.Flag&reading != 0
	}
	if !limits {
		return out
	}
	out.Flag &^= reading
	out.Up, out.Lo = 0, 0
	onlyUpper := positive
	for _, a := range n {
		onlyUpper = onlyUpper && a.Is(Upper)
	}
	openLo, openHi := math.IsInf(lo, -1), math.IsInf(hi, 1)
	switch {
	case math.IsNaN(out.X) || openLo && openHi:
		return Number{X: math.NaN(), Flag: out.Flag, From: out.From}
	case onlyUpper || openLo:
		out.X = hi
		out.Flag |= Upper
	case openHi:
		out.X = lo
		out.Flag |= Lower
	case hi > lo:
		out.X = lo + (hi-lo)/2
		out.Up, out.Lo = (hi-lo)/2, (hi-lo)/2
		out.Flag |= Interval
	default: // an interval of no width
		out.X = lo
	}
	out.Conf = sharedConf(w, n, out.Flag)
	return out
}

// sharedConf returns the smallest confidence of the limits that shape a result:
// those with an end on the side that is finite in it.
func sharedConf(w []float64, n []Number, f Flag) float64 {
	conf, found := 0., false
	for i, a := range n {
		upper, lower := a.Is(Upper), a.Is(Lower)
		if w[i] < 0 {
			upper, lower = lower, upper
		}
		shapes := a.Is(Interval) && a.Conf > 0 ||
			upper && f&(Upper|Interval) != 0 || lower && f&(Lower|Interval) != 0
		if shapes && (!found || a.Conf < conf) {
			conf, found = a.Conf, true
		}
	}
	return conf
}

func ones(n int) []float64 {
	w := make([]float64, n)
	for i := range w {
		w[i] = 1
	}
	return w
}
