package continuum

import (
	"math"
	"slices"
)

// Lags is the largest lag at which the correlation of the noise is measured.
// Resampling to a wavelength grid correlates two or three pixels; the ESO files
// that this was tried on show nothing beyond lag 3.
const Lags = 5

// measure estimates the noise from residuals in units of the expected error, on
// the pixels with use, about a polynomial of p coefficients; cut are the
// thresholds (in σ, both positive) beyond which residuals had been rejected, 0
// for none.
//
// A fitted polynomial takes p slowly varying modes out of the noise, each of the
// variance Ratio² T, T = 1 + 2Σρ, so every covariance c_k = ⟨rᵢrᵢ₊ₖ⟩ comes out low
// by about pT/n, which is put back. Correlations are shrunk by the factor
// ρ²/(ρ² + 1/n), which leaves little of a value that is within its own error of 0:
// otherwise five noisy lags would make each error wrong by several per cent.
func measure(r []float64, use []bool, p int, cut [2]float64) Noise {
	n, s0 := 0, 0.0
	for i, u := range use {
		if u {
			n++
			s0 += r[i] * r[i]
		}
	}
	out := Noise{Ratio: math.NaN(), Pixels: n}
	if n <= p+1 {
		return out
	}
	s0 /= float64(n)
	lags := max(0, min(Lags, n/(8*max(p, 1))))
	c, pairs := make([]float64, lags), make([]int, lags)
	t := s0
	for k := range c {
		lag := k + 1
		for i := 0; i+lag < len(use); i++ {
			if use[i] && use[i+lag] {
				c[k] += r[i] * r[i+lag]
				pairs[k]++
			}
		}
		if pairs[k] > 0 {
			c[k] /= float64(pairs[k])
		}
		t += 2 * c[k]
	}
	lost := float64(p) / float64(n)
	t = max(t, 0) / (1 - float64(2*lags+1)*lost)
	c0 := s0 + t*lost
	out.Rho, out.raw = make([]float64, lags), make([]float64, lags)
	for k := range c {
		rho := (c[k] + t*lost) / c0
		out.raw[k] = rho
		if pairs[k] < 4 {
			continue
		}
		out.Rho[k] = rho * max(0, 1-1/(float64(pairs[k])*rho*rho))
	}
	positive(out.Rho)
	c0 = s0 / (1 - min(0.9, out.Tau(0)*lost)) // again, with the correlations kept
	out.Ratio = math.Sqrt(c0 / truncated(cut))
	return out
}

// truncated is the variance of a unit Gaussian cut at −cut[0] and +cut[1].
func truncated(cut [2]float64) float64 {
	phi := func(x float64) float64 { return math.Exp(-x*x/2) / math.Sqrt(2*math.Pi) }
	l, h := cut[0], cut[1]
	if l <= 0 || h <= 0 || math.IsInf(l, 0) && math.IsInf(h, 0) {
		return 1
	}
	mass := (math.Erf(h/math.Sqrt2) + math.Erf(l/math.Sqrt2)) / 2
	mean := (phi(l) - phi(h)) / mass
	return 1 - (h*phi(h)+l*phi(l))/mass - mean*mean
}

