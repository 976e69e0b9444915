package main

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/report"
)

func velocityJSON(t testing.TB, args ...string) report.Velocity {
	t.Helper()
	r := lacuna(t, append([]string{"velocity", "--json"}, args...)...)
	if r.code != 0 || r.err != "" {
		t.Fatalf("%v: exit code %d\n%s", args, r.code, r.err)
	}
	var v report.Velocity
	if err := json.Unmarshal([]byte(r.out), &v); err != nil {
		t.Fatal(err)
	}
	return v
}

func correction(t testing.TB, v report.Velocity, kind string) report.VelocityFrame {
	t.Helper()
	for _, f := range v.Frames {
		if f.Frame == kind {
			return f
		}
	}
	t.Fatalf("no frame %s in %+v", kind, v.Frames)
	return report.VelocityFrame{}
}

// checks/velocity_frames.csv (astropy with its built-in ephemeris, computed outside
// this project) through the whole program; 1 m/s is that table's gate.
func TestVelocityTable(t *testing.T) {
	for _, row := range check.CSV(t, check.Shared(t, "checks/velocity_frames.csv")) {
		v := velocityJSON(t, "--target", row["ra_icrs_deg"]+" "+row["dec_icrs_deg"], "--time", row["utc"],
			"--site", row["lon_deg"]+","+row["lat_deg"]+","+row["height_m"], "--velocity", "0", "--solar-motion", "11.1,12.24,7.25")
		full := check.F(t, row, "vcorr_bary_full_kms")
		for kind, want := range map[string]float64{
			"TOPOCENT": 0, "GEOCENTR": check.F(t, row, "v_diurnal_kms"), "HELIOCEN": check.F(t, row, "vcorr_helio_kms"),
			"BARYCENT": full, "classical": check.F(t, row, "vcorr_bary_classical_kms"),
			// By product of Doppler factors, which exceeds the sum by v₁v₂/c.
			"LSRK":                    full + check.F(t, row, "dv_lsrk_kms")*(1+full/299792.458),
			"U,V,W = 11.1,12.24,7.25": full + check.F(t, row, "dv_lsr_uvw_kms")*(1+full/299792.458),
		} {
			f := correction(t, v, kind)
			if !(math.Abs(f.Correction-want) <= 1e-3) || f.Velocity == nil || !(math.Abs(*f.Velocity-want) <= 1e-3) {
				t.Errorf("%s %s: %+v, want %.6f", row["id"], kind, f, want)
			}
		}
	}
}

// The UVES spectrum of V779 Cen of 2002-02-22 (header: start, 1600 s, pointing):
// ESO's pipeline wrote ESO QC VRAD HELICOR = 13.887876 and BARYCOR = 13.880672.
func TestVelocityOfAnExposure(t *testing.T) {
	args := []string{"--target", "11:21:15.03 -60:37:27.8", "--time", "2002-02-22T06:24:49.929", "--site", "ESO-VLT-U2", "--exposure", "1600"}
	v := velocityJSON(t, args...)
	if d := correction(t, v, "HELIOCEN").Correction - 13.887876; !(math.Abs(d) < 0.01) {
		t.Errorf("heliocentric off by %.4f km/s", d)
	}
	if got := v.Mid.Sub(v.Start).Seconds(); got != 800 || !(math.Abs(v.Change+0.027) < 0.003) {
		t.Errorf("middle after %g s, change %.4f km/s", got, v.Change)
	}
	for claim, want := range map[string]string{"13.888": "agrees with ours within", "-13.888": "opposite sign", "13888": "in m/s", "3.6": "correction to LSRK", "20": "check coordinates"} {
		text := works(t, append([]string{"velocity", "--compare", claim}, args...)...)
		if !strings.Contains(strings.Join(strings.Fields(text), " "), want) {
			t.Errorf("--compare %s does not say %q:\n%s", claim, want, text)
		}
	}
	// A heliocentric velocity, there and back: in that frame it is itself.
	v = velocityJSON(t, append([]string{"--velocity", "-40", "--from", "helio"}, args...)...)
	helio, topo := correction(t, v, "HELIOCEN"), correction(t, v, "TOPOCENT")
	if !(math.Abs(*helio.Velocity+40) < 1e-9) || !(math.Abs((1+*topo.Velocity/299792.458)*(1+helio.Correction/299792.458)-(1-40/299792.458)) < 1e-12) {
		t.Errorf("%g %g", *helio.Velocity, *topo.Velocity)
	}
}

