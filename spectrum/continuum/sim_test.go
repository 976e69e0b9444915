package continuum

import (
	"math"
	"math/rand/v2"
)

// noisy returns n pixels of Gaussian noise of unit variance, coloured by the
// moving average with weights a (normalised).
func noisy(r *rand.Rand, n int, a ...float64) []float64 {
	if len(a) == 0 {
		a = []float64{1}
	}
	norm := 0.0
	for _, v := range a {
		norm += v * v
	}
	norm = math.Sqrt(norm)
	e := make([]float64, n+len(a))
	for i := range e {
		e[i] = r.NormFloat64()
	}
	out := make([]float64, n)
	for i := range out {
		for k, v := range a {
			out[i] += v * e[i+k] / norm
		}
	}
	return out
}

func grid(lo, step float64, n int) []float64 {
	w := make([]float64, n)
	for i := range w {
		w[i] = lo + step*float64(i)
	}
	return w
}

func constant(v float64, n int) []float64 {
	out := make([]float64, n)
	for i := range out {
		out[i] = v
	}
	return out
}

func meanRMS(a []float64) (mean, rms float64) {
	for _, v := range a {
		mean += v
	}
	mean /= float64(len(a))
	for _, v := range a {
		rms += (v - mean) * (v - mean)
	}
	return mean, math.Sqrt(rms / float64(len(a)-1))
}
