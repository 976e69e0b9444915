package continuum

import (
	"fmt"
	"math"

	"lacuna/internal/oops"
	"lacuna/spectrum"
)

// An Audited stretch of spectrum: its noise, and what the error array claims.
type Audited struct {
	Noise
	SN  float64 // median of the continuum over the measured error of a pixel
	Sum float64 // rms of sums of 5 pixels over √5 times the tabulated error
}

// Audit measures the noise of a long segment in stretches of about 200 pixels,
// each about its own continuum of at most degree 3, and all of them together
// (the pooled noise, the second result). Slow structure of the star is taken for
// continuum, so this is the noise of the detector and of the resampling. Ranges
// in exclude (Å) are left out. Without an error array the ratios are 1 and only
// the correlations mean something.
//
// A pooled correlation rests on thousands of pixels where that of one window
// rests on a few hundred: give it to Fit as Options.Noise where both agree.
func Audit(wave, flux, err []float64, mask []spectrum.Reason, exclude [][2]float64) ([]Audited, Noise, error) {
	if e := checkPixels(wave, flux, err, mask); e != nil {
		return nil, Noise{}, e
	}
	const stretch = 200
	n := len(wave)
	parts := max(1, n/stretch)
	var out []Audited
	for k := range parts {
		lo, hi := k*n/parts, (k+1)*n/parts
		var e []float64
		var m []spectrum.Reason
		if err != nil {
			e = err[lo:hi]
		}
		if mask != nil {
			m = mask[lo:hi]
		}
		model, er := Fit(wave[lo:hi], flux[lo:hi], e, m, Options{Degree: -1, Exclude: exclude})
		if er != nil || model.Used < 3*model.Dropped || model.Noise.Pixels < 60 {
			continue
		}
		c := make([]float64, hi-lo)
		model.At(c, wave[lo:hi])
		var sn []float64
		for i, u := range model.Pixels {
			if u {
				sn = append(sn, c[i]/model.Sigma[i])
			}
		}
		a := Audited{Noise: model.Noise, SN: median(sn)}
		a.Sum = a.Ratio * math.Sqrt(a.Tau(5))
		out = append(out, a)
	}
	if len(out) == 0 {
		return nil, Noise{}, oops.Input("", "", fmt.Sprintf("no stretch of line-free continuum between %.2f and %.2f Å to measure the noise on", wave[0], wave[n-1]), "")
	}
	return out, pool(out), nil
}

// pool takes the median of each quantity over the stretches: some hold a wide
// stellar line or a ripple, which would rule a mean.
func pool(a []Audited) Noise {
	p := Noise{Rho: make([]float64, Lags), FromData: a[0].FromData, Range: [2]float64{a[0].Range[0], a[len(a)-1].Range[1]}}
	v := make([]float64, len(a))
	for i := range a {
		p.Pixels += a[i].Pixels
		v[i] = a[i].Ratio
	}
	p.Ratio = median(v)
	for k := range p.Rho {
		for i := range a {
			v[i] = 0
			if k < len(a[i].raw) {
				v[i] = a[i].raw[k]
			}
		}
		p.Rho[k] = median(v)
	}
	positive(p.Rho)
	return p
}
