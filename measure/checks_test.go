package measure

import (
	"math"
	"testing"

	"lacuna/atomic"
	"lacuna/internal/check"
)

func near(t *testing.T, what string, got, want, rel float64) {
	t.Helper()
	if !(math.Abs(got-want) <= rel*math.Abs(want)) {
		t.Errorf("%s: %.12g, want %.12g (off by %.1e, allowed %.0e)", what, got, want, got/want-1, rel)
	}
}

// old is rₑ of CODATA 2022 over that of CODATA 2018 (2.8179403262e-13 cm), with which
// the check tables were made: a part in 5e8.
const old = atomic.ElectronRadius / 2.8179403262e-13

// checks/aod_profile_*.csv: sums over noisy pixels, computed with numpy from the
// formulas of Savage & Sembach 1991. 1e-9: rounding of velocities and digits printed.
func TestAODProfiles(t *testing.T) {
	pixels := check.CSV(t, check.Shared(t, "checks/aod_profile_pixels.csv"))
	for _, r := range check.CSV(t, check.Shared(t, "checks/aod_profile_results.csv")) {
		l := atomic.Line{Name: r["line"], Species: "X I", Wave: check.F(t, r, "lambda_vac_A"), F: check.F(t, r, "f")}
		var wave, flux, sigma []float64
		eps := 0.0
		for _, p := range pixels {
			if p["profile"] == r["profile"] {
				wave = append(wave, wavelength(l.Wave, check.F(t, p, "v_kms")))
				flux = append(flux, check.F(t, p, "I_norm"))
				sigma = append(sigma, check.F(t, p, "sigma_I"))
				eps = check.F(t, p, "eps_cont")
			}
		}
		n := len(wave)
		if n != int(check.F(t, r, "n_pix")) || n < 5 {
			t.Fatalf("%s: %d pixels", r["profile"], n)
		}
		e := edges(wave)
		p := Piece{Line: l, Wave: wave, Flux: flux, Continuum: flat(1, eps, wave, sigma), Window: [2]float64{velocity(e[0], l.Wave), velocity(e[n], l.Wave)}}
		w := mustMeasure(t, p)
		name := r["profile"] + " "
		near(t, name+"W", 1e3*w.W.X, check.F(t, r, "W_mA"), 1e-9)
		near(t, name+"photon", 1e3*w.W.ErrBy(1), check.F(t, r, "sigma_photon_mA"), 1e-9)
		near(t, name+"continuum", 1e3*w.W.ErrBy(2), check.F(t, r, "sigma_cont_mA"), 1e-9)
		near(t, name+"total", 1e3*w.W.Err(), check.F(t, r, "sigma_total_mA"), 1e-9)
		near(t, name+"N_a", old*w.AOD.X, check.F(t, r, "N_a_cm2"), 1e-9)
		near(t, name+"N_a photon", old*w.AOD.ErrBy(1), check.F(t, r, "sigma_N_photon"), 1e-9)
		near(t, name+"N_a continuum", old*w.AOD.ErrBy(2), check.F(t, r, "sigma_N_cont"), 1e-9)
		near(t, name+"v", w.AODV.X, check.F(t, r, "v_mean_kms"), 1e-8) // a difference of velocities of 20 km/s
		near(t, name+"b_a", w.AODB.X, check.F(t, r, "b_a_kms"), 1e-9)
	}
}

// checks/ew_error.csv: errors of a width in a flat spectrum, computed.
func TestWidthErrors(t *testing.T) {
	for _, r := range check.CSV(t, check.Shared(t, "checks/ew_error.csv")) {
		l := atomic.Line{Name: r["line"], Species: "X I", Wave: check.F(t, r, "lambda_vac_A"), F: check.F(t, r, "f")}
		pix, sn, n := check.F(t, r, "pixel_A"), check.F(t, r, "snr_per_pixel"), int(check.F(t, r, "n_pix"))
		ew := check.F(t, r, "W_mA") / 1e3
		wave, flux, sigma := make([]float64, n+2), constant(1, n+2), constant(1/sn, n+2)
		for i := range wave {
			wave[i] = l.Wave + pix*(float64(i)-float64(n+1)/2)
			if i > 0 && i <= n {
				flux[i] = 1 - ew/(pix*float64(n))
			}
		}
		half := velocity(l.Wave+pix*float64(n)/2, l.Wave)
		w := mustMeasure(t, Piece{Line: l, Wave: wave, Flux: flux, Window: [2]float64{-half, half},
			Continuum: flat(1, 1/(sn*math.Sqrt(check.F(t, r, "n_cont_pix"))), wave, sigma)})
		// The table prints 1e-15; wavelengths of 5000 Å have 1e-12 Å of rounding, pixels 0.01 Å.
		near(t, r["id"]+" W", w.W.X, ew, 1e-8)
		near(t, r["id"]+" photon", 1e3*w.W.ErrBy(1), check.F(t, r, "sigma_photon_mA"), 1e-9)
		near(t, r["id"]+" continuum", 1e3*w.W.ErrBy(2), check.F(t, r, "sigma_cont_mA"), 1e-8)
		near(t, r["id"]+" total", 1e3*w.W.Err(), check.F(t, r, "sigma_total_mA"), 1e-9)
		near(t, r["id"]+" VE06", 1e3*w.SigmaVE06, check.F(t, r, "sigma_VE2006_mA"), 1e-8)
		n1 := w.Linear
		if n1.Behind != nil {
			n1 = *n1.Behind
		}
		near(t, r["id"]+" N", old*n1.X/math.Pow(10, w.Correction), check.F(t, r, "N_linear_cm2"), 1e-8)
	}
}

