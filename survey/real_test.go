package survey_test

import (
	"context"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"lacuna/budget"
	"lacuna/config"
	"lacuna/internal/check"
	"lacuna/measure"
	"lacuna/survey"
)

// runReal runs a survey file on spectra beside the checkout.
func runReal(t *testing.T, toml string) survey.Result {
	t.Helper()
	path := filepath.Join(t.TempDir(), "survey.toml")
	if err := os.WriteFile(path, []byte(toml), 0o644); err != nil {
		t.Fatal(err)
	}
	cfg, err := config.Load(path)
	if err != nil {
		t.Fatal(err)
	}
	records, err := survey.Run(context.Background(), cfg, survey.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return records[0].Result
}

func widthOf(t *testing.T, r survey.Result, line string) measure.Width {
	t.Helper()
	for _, w := range r.Widths {
		if strings.HasPrefix(w.Line, line) {
			return w
		}
	}
	t.Fatalf("no width of %s", line)
	return measure.Width{}
}

func adopted(t *testing.T, r survey.Result, species string) budget.Number {
	t.Helper()
	for _, c := range r.Adopted {
		if c.Species == species {
			return c.LogN
		}
	}
	t.Fatalf("no adopted column of %s", species)
	return budget.Number{}
}

// V779 Cen (Cen X-3), UVES, ESO archive. Widths: quick direct integrations with a
// linear continuum, independent of ours, ../shared/realdata/INDEX.md; agreement
// within the joint error plus 5 mÅ or 5 %. CN, CH and CH+ have a second observer
// with tabulated errors: 20.7 ± 4, 29.4 ± 4, 43.2 ± 4 mÅ (practice.md §5.20).
func TestV779Cen(t *testing.T) {
	blue := check.Shared(t, "realdata/cen-x3/ADP.2021-08-26T17_24_42.195.fits")
	red := check.Shared(t, "realdata/cen-x3/ADP.2021-08-26T17_24_42.172.fits")
	r := runReal(t, `
[survey]
name = "V779 Cen"
[[sightline]]
name = "V779 Cen"
velocity = [-50, 45]
lines = ["Ca II 3933.66", "Ti II 3383.76", "Na I 5889.95", "Na I 5895.92", "CH+ 4232.55"]
[[sightline.spectrum]]
file = "`+blue+`"
[[sightline.spectrum]]
file = "`+red+`"
[[sightline.line]]
name = "CH 4300"
window = [-15, 20]
[[sightline.line]]
name = "CH+ 3957"
window = [-15, 20]
[[sightline.line]]
name = "CN R(0)"
window = [-15, 20]
[[sightline.line]]
name = "Na I 3302.37"
window = [-25, 25]
[[sightline.line]]
name = "Na I 3302.98"
window = [-25, 25]
`)
	for _, s := range r.Spectra {
		// HIERARCH ESO QC VRAD HELICOR of the headers, not applied in them (SPECSYS TOPOCENT).
		if len(s.Shifts) != 1 || !(math.Abs(s.Shifts[0].V-13.888) < 0.0005) || s.Shifts[0].Done || s.Medium != "air" {
			t.Errorf("%s: medium %s, shifts %+v; want air and +13.888 km/s to apply", s.File, s.Medium, s.Shifts)
		}
	}
	for _, tc := range []struct {
		line   string
		w, err float64 // mÅ
	}{
		{"Ca II 3933", 718, 5}, {"CH 4300", 25, 2}, {"CH+ 4232", 38, 2}, {"CH+ 3957", 22, 2}, {"CN 3874.60", 22, 2},
		{"Ti II 3383", 227, 9}, {"Na I 5889", 1161, 3}, {"Na I 5895", 1040, 3},
		// One line and the pair: 111 ± 25 and 161 ± 31 mÅ by practice.md §1.14.
		{"Na I 3302.37", 111, 25},
	} {
		w := widthOf(t, r, tc.line)
		got, sigma := 1e3*w.W.X, 1e3*w.W.Err()
		allowed := math.Hypot(sigma, tc.err) + max(5, 0.05*tc.w)
		t.Logf("%-14s %7.1f ± %4.1f mÅ, INDEX %6.0f ± %2.0f", tc.line, got, sigma, tc.w, tc.err)
		if !(math.Abs(got-tc.w) <= allowed) {
			t.Errorf("%s: %.1f ± %.1f mÅ, INDEX.md %.0f ± %.0f: apart by more than %.1f", tc.line, got, sigma, tc.w, tc.err, allowed)
		}
	}
	pair := 1e3 * (widthOf(t, r, "Na I 3302.37").W.X + widthOf(t, r, "Na I 3302.98").W.X)
	if !(math.Abs(pair-161) <= 31+25) {
		t.Errorf("Na I 3302 pair: %.1f mÅ, want 161 ± 31 with our own error of 25", pair)
	}
	for _, line := range []string{"Na I 5889", "Na I 5895"} {
		w := widthOf(t, r, line)
		// practice.md §1.2 and §2 row 4: rms/σ 0.62, ρ₁ +0.33, zero level +0.0034 ± 0.001.
		if !(w.NoiseRatio > 0.55 && w.NoiseRatio < 0.70) || !(w.NoiseRho[0] > 0.25 && w.NoiseRho[0] < 0.42) {
			t.Errorf("%s: noise ratio %.2f, ρ₁ %.2f; want 0.62 and 0.33", line, w.NoiseRatio, w.NoiseRho[0])
		}
		if !(math.Abs(w.Zero.Level-0.0034) <= 3*math.Hypot(w.Zero.Err, 0.001)) || w.Zero.Pixels == 0 {
			t.Errorf("%s: zero level %.4f ± %.4f, want 0.0034 ± 0.001 from black cores", line, w.Zero.Level, w.Zero.Err)
		}
		if !w.AOD.Is(budget.Lower|budget.Saturated) || !w.Linear.Is(budget.Lower) {
			t.Errorf("%s: black core, but its columns are %s and %s", line, w.AOD.Kind(), w.Linear.Kind())
		}
	}
	if n := adopted(t, r, "CH"); n.Kind() != "value" || !(n.ErrUp() > 0) || !(n.X > 13.3 && n.X < 13.9) {
		t.Errorf("N(CH) = %.2f ± %.2f (%s)", n.X, n.Err(), n.Kind())
	}
	// The window −50..45 of CN R(0) holds R(1), 47 km/s away (practice.md §2 row 1).
	r2 := runReal(t, "[survey]\nname = \"x\"\n[[sightline]]\nname = \"x\"\nvelocity = [-50, 45]\nlines = [\"CN R(0)\"]\n[[sightline.spectrum]]\nfile = \""+blue+"\"\n")
	named := false
	for _, b := range widthOf(t, r2, "CN 3874.60").Blends {
		named = named || b.Name == "CN 3873.99"
	}
	if !named {
		t.Error("CN R(1) is not named as a blend of R(0)")
	}
}

// HR 1840, STIS E230H: four Fe II lines of different strength. INDEX.md: 2374 188
// ± 2 mÅ over −12..55 km/s, 2344 274 ± 3, 2586 271 ± 2, cores black; apparent
// columns of the weaker lines must be larger (saturation, Savage & Sembach 1991).
func TestHR1840(t *testing.T) {
	file := check.Shared(t, "realdata/hr1840/ocb6i2020_x1d.fits")
	r := runReal(t, `
[survey]
name = "HR 1840"
[[sightline]]
name = "HR 1840"
velocity = [-12, 55]
lines = ["Fe II 2374.46", "Fe II 2344.21", "Fe II 2586.65", "Fe II 2382.77"]
[[sightline.spectrum]]
file = "`+file+`"
`)
	for _, tc := range []struct {
		line   string
		w, err float64
	}{{"Fe II 2374", 188, 2}, {"Fe II 2344", 274, 3}, {"Fe II 2586", 271, 2}} {
		w := widthOf(t, r, tc.line)
		got, sigma := 1e3*w.W.X, 1e3*w.W.Err()
		t.Logf("%-14s %7.1f ± %4.1f mÅ, INDEX %6.0f ± %2.0f", tc.line, got, sigma, tc.w, tc.err)
		if !(math.Abs(got-tc.w) <= math.Hypot(sigma, tc.err)+0.05*tc.w) {
			t.Errorf("%s: %.1f ± %.1f mÅ, INDEX.md %.0f ± %.0f", tc.line, got, sigma, tc.w, tc.err)
		}
	}
	// fλ falls from 2382 over 2344 and 2586 to 2374.
	last := 0.0
	for _, line := range []string{"Fe II 2382", "Fe II 2344", "Fe II 2374"} {
		w := widthOf(t, r, line)
		n := math.Log10(w.AOD.X)
		t.Logf("%-14s log N_a %.2f (%s)", line, n, w.AOD.Kind())
		if !(n > last) {
			t.Errorf("%s: log N_a = %.2f is not above %.2f of the stronger line", line, n, last)
		}
		if w.AOD.Kind() != "lower" {
			t.Errorf("%s: log N_a is a %s, want a lower limit", line, w.AOD.Kind())
		}
		last = n
	}
	if n := adopted(t, r, "Fe II"); n.Kind() != "lower" {
		t.Errorf("Fe II: adopted %.2f as %s; saturated lines alone give a lower limit", n.X, n.Kind())
	}
}