// positive changes correlations as little as it can until the power spectrum
// 1 + 2Σρ_k cos kω is at least 0.02 everywhere: only then do they belong to any
// noise at all, and give every sum a positive variance. Measured values miss that
// by a little where the true spectrum touches 0 (data resampled between pixels do).
// The spectrum is cut at the floor and turned back into the same few lags, in
// turns; that leaves its low frequencies, which rule the error of a sum, alone.
// It reports whether it changed anything.
func positive(rho []float64) bool {
	const floor, grid = 0.02, 128
	lowest := func() (low float64, spec [grid + 1]float64) {
		low = 1
		for j := range spec {
			spec[j] = 1
			for k, v := range rho {
				spec[j] += 2 * v * cosines[j*(k+1)%(2*grid)]
			}
			low = min(low, spec[j])
		}
		return low, spec
	}
	low, spec := lowest()
	if low >= floor {
		return false
	}
	for range 30 {
		c := make([]float64, len(rho)+1)
		for j, s := range spec {
			s = max(s, floor)
			if j == 0 || j == grid {
				s /= 2
			}
			for k := range c {
				c[k] += s * cosines[j*k%(2*grid)]
			}
		}
		for k := range rho {
			rho[k] = c[k+1] / c[0]
		}
		if low, spec = lowest(); low >= floor {
			return true
		}
	}
	f := (1 - floor) / (1 - low)
	for k := range rho {
		rho[k] *= f
	}
	return true
}

// cosines holds cos(πj/128).
var cosines = func() (c [256]float64) {
	for j := range c {
		c[j] = math.Cos(math.Pi * float64(j) / 128)
	}
	return c
}()

// scatter is a robust first guess of the error of one pixel, from differences
// over Lags+1 pixels: lines, slopes and correlated neighbours hardly touch it.
func scatter(y, sigma []float64, use []bool) float64 {
	const lag = Lags + 1
	var d []float64
	for i := 0; i+lag < len(y); i++ {
		if use[i] && use[i+lag] {
			d = append(d, (y[i+lag]-y[i])/math.Hypot(sigma[i], sigma[i+lag]))
		}
	}
	if len(d) < 8 {
		return math.NaN()
	}
	return mad(d)
}

// mad is 1.4826 times the median absolute deviation from the median; it
// reorders d.
func mad(d []float64) float64 {
	m := median(d)
	for i := range d {
		d[i] = math.Abs(d[i] - m)
	}
	return 1.4826 * median(d)
}

func median(d []float64) float64 {
	slices.Sort(d)
	n := len(d)
	if n == 0 {
		return math.NaN()
	}
	return (d[(n-1)/2] + d[n/2]) / 2
}

// smooth returns the errors that weights are made of: the median of the
// tabulated errors of the 101 pixels around each. A pixel's own Poisson error is
// small where its count is low by chance, so weighting by it pulls the continuum
// down (by 4 % at 20 counts); and it is 0 where no count fell. An error three
// times the median or more is believed: such a pixel is damaged.
func smooth(err []float64, good []bool) []float64 {
	const half = 50
	n := len(err)
	out := make([]float64, n)
	var win []float64 // ascending
	insert := func(v float64) { i, _ := slices.BinarySearch(win, v); win = slices.Insert(win, i, v) }
	remove := func(v float64) { i, _ := slices.BinarySearch(win, v); win = slices.Delete(win, i, i+1) }
	ok := func(i int) bool { return good[i] && err[i] > 0 && !math.IsInf(err[i], 0) }
	for i := range min(half, n) {
		if ok(i) {
			insert(err[i])
		}
	}
	last := math.NaN()
	for i := range n {
		if j := i + half; j < n && ok(j) {
			insert(err[j])
		}
		if j := i - half - 1; j >= 0 && ok(j) {
			remove(err[j])
		}
		if m := len(win); m > 0 {
			last = (win[(m-1)/2] + win[m/2]) / 2
		}
		out[i] = last
		if ok(i) && err[i] > 3*last {
			out[i] = err[i]
		}
	}
	for i := n - 2; i >= 0; i-- { // a gap at the beginning
		if math.IsNaN(out[i]) {
			out[i] = out[i+1]
		}
	}
	return out
}

// oneCount is the error of a pixel in which no count fell: the smallest error
// above 0 among the 101 pixels around it, which is that of about one count.
func oneCount(err []float64, good []bool, i int) float64 {
	least := math.Inf(1)
	for j := max(0, i-50); j < min(len(err), i+51); j++ {
		if good[j] && err[j] > 0 {
			least = min(least, err[j])
		}
	}
	return least
}
