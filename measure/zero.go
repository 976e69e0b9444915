package measure

import (
	"math"

	"lacuna/spectrum"
	"lacuna/spectrum/continuum"
)

// Runs of pixels that count as black cores.
const (
	blackest = 0.05 // of the continuum: brighter pixels are not looked at
	leastRun = 5    // pixels left after trimming
)

// ZeroLevel measures where zero flux lies from black cores in one order. wave (Å),
// flux, cont (continuum) and sigma (error of a pixel, as audited) have equal
// length; mask may be nil.
//
// A core is a run of pixels below 0.05 of the continuum (or 4σ, at most 0.15). Its
// ends are cut until they are no brighter than its middle, so that the walls of
// the line do not count; at least 5 pixels must be left, and their outer half may
// not be brighter than the inner half by more than 2σ, as in the bottom of a line
// that is not quite black. The level is the mean over all cores, each weighted by its
// error with correlated noise; where cores differ by more than their errors, the
// error grows by √χ²_ν. The core shows z/(1+z) of the observed continuum, which
// holds the added light too; z comes back.
//
// ok is false where there is no such core.
func ZeroLevel(wave, flux, cont, sigma []float64, noise continuum.Noise, mask []spectrum.Reason) (z Zero, ok bool) {
	n := len(wave)
	if len(flux) != n || len(cont) != n || len(sigma) != n || mask != nil && len(mask) != n {
		panic("measure: ZeroLevel: slices differ in length")
	}
	l, s := make([]float64, n), make([]float64, n)
	dark := make([]bool, n)
	for i := range l {
		if mask != nil && mask[i].Bad() || !(cont[i] > 0) || !(sigma[i] >= 0) || math.IsNaN(flux[i]) || math.IsInf(flux[i], 0) {
			continue
		}
		l[i], s[i] = flux[i]/cont[i], sigma[i]/cont[i]
		dark[i] = s[i] < 0.1 && l[i] < min(max(blackest, 4*s[i]), 0.15)
	}
	type core struct{ mean, v float64 }
	var cores []core
	for i := 0; i < n; i++ {
		if !dark[i] {
			continue
		}
		j := i
		for j+1 < n && dark[j+1] {
			j++
		}
		if a, b, good := bottom(l, s, i, j, noise); good {
			m, v := meanOf(l, s, a, b, noise)
			cores = append(cores, core{m, v})
			z.Pixels += b - a + 1
		}
		i = j
	}
	if len(cores) == 0 {
		return Zero{}, false
	}
	sw, m := 0.0, 0.0
	for _, c := range cores {
		sw += 1 / c.v
		m += c.mean / c.v
	}
	m /= sw
	chi2 := 0.0
	for _, c := range cores {
		chi2 += (c.mean - m) * (c.mean - m) / c.v
	}
	e := math.Sqrt(1 / sw)
	if k := float64(len(cores) - 1); k > 0 && chi2 > k {
		e *= math.Sqrt(chi2 / k)
	}
	z.Level, z.Err, z.By = m/(1-m), e/((1-m)*(1-m)), "black cores"
	return z, true
}

// bottom trims the run i..j to its flat part.
func bottom(l, s []float64, i, j int, noise continuum.Noise) (a, b int, ok bool) {
	a, b = i+1, j-1 // the first and the last pixel are wall
	for b-a+1 >= leastRun {
		q := (b - a + 1) / 4
		mid, v := meanOf(l, s, a+q, b-q, noise)
		left, vl := meanOf(l, s, a, a+1, noise)
		right, vr := meanOf(l, s, b-1, b, noise)
		zl, zr := (left-mid)/math.Sqrt(v+vl), (right-mid)/math.Sqrt(v+vr)
		switch {
		case zl > 1 && zl >= zr:
			a++
		case zr > 1:
			b--
		default:
			outer, vo := 0.0, 0.0
			if q > 0 {
				m1, v1 := meanOf(l, s, a, a+q-1, noise)
				m2, v2 := meanOf(l, s, b-q+1, b, noise)
				outer, vo = (m1+m2)/2, (v1+v2)/4
			} else {
				outer, vo = mid, v
			}
			return a, b, outer-mid < 2*math.Sqrt(v+vo)
		}
	}
	return a, b, false
}

// meanOf is the plain mean of pixels a..b and its variance. Weights by a pixel's own
// error would favour low counts.
func meanOf(l, s []float64, a, b int, noise continuum.Noise) (mean, v float64) {
	k := float64(b - a + 1)
	g := make([]float64, b-a+1)
	for i := a; i <= b; i++ {
		mean += l[i] / k
		g[i-a] = 1 / k
	}
	return mean, max(noise.Variance(g, s[a:b+1]), 1e-18)
}
