package measure

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/spectrum/continuum"
)

var nad1 = atomic.Line{Name: "Na I 5895.92", Species: "Na I", Wave: 5897.5581, WaveAir: 5895.9242, F: 0.3201, FErr: 0.0032, Gamma: 6.14e7}

// smeared is e^{−τ} folded with a Gaussian instrument of the given FWHM (km/s) on
// pixels of dv: direct sums on a grid of 0.05 km/s.
func smeared(l atomic.Line, wave []float64, fwhm float64, tau func(v float64) float64) []float64 {
	const h = 0.05
	s := fwhm / 2.3548200450309493
	m := int(6 * s / h)
	k, norm := make([]float64, 2*m+1), 0.0
	for j := range k {
		x := float64(j-m) * h / s
		k[j] = math.Exp(-x * x / 2)
		norm += k[j]
	}
	out := make([]float64, len(wave))
	for i, x := range wave {
		v := velocity(x, l.Wave)
		for j := range k {
			out[i] += k[j] / norm * math.Exp(-tau(v+float64(j-m)*h))
		}
	}
	return out
}

// A component narrower than the instrument: the two apparent columns differ, and the
// correction returns the column that went in.
func TestDoubletCorrection(t *testing.T) {
	r := rand.New(rand.NewPCG(31, 1))
	const n, b, fwhm, sn = 300, 1.2, 6., 400.
	for _, tau1 := range []float64{0.5, 1.0} { // of D1
		truth := math.Log10(perTau / (nad1.F * nad1.Wave) * math.Sqrt(math.Pi) * b * tau1)
		var pull, raw []float64
		clean := map[string][]float64{}
		for _, l := range []atomic.Line{nad, nad1} {
			clean[l.Name] = smeared(l, velocities(l, 1.2, n), fwhm, gaussTau(tau1*l.F*l.Wave/(nad1.F*nad1.Wave), b, 0))
		}
		for range 150 {
			one := func(l atomic.Line) Width {
				wave, err := velocities(l, 1.2, n), constant(1/sn, n)
				flux := noisy(r, n)
				for i, c := range clean[l.Name] {
					flux[i] = c + flux[i]/sn
				}
				p := windowed(t, l, wave, flux, err, 15, continuum.Options{Noise: &continuum.Noise{Ratio: 1}})
				p.FWHM, p.B = fwhm, 1
				p.Line.FErr = 0
				return mustMeasure(t, p)
			}
			strong, weak := one(nad), one(nad1)
			d := CompareDoublet(strong, weak)
			if d.Refused != "" {
				t.Fatalf("τ₀ = %g refused: %s", tau1, d.Refused)
			}
			pull = append(pull, (d.Corrected.X-truth)/d.Corrected.Err())
			raw = append(raw, math.Log10(weak.AOD.X)-truth)
		}
		mean, rms := meanRMS(pull)
		off, _ := meanRMS(raw)
		t.Logf("τ₀ = %g: N_a(weak) off by %.3f dex, corrected by %+.2f ± %.2f σ", tau1, off, mean, rms)
		if !(off < -0.02) || !(math.Abs(mean) < 0.5) || !(rms < 1.3) {
			t.Errorf("τ₀ = %g: corrected off by %.2f ± %.2f σ, uncorrected by %.3f dex", tau1, mean, rms, off)
		}
	}
}

