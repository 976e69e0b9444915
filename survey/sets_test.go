package survey_test

import (
	"math"
	"path/filepath"
	"testing"

	"lacuna/config"
	"lacuna/simulate"
	"lacuna/survey"
)

// Another set of oscillator strengths gives both columns: Ca II K 0.6267 (Morton
// 2003) against 0.6824 (NIST) moves log N by −0.037 (practice.md §2 row 17).
func TestFSetsGiveBothColumns(t *testing.T) {
	dir := t.TempDir()
	if err := simulate.WriteLantern(dir); err != nil {
		t.Fatal(err)
	}
	run := func(set string) float64 {
		cfg, err := config.Load(filepath.Join(dir, "survey.toml"))
		if err != nil {
			t.Fatal(err)
		}
		cfg.FSet = set
		records, err := survey.Run(t.Context(), cfg, survey.Options{Only: []string{"Lantern 2"}})
		if err != nil {
			t.Fatal(err)
		}
		w := widthOf(t, records[0].Result, "Ca II 3933")
		if set == "default" {
			if w.FDefault != 0 {
				t.Errorf("the default set has another default, %g", w.FDefault)
			}
		} else if got := math.Log10(w.FDefault / w.F); !(math.Abs(got+0.037) < 0.0005) {
			t.Errorf("log(f_default/f) = %.4f, want -0.037", got)
		}
		return w.W.X
	}
	if a, b := run("default"), run("NIST"); a != b {
		t.Errorf("W depends on f: %g and %g", a, b)
	}
}
