package continuum

import (
	"math"
	"slices"
)

// solve fits coef to the pixels with use and leaves the residuals of all pixels,
// in units of sig, in w.r.
func (w *work) solve(coef []float64, use []bool) error {
	if err := w.b.fit(coef, w.y, w.w, use); err != nil {
		return err
	}
	for i := range w.r {
		w.r[i] = 0
		if w.good[i] {
			w.r[i] = (w.y[i] - legendreSum(coef, w.x[i])) / w.sig[i]
		}
	}
	return nil
}

// sel chooses the continuum pixels for one degree; the residuals of the fit to
// them stay in w.r.
func (w *work) sel(degree int) ([]bool, error) {
	coef := make([]float64, degree+1)
	use := slices.Clone(w.adm)
	if err := w.solve(coef, use); err != nil {
		return nil, w.tooFew(use, degree)
	}
	first := w.firstScale(use)
	floor := 1e-9 / slices.Min(w.sig) // a spectrum without noise
	auto := w.o.Windows == nil
	if auto { // the upper envelope
		for range 15 {
			s := max(first, floor)
			next := slices.Clone(w.adm)
			for i := range next {
				next[i] = next[i] && w.r[i] > -2*s && w.r[i] < w.o.High*s
			}
			if slices.Equal(next, use) {
				break
			}
			if w.count(next) < degree+3 || w.solve(coef, next) != nil {
				break
			}
			use = next
		}
	}
	s := first
	for range 20 {
		noise := w.noise(w.r, use, degree+1)
		if w.knownRatio() {
			s = noise.Ratio
		} else if !math.IsNaN(noise.Ratio) {
			s = min(max(noise.Ratio, 0.6*first), 1.6*first)
		}
		next := w.reject(w.adm, max(s, floor), noise, auto)
		if slices.Equal(next, use) {
			break
		}
		if err := w.solve(coef, next); err != nil {
			return nil, w.tooFew(next, degree)
		}
		use = next
	}
	if w.count(use) < degree+3 {
		return nil, w.tooFew(use, degree)
	}
	return use, nil
}

func (w *work) count(use []bool) int {
	n := 0
	for _, u := range use {
		if u {
			n++
		}
	}
	return n
}

// firstScale is the error of one pixel over sig before any continuum is known.
func (w *work) firstScale(use []bool) float64 {
	if w.knownRatio() {
		return w.o.Noise.Ratio
	}
	s := scatter(w.y, w.sig, use)
	if math.IsNaN(s) {
		var d []float64
		for i, u := range use {
			if u {
				d = append(d, w.r[i])
			}
		}
		s = mad(d)
	}
	return s
}

// reject returns the candidates that are neither outliers nor, where features
// is set, inside a feature, given the residuals w.r and the error s of a pixel.
func (w *work) reject(cand []bool, s float64, noise Noise, features bool) []bool {
	use := slices.Clone(cand)
	if features {
		w.features(use, cand, s, noise)
	}
	for i := range use {
		if w.r[i] < -w.o.Low*s || w.r[i] > w.o.High*s {
			use[i] = false
		}
	}
	return use
}

// features clears use where a stretch of pixels lies off the continuum together.
// A sum of m pixels has the variance m·Tau(m). At 4.5 and 5.5 σ some 400 pixels
// without any line lose a stretch in less than one spectrum in a hundred. Short
// stretches go first, and what they took is left out of the longer ones: a long
// stretch that only touches a deep line is no feature.
func (w *work) features(use, cand []bool, s float64, noise Noise) {
	n := len(cand)
	left := slices.Clone(cand) // not yet taken
	sum, num := make([]float64, n+1), make([]int, n+1)
	add := func() {
		for i := range left {
			sum[i+1], num[i+1] = sum[i], num[i]
			if left[i] {
				sum[i+1] += w.r[i] / s
				num[i+1]++
			}
		}
	}
	take := make([]int8, n) // sign of the feature
	// off reports whether pixels a to b still lie off on one side
	off := func(a, b int, sign int8) bool {
		a, b = max(a, 0), min(b+1, n)
		if a >= b {
			return false
		}
		k := num[b] - num[a]
		return k > 0 && (sum[b]-sum[a])*float64(sign) > 0.6*math.Sqrt(float64(k))
	}
	for _, m := range [...]int{1, 3, 5, 9, 17, 33} {
		add()
		tau, any := noise.Tau(m), false
		for i := 0; i+m <= n; i++ {
			k := num[i+m] - num[i]
			if k == 0 || k < m/3 {
				continue
			}
			z := (sum[i+m] - sum[i]) / math.Sqrt(float64(k)*tau)
			if z > -4.5 && z < 5.5 {
				continue
			}
			sign := int8(1)
			if z < 0 {
				sign = -1
			}
			a, b := i, i+m-1
			for a < b && !off(a-1, a+1, sign) {
				a++
			}
			for b > a && !off(b-1, b+1, sign) {
				b--
			}
			for j := a; j <= b; j++ {
				take[j] = sign
			}
			any = true
		}
		if any {
			for j, t := range take {
				left[j] = left[j] && t == 0
			}
		}
	}
	copy(left, cand)
	add()
	for a := 0; a < n; a++ {
		if take[a] == 0 {
			continue
		}
		b, sign := a, take[a]
		for b+1 < n && take[b+1] == sign {
			b++
		}
		// A wide feature has wide wings: look as far outwards as half its width.
		h := min(max(2, (b-a)/2), 16)
		lo, hi := a, b
		for lo > 0 && (off(lo-3, lo-1, sign) || off(lo-h, lo-1, sign)) {
			lo--
		}
		for hi+1 < n && (off(hi+1, hi+3, sign) || off(hi+1, hi+h, sign)) {
			hi++
		}
		for j := lo; j <= hi; j++ {
			use[j] = false
		}
		a = b
	}
}
