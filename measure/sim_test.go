package measure

import (
	"math"
	"math/rand/v2"
	"testing"

	"lacuna/atomic"
	"lacuna/spectrum/continuum"
)

// K I 7699 and Na I D2, rows of the transition table (NIST, as copied there).
var (
	ki  = atomic.Line{Name: "K I 7698.96", Species: "K I", Wave: 7701.0835, WaveAir: 7698.9645, F: 0.3327, FErr: 0.0033, Gamma: 3.8e7}
	nad = atomic.Line{Name: "Na I 5889.95", Species: "Na I", Wave: 5891.5833, WaveAir: 5889.9510, F: 0.6408, FErr: 0.0064, Gamma: 6.16e7}
)

// noisy returns n pixels of Gaussian noise of unit variance, coloured by the
// moving average with weights a.
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

// velocities returns the wavelengths of n pixels of dv km/s about a line.
func velocities(l atomic.Line, dv float64, n int) []float64 {
	w := make([]float64, n)
	for i := range w {
		w[i] = wavelength(l.Wave, dv*(float64(i)-float64(n-1)/2))
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

// flat is a continuum that is known: level c with the relative error e, pixels with
// errors sigma.
func flat(c, e float64, wave, sigma []float64) continuum.Model {
	return continuum.Model{
		Domain: [2]float64{wave[0], wave[len(wave)-1]}, Coef: []float64{c}, Cov: []float64{c * c * e * e},
		Wave: wave, Sigma: sigma, Noise: continuum.Noise{Ratio: 1}, By: "known",
	}
}

// gaussTau is the optical depth τ₀ exp(−(v−v0)²/b²).
func gaussTau(tau0, b, v0 float64) func(v float64) float64 {
	return func(v float64) float64 { return tau0 * math.Exp(-(v-v0)*(v-v0)/(b*b)) }
}

// absorbed is flux e^{−τ} averaged over each pixel (16 points of each).
func absorbed(l atomic.Line, wave []float64, tau func(v float64) float64) []float64 {
	e := edges(wave)
	out := make([]float64, len(wave))
	for i := range out {
		for k := range 16 {
			x := e[i] + (e[i+1]-e[i])*(float64(k)+0.5)/16
			out[i] += math.Exp(-tau(velocity(x, l.Wave))) / 16
		}
	}
	return out
}

func mustMeasure(t testing.TB, p Piece) Width {
	t.Helper()
	w, err := Measure(p)
	if err != nil {
		t.Fatal(err)
	}
	return w
}

func mustFit(t testing.TB, wave, flux, err []float64, o continuum.Options) continuum.Model {
	t.Helper()
	m, e := continuum.Fit(wave, flux, err, nil, o)
	if e != nil {
		t.Fatal(e)
	}
	return m
}
