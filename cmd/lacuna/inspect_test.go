package main

import (
	"encoding/json"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"lacuna/internal/check"
)

func TestInspect(t *testing.T) {
	dir := demo(t)
	red, uv := filepath.Join(dir, "lantern1_red.fits"), filepath.Join(dir, "lantern3_uv.fits")
	text := works(t, "inspect", red, uv)
	for _, w := range []string{"Lantern 1", "air (", "topocentric (SPECSYS)", "+13.210 km/s to heliocentric, to be applied (VHELIO)", "R = 65000",
		"order 98", "Na I 5889.95", "K I 7698.96", "rms/σ", "Lantern 3", "vacuum (", "Zn II 2026.14"} {
		if !strings.Contains(text, w) {
			t.Errorf("no %q in\n%s", w, text)
		}
	}
	// The simulated red spectra state errors that are too large by 1/0.78, with
	// neighbours correlated by 0.33; the ultraviolet ones are honest (package simulate).
	if m := regexp.MustCompile(`(?m)order 98 .* 0\.(7[0-9]|8[0-5]) +0\.(2[5-9]|3[0-9]|4[0-2])$`).FindString(text); m == "" {
		t.Errorf("the audit of order 98 is not near 0.78 and 0.33:\n%s", text)
	}
	if m := regexp.MustCompile(`(?m)order 337 .* (0\.9[0-9]|1\.0[0-9]) +−?0\.0[0-9]$`).FindString(text); m == "" {
		t.Errorf("the audit of order 337 is not near 1 and 0:\n%s", text)
	}
	if text := works(t, "inspect", uv, "--medium", "air"); !strings.Contains(text, "air") {
		t.Errorf("--medium is not told:\n%s", text)
	}
	r := lacuna(t, "inspect", "--json", red)
	var all []fileFacts
	if err := json.Unmarshal([]byte(r.out), &all); err != nil || r.code != 0 || len(all) != 1 || all[0].File != red || len(all[0].Segments) != 2 {
		t.Fatalf("--json: exit code %d, %v, %+v", r.code, err, all)
	}
	s := all[0].Segments[0]
	if s.Order != 98 || s.Medium != "air" || s.Frame != "TOPOCENT" || len(s.Shifts) != 1 || s.Shifts[0].V != 13.21 || !s.HasErrors ||
		!(s.Range[0] > 5849 && s.Range[1] < 5934) || !(s.NoiseRatio > 0.7 && s.NoiseRatio < 0.86) || len(s.NoiseRho) == 0 || len(s.Lines) != 2 {
		t.Errorf("--json: %+v", s)
	}
}

// One file that cannot be read does not hide the others.
func TestInspectOneOfMany(t *testing.T) {
	dir := demo(t)
	r := lacuna(t, "inspect", "nosuch.fits", filepath.Join(dir, "lantern3_uv.fits"), filepath.Join(dir, "survey.toml"))
	if r.code != 2 || strings.Count(r.err, "\n") != 2 || !strings.Contains(r.err, "nosuch.fits") || !strings.Contains(r.err, "survey.toml") {
		t.Errorf("exit code %d, standard error\n%s", r.code, r.err)
	}
	if !strings.Contains(r.out, "Lantern 3") {
		t.Errorf("the good file is not shown:\n%s", r.out)
	}
	readable(t, []string{"inspect"}, r.out)
}

// A real spectrum of V779 Cen: rms over tabulated error 0.62, correlation of
// neighbours +0.33 as in all ESO files, and +13.888 km/s to be added. Source:
// practice.md, section 1.2 (measured on these files by independent means), and
// realdata/INDEX.md of the reference material. ± 0.06 and ± 0.08, because they were
// measured on a few windows, and resampling changes along a spectrum.
func TestInspectReal(t *testing.T) {
	text := works(t, "inspect", check.Shared(t, "realdata/cen-x3/ADP.2021-08-26T17_24_42.195.fits"))
	if !strings.Contains(text, "+13.888 km/s to heliocentric, to be applied (ESO QC VRAD HELICOR)") {
		t.Errorf("the correction of +13.888 km/s is not found:\n%s", text)
	}
	audits := regexp.MustCompile(`(?m)^  .* … .* (\S+) +(\S+)$`).FindAllStringSubmatch(text, -1)
	if len(audits) != 1 {
		t.Fatalf("no audits in\n%s", text)
	}
	for _, m := range audits {
		ratio, e1 := strconv.ParseFloat(m[1], 64)
		rho, e2 := strconv.ParseFloat(strings.Replace(m[2], "−", "-", 1), 64)
		if e1 != nil || e2 != nil || !(ratio > 0.56 && ratio < 0.68) || !(rho > 0.25 && rho < 0.41) {
			t.Errorf("rms/σ %s and ρ₁ %s, want 0.62 and 0.33", m[1], m[2])
		}
	}
}