// checks/curve_of_growth_limits.csv, rows without damping: 25 digits by mpmath.
func TestGrowth(t *testing.T) {
	rows := 0
	for _, r := range check.CSV(t, check.Shared(t, "checks/curve_of_growth_limits.csv")) {
		if r["case"] != "gaussian" {
			continue
		}
		rows++
		tau := check.F(t, r, "tau0")
		near(t, "F at τ₀ = "+r["tau0"], growth(tau), check.F(t, r, "F"), 1e-10)
		near(t, "inverse at τ₀ = "+r["tau0"], growthInverse(growth(tau)), tau, 1e-6*max(1, math.Log(max(tau, 3))))
	}
	if rows < 10 {
		t.Errorf("only %d rows", rows)
	}
}

// F/F_lin = 1 − τ₀/2√2 + τ₀²/6√3 − …: series of the exponential, term by term.
func TestGrowthSeries(t *testing.T) {
	for _, tau := range []float64{1e-6, 1e-3, 0.1, 0.3} {
		want, term := 0.0, 1.0
		for k := 1; k < 30; k++ {
			want += term / math.Sqrt(float64(k))
			term *= -tau / float64(k+1)
		}
		near(t, "F/F_lin", growth(tau)/(math.Sqrt(math.Pi)*tau), want, 1e-12)
	}
	near(t, "τ₀ = 0.1", growth(0.1)/(math.Sqrt(math.Pi)*0.1), 0.96559, 5e-6) // five digits, by hand
}

// checks/aod_saturation.csv, computed with scipy; gate 1e-6 dex.
func TestSaturation(t *testing.T) {
	for _, r := range check.CSV(t, check.Shared(t, "checks/aod_saturation.csv")) {
		tau, ratio := check.F(t, r, "tau0_weak"), check.F(t, r, "fl_ratio")
		var d, w, s float64
		switch r["model"] {
		case "unresolved_limit":
			d, w, s = unresolved(tau, ratio)
		case "gaussian_component_gaussian_lsf":
			d, w, s = resolved(tau, ratio, check.F(t, r, "fwhm_over_b"))
		default:
			t.Fatalf("model %q", r["model"])
		}
		for k, got := range map[string]float64{"delta_logNa": d, "corr_weak": w, "corr_strong": s} {
			if want := check.F(t, r, k); !(math.Abs(got-want) < 1e-6) {
				t.Errorf("%s %s: %.10f, want %.10f", r["id"], k, got, want)
			}
		}
	}
}

func TestInverseOfCorrection(t *testing.T) {
	// 2:1 doublet in the unresolved limit: δ = 0.10 → +0.118, 0.20 → +0.330 dex
	// (practice notes of the project; three digits).
	for delta, want := range map[float64]float64{0.10: 0.118, 0.20: 0.330} {
		tau := inverse(delta, func(t float64) float64 { d, _, _ := unresolved(t, 2); return d })
		if _, c, _ := unresolved(tau, 2); !(math.Abs(c-want) < 5e-4) {
			t.Errorf("δ = %.2f: correction %.4f, want %.3f", delta, c, want)
		}
	}
}

// A component of known b and τ₀ behind an instrument of FWHM 5 km/s: the saturated
// width must not be taken for a large b, and τ₀ comes back. The profile is the
// convolution of exp(−τ) by plain summation; the estimate averages three pixels and
// counts them with the instrument's profile, which is good to 20 % here.
func TestSaturatedComponentIsSeenThrough(t *testing.T) {
	const fwhm, dv, n = 5.0, 0.05, 4001
	sd := fwhm / math.Sqrt(8*math.Ln2)
	for _, c := range []struct{ b, tau0 float64 }{{2.5, 0.3}, {2.5, 2}, {2.5, 5}, {4, 4}, {8, 3}} {
		fine := make([]float64, n)
		for i := range fine {
			v := dv * float64(i-n/2)
			fine[i] = math.Exp(-c.tau0 * math.Exp(-v*v/(c.b*c.b)))
		}
		const step = 20 // pixels of 1 km/s
		m := n/step - 40
		wave, flux := make([]float64, m), make([]float64, m)
		for k := range flux {
			at := (k + 20) * step
			sum, norm := 0.0, 0.0
			for j := -400; j <= 400; j++ {
				x := dv * float64(j) / sd
				g := math.Exp(-x * x / 2)
				sum, norm = sum+g*fine[at+j], norm+g
			}
			wave[k], flux[k] = wavelength(nad.Wave, dv*float64(at-n/2)), sum/norm
		}
		p := Piece{Line: nad, Wave: wave, Flux: flux, Window: [2]float64{-40, 40}, FWHM: fwhm, B: 0.5, Continuum: flat(1, 0, wave, constant(0.001, m))}
		w, err := newWork(p)
		if err != nil {
			t.Fatal(err)
		}
		w.describe()
		w.out.Window = p.Window
		w.out.W = w.width(w.cover(-40, 40))
		tau0, b := w.opticalDepth()
		if !(math.Abs(math.Log(tau0/c.tau0)) < 0.25) || !(math.Abs(b/c.b-1) < 0.2) {
			t.Errorf("b = %g, τ₀ = %g came back as b = %.2f, τ₀ = %.2f", c.b, c.tau0, b, tau0)
		}
	}
}