func TestVelocityText(t *testing.T) {
	text := works(t, "velocity", "--target", "05:35:17.3 -05:23:28", "--time", "MJD 55211.5", "--site", "kpno", "--velocity", "12.5", "--solar-motion", "reid2019", "--pm", "5,-3", "--epoch", "2016")
	for _, w := range []string{"Kitt Peak", "below the horizon", "TOPOCENT", "GEOCENTR", "HELIOCEN", "BARYCENT", "LSRK", "LSRD", "reid2019", "+12.5000", "1 + z"} {
		if !strings.Contains(text, w) {
			t.Errorf("no %q in\n%s", w, text)
		}
	}
	if centre := works(t, "velocity", "--target", "10 20", "--time", "JD 2455211.5", "--site", "geocentre"); strings.Contains(centre, "altitude") {
		t.Errorf("an altitude at the Earth's centre:\n%s", centre)
	}
	velocityJSON(t, "--target", "10 20", "--time", "JD 2455211.5", "--site", "geocentre") // no NaN in JSON
	if list := works(t, "velocity", "--site", "list"); !strings.Contains(list, "Paranal") || !strings.Contains(list, "Greenwich") {
		t.Errorf("sites:\n%s", list)
	}
	if r := lacuna(t, "velocity", "--site", "list", "--json"); r.code != 0 || !json.Valid([]byte(r.out)) {
		t.Errorf("sites as JSON: %d %s", r.code, r.err)
	}
}

func TestVelocityRefuses(t *testing.T) {
	good := map[string]string{"--target": "10 20", "--time": "2010-01-15T03:20:00", "--site": "kpno"}
	for _, tc := range [][]string{
		{"no --target", "--target", ""}, {"no --time", "--time", ""}, {"no --site", "--site", ""},
		{"target", "--target", "10"}, {"declination", "--target", "10 95"}, {"time of day", "--time", "2010-01-15"}, {"1950", "--time", "1940-01-15T00:00:00"},
		{"did you mean", "--site", "kpnoo"}, {"in orbit", "--site", "HST"}, {"lon,lat,height", "--site", "10,20"},
		{"--exposure", "--exposure", "-5"}, {"two days", "--exposure", "1e6"}, {"--pm", "--pm", "5"}, {"proper motion", "--pm", "1e6,0"}, {"without --pm", "--epoch", "2016"}, {"--equinox", "--equinox", "20"},
		{"solar motion", "--solar-motion", "mine"}, {"--velocity", "--velocity", "fast"}, {"--compare", "--compare", "NaN"},
		{"SOURCE", "--velocity", "5", "--from", "SOURCE"}, {"not a velocity frame", "--velocity", "5", "--from", "moon"},
	} {
		args := []string{"velocity"}
		for _, k := range []string{"--target", "--time", "--site"} {
			if k != tc[1] {
				args = append(args, k, good[k])
			}
		}
		r := lacuna(t, append(args, tc[1:]...)...)
		if r.code != 2 || r.out != "" || !strings.Contains(r.err, tc[0]) {
			t.Errorf("%v: exit code %d, wanted 2 and %q:\n%s%s", tc[1:], r.code, tc[0], r.out, r.err)
		}
	}
	if r := lacuna(t, "velocity", "10 20"); r.code != 2 {
		t.Errorf("an argument: %d", r.code)
	}
}

// Every command that docs/velocity.md shows runs and prints what the page shows.
func TestVelocityPage(t *testing.T) {
	page, err := os.ReadFile(filepath.Join(check.Root(t), "docs", "velocity.md"))
	if err != nil {
		t.Fatal(err)
	}
	ran := 0
	for i, block := range strings.Split(string(page), "```console\n") {
		if i == 0 {
			continue
		}
		block, _, _ = strings.Cut(block, "```")
		for _, part := range strings.Split("\n"+block, "\n$ lacuna ")[1:] {
			line, want, _ := strings.Cut(part, "\n")
			r := lacuna(t, words(t, line)...)
			if r.code != 0 {
				t.Errorf("lacuna %s: %s", line, r.err)
			}
			if want = strings.TrimSpace(want); want != "" && want != strings.TrimSpace(r.out) {
				t.Errorf("lacuna %s prints\n%s\nand the page shows\n%s", line, r.out, want)
			}
			ran++
		}
	}
	if ran < 4 {
		t.Errorf("%d commands on the page", ran)
	}
}

// words splits a command line at blanks outside double quotes.
func words(t testing.TB, line string) []string {
	t.Helper()
	var out []string
	for i, part := range strings.Split(line, `"`) {
		if i%2 == 1 {
			out = append(out, part)
		} else {
			out = append(out, strings.Fields(part)...)
		}
	}
	if strings.Count(line, `"`)%2 != 0 {
		t.Fatalf("a quote is open in %s", line)
	}
	return out
}