func TestDoubletRefusals(t *testing.T) {
	num := func(x, e float64) budget.Number {
		return budget.Number{X: x, Shifts: []budget.Shift{{Cause: budget.Photon, D: e}}}
	}
	pair := func(delta, err float64) (s, w Width) {
		s = Width{Line: "s", Species: "Na I", F: 0.64, Wave: 5891, Detected: true, AOD: num(1e12, 1e12*err), B: 2}
		w = s
		w.Line, w.F, w.Wave, w.AOD = "w", 0.32, 5891, num(1e12*math.Pow(10, delta), 1e12*err)
		return s, w
	}
	s, w := pair(0.1, 0.02)
	d := CompareDoublet(s, w)
	// δ = 0.10 → +0.118 dex over the weak line (see TestInverseOfCorrection)
	if d.Refused != "" || !(math.Abs(d.Corrected.X-12.1-0.118) < 5e-4) || !(math.Abs(d.Delta.X-0.1) < 1e-12) {
		t.Errorf("%+v", d)
	}
	if d.Corrected.ErrBy(budget.Photon) < d.Delta.Err() {
		t.Error("the correction multiplies the error of δ, yet the error is smaller")
	}
	for name, f := range map[string]func(s, w *Width){
		"above 0.20":     func(s, w *Width) { *s, *w = pair(0.21, 0.01) },
		"half of it":     func(s, w *Width) { *s, *w = pair(0.03, 0.03) },
		"negative":       func(s, w *Width) { *s, *w = pair(-0.1, 0.01) },
		"not 2":          func(s, w *Width) { w.F = 0.2 },
		"stronger":       func(s, w *Width) { w.F = 0.9 },
		"black":          func(s, w *Width) { s.Floored = 3 },
		"detected":       func(s, w *Width) { w.Detected = false },
		"hyperfine":      func(s, w *Width) { s.Split = 1 },
		"Lorentz":        func(s, w *Width) { s.Gamma = 5e9 },
		"same level":     func(s, w *Width) { w.Species = "K I" },
		"apparent colum": func(s, w *Width) { w.AOD.X = math.NaN() },
	} {
		s, w := pair(0.1, 0.01)
		f(&s, &w)
		d := CompareDoublet(s, w)
		if d.Refused == "" || !math.IsNaN(d.Corrected.X) {
			t.Errorf("%s: not refused: %+v", name, d.Corrected)
		} else if !strings.Contains(d.Refused, name) && name != "negative" {
			t.Errorf("%s refused for another reason: %s", name, d.Refused)
		}
	}
}

// The noiseless apparent column never exceeds the true one (Jensen's inequality), falls
// as the instrument widens, and more for the stronger line.
func TestApparentColumnIsALowerBound(t *testing.T) {
	clouds := func(l atomic.Line) func(v float64) float64 {
		k := l.F * l.Wave / (nad1.F * nad1.Wave)
		return func(v float64) float64 {
			return k * (gaussTau(1.5, 0.6, -2)(v) + gaussTau(0.8, 0.8, 1)(v) + gaussTau(0.3, 3, 3)(v))
		}
	}
	truth := math.Sqrt(math.Pi) * (1.5*0.6 + 0.8*0.8 + 0.3*3) * perTau / (nad1.F * nad1.Wave)
	last := 1.0
	for _, fwhm := range []float64{0.3, 1.5, 3.75, 7.5} {
		col := func(l atomic.Line) float64 {
			wave := velocities(l, 0.2, 400)
			return mustMeasure(t, Piece{Line: l, Wave: wave, Flux: smeared(l, wave, fwhm, clouds(l)), Continuum: flat(1, 0, wave, constant(1e-5, 400)), Window: [2]float64{-35, 35}}).AOD.X / truth
		}
		weak, strong := col(nad1), col(nad)
		if !(weak <= 1+1e-6) || !(strong <= weak) || !(weak < last) {
			t.Errorf("FWHM %g: N_a/N = %.4f (weak), %.4f (strong), before %.4f", fwhm, weak, strong, last)
		}
		last = weak
	}
}

func TestWings(t *testing.T) {
	// Pure damping: W_v/b = 2√(√π a τ₀) (Lorentz limit of the growth curve), so that the
	// wings dominate; and none without damping.
	if got := wings(10, 0, 5891, 2); got != 0 {
		t.Errorf("no damping: %g", got)
	}
	tau, gamma, wave, b := 1e6, 6e7, 5891., 2.
	a := 1e-13 * gamma * wave / (4 * math.Pi * b)
	want := 2 * math.Sqrt(math.Sqrt(math.Pi)*a*tau)
	if got := (wings(tau, gamma, wave, b) + 1) * growth(tau); !(math.Abs(got/want-1) < 0.02) { // the core adds a little
		t.Errorf("damped width %.3f b, want %.3f", got, want)
	}
}
