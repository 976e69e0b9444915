package main

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"lacuna/atomic"
	"lacuna/internal/check"
	"lacuna/voigt"
	"lacuna/voigt/lsf"
)

// The abscissae and weights integrate powers up to 15 exactly.
func TestLegendreSums(t *testing.T) {
	for p := range 16 {
		s := 0.0
		for k, x := range legendreX {
			s += legendreW[k] * math.Pow(x, float64(p))
		}
		want := 0.0
		if p%2 == 0 {
			want = 2 / float64(p+1)
		}
		if !(math.Abs(s-want) <= 1e-14) {
			t.Errorf("∫ x^%d = %.16f, want %.16f", p, s, want)
		}
	}
}

// integral is H(a, u) = 1/√π ∫₀^∞ exp(−ax − x²/4) cos(ux) dx (DLMF 7.19.3 with 7.19.1
// turned by Fourier), by Gauss–Legendre sums over cells of a twentieth of a wave.
func integral(a, u float64) float64 {
	const end = 13 // exp(−13²/4) = 4e-19
	n := int(end*max(u, 4)) + 1
	h := float64(end) / float64(n)
	s := 0.0
	for i := range n {
		for k, x := range legendreX {
			y := (float64(i) + (1+x)/2) * h
			s += legendreW[k] * h / 2 * math.Exp(-a*y-y*y/4) * math.Cos(u*y)
		}
	}
	return s / math.SqrtPi
}

func TestVoigtAgainstIntegral(t *testing.T) {
	for _, a := range []float64{0, 1e-4, 3e-3, 0.02} {
		for u := 0.0; u < 30; u += 0.0371 {
			tol := 2e-13 // rounding of the sum of 1000 terms, and the cubic
			if u >= nearU {
				tol = 1e-11 // a³ in the wings
			}
			if d := math.Abs(voigtH(a, u) - integral(a, u)); !(d <= tol) {
				t.Fatalf("H(%g, %g) = %.15g, the integral is %.15g", a, u, voigtH(a, u), integral(a, u))
			}
		}
	}
}

// checks/voigt_function.csv has 50-digit values.
func TestVoigtTable(t *testing.T) {
	n := 0
	for _, r := range check.CSV(t, check.Shared(t, "checks/voigt_function.csv")) {
		a, u, want := check.F(t, r, "a"), check.F(t, r, "u"), check.F(t, r, "H")
		if a > 0.02 {
			continue
		}
		n++
		if got := voigtH(a, u); !(math.Abs(got-want) <= 1e-11) { // a³ in the wings
			t.Errorf("H(%g, %g) = %.15g, want %.15g", a, u, got, want)
		}
	}
	if n < 20 {
		t.Errorf("only %d values compared", n)
	}
}

// checks/synthetic_profiles.csv: intensities behind a Gaussian instrument of constant
// width in velocity, exact to 1e-10 (README.md there).
func TestSyntheticProfiles(t *testing.T) {
	rows := check.CSV(t, check.Shared(t, "checks/synthetic_profiles.csv"))
	// The tables rest on CODATA 2018 (README.md there).
	const unit = 0.026540088560 / (math.Pi * 2.8179403205e-13 * lightSpeed * 1e5)
	n, worst := 0, 0.0
	for _, lr := range check.CSV(t, check.Shared(t, "checks/synthetic_lines.csv")) {
		l := atomic.Line{Wave: check.F(t, lr, "lambda_vac_A"), F: unit * check.F(t, lr, "f"), Gamma: check.F(t, lr, "gamma_s")}
		var clouds []gas
		for _, r := range check.CSV(t, check.Shared(t, "checks/synthetic_components.csv")) {
			if r["sightline"] == lr["sightline"] {
				clouds = append(clouds, gas{check.F(t, r, "v_kms"), check.F(t, r, "b_kms"), math.Log10(check.F(t, r, "N_cm2"))})
			}
		}
		// Exact to 1e-9 (README.md there); beyond ±2000 km/s the weak wings are
		// τ = τ₀ a b²/(√π v²).
		const far = 2000
		w, want := equivalent(&l, clouds, -far, far), check.F(t, lr, "W_total_mA")*1e-3
		for _, c := range clouds {
			w += 2 * c.tau0(&l) * l.Gamma * l.Wave * 1e-13 / (4 * math.Pi) / math.SqrtPi * c.b / far * l.Wave / lightSpeed
		}
		if !(math.Abs(w/want-1) <= 2e-9) {
			t.Errorf("%s %s: W = %.10f Å, want %.10f", lr["sightline"], lr["line"], w, want)
		}
		for _, r := range rows {
			if r["sightline"] != lr["sightline"] || r["line"] != lr["line"] {
				continue
			}
			const half = 2e-5 // km/s: the box changes the flux by 1e-10 of its curvature
			v := check.F(t, r, "v_kms")
			s := scene{line: &l, continuum: []float64{1}, edges: []float64{l.Wave * (1 + (v-half)/lightSpeed), l.Wave * (1 + (v+half)/lightSpeed)}}
			got := s.look(clouds, func(float64) float64 { return l.Wave * check.F(t, r, "fwhm_lsf_kms") / lightSpeed }).flux[0]
			n++
			d := math.Abs(got - check.F(t, r, "I_convolved"))
			worst = max(worst, d)
			if !(d <= 1e-9) {
				t.Errorf("%s %s at %g km/s: %.12f, want %s", r["sightline"], r["line"], v, got, r["I_convolved"])
			}
		}
	}
	t.Logf("%d intensities, largest difference %.1e", n, worst)
	if n < 100 {
		t.Errorf("only %d intensities compared", n)
	}
}

// The library's own model, profile by AddTau and instrument by lsf.Gaussian, gives the same
// fluxes to 1e-8 for drawn sightlines of all classes, and the slopes are those of the fluxes.
func TestAgainstLibrary(t *testing.T) {
	worst, n := 0.0, 0
	for _, c := range populations() {
		for trial := range 3 {
			s := c.draw(rand.New(rand.NewPCG(3, uint64(trial))), 100)
			for k, sc := range s.scenes {
				got := sc.look(s.clouds, s.fwhm(1))
				least := math.Inf(1)
				for _, g := range s.clouds {
					least = min(least, g.b)
				}
				r, err := lsf.Gaussian(sc.edges, s.fwhm(1), least, 12)
				if err != nil {
					t.Fatal(err)
				}
				tau := make([]float64, len(r.Sub))
				for _, g := range s.clouds {
					voigt.AddTau(tau, r.Sub, *sc.line, voigt.Cloud{V: g.v, B: g.b, LogN: g.logN})
				}
				for j := range tau {
					tau[j] = math.Exp(-tau[j])
				}
				flux := make([]float64, len(sc.edges)-1)
				r.Apply(flux, tau)
				for i := range flux {
					x := -1 + 2*float64(i)/float64(len(flux)-1)
					cont := 0.0
					for k, q := range sc.continuum {
						cont += q * legendre(k, x)
					}
					want := cont*flux[i] + sc.zero
					d := math.Abs(got.flux[i] - want)
					worst = max(worst, d)
					if n++; !(d <= 1e-8) {
						t.Fatalf("%v, trial %d, window %d, pixel %d: %.12f, library %.12f", c, trial, k, i, got.flux[i], want)
					}
				}
			}
		}
	}
	t.Logf("%d pixels, largest difference %.1e", n, worst)
}

// Slopes against differences of the fluxes themselves.
func TestSlopes(t *testing.T) {
	s := populations()[4].draw(rand.New(rand.NewPCG(5, 1)), 100)
	sc := s.scenes[0]
	base := sc.look(s.clouds, s.fwhm(1))
	diff := func(name string, col int, at func(h float64) []float64, h float64) {
		plus, minus := at(h), at(-h)
		for i := range plus {
			want := (plus[i] - minus[i]) / (2 * h)
			if d := math.Abs(base.slope[col][i] - want); !(d <= 1e-6*(1+math.Abs(want))) {
				t.Fatalf("%s, pixel %d: slope %.9g, difference %.9g", name, i, base.slope[col][i], want)
			}
		}
	}
	for k := range s.clouds {
		for q := range 3 {
			diff(fmt.Sprintf("cloud %d, number %d", k, q), 3*k+q, func(h float64) []float64 {
				c := append([]gas(nil), s.clouds...)
				*[]*float64{&c[k].v, &c[k].b, &c[k].logN}[q] += h
				return sc.look(c, s.fwhm(1)).flux
			}, 1e-4)
		}
	}
	at := 3 * len(s.clouds)
	diff("width", at, func(h float64) []float64 { return sc.look(s.clouds, s.fwhm(math.Exp(h))).flux }, 1e-4)
	for k := range sc.continuum {
		diff("continuum", at+1+k, func(h float64) []float64 {
			o := sc
			o.continuum = append([]float64(nil), sc.continuum...)
			o.continuum[k] += h
			return o.look(s.clouds, s.fwhm(1)).flux
		}, 1e-4)
	}
}
