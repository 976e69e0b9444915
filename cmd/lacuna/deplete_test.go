package main

import (
	"encoding/json"
	"fmt"
	"math"
	"path/filepath"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/internal/table"
	"lacuna/survey"
)

// Depletions towards ζ Oph, cool cloud, as published: Savage & Sembach 1996,
// ARA&A 34, 279, Table 5, in reference/fstar_examples.csv of the reference
// material, on the paper's own scale. Its columns there were rebuilt from D, the
// reference abundance and log N(H), all to 0.01 dex, so 0.011 dex is allowed.
func TestDepletePublished(t *testing.T) {
	rows := check.CSV(t, check.Shared(t, "reference/fstar_examples.csv"))
	var text strings.Builder
	text.WriteString("sightline,species,logN,logN_err,logN_H,logN_H_err\n")
	want := map[string]float64{}
	for _, r := range rows {
		if !strings.HasPrefix(r["sightline"], "zeta Oph cool") || r["scale"] != "SS96_ref" || r["logN_ion"] == "" {
			continue
		}
		ion := r["element"] + map[bool]string{true: " I", false: " II"}[r["element"] == "N" || r["element"] == "O" || r["element"] == "Kr" || r["element"] == "Ar"]
		want[r["element"]] = check.F(t, r, "D_in_its_scale")
		fmt.Fprintf(&text, "zeta Oph,%s,%s,%s,%s,0.02\n", ion, r["logN_ion"], r["sig_logN"], r["logNH"])
	}
	file := write(t, t.TempDir(), "zeta.csv", text.String())
	r := lacuna(t, "deplete", file, "--scale", "savage-sembach1996", "--json")
	if r.code != 0 || r.err != "" {
		t.Fatalf("exit code %d\n%s", r.code, r.err)
	}
	var records []survey.Record
	if err := json.Unmarshal([]byte(r.out), &records); err != nil || len(records) != 1 {
		t.Fatalf("%d records, %v", len(records), err)
	}
	compared := 0
	for _, d := range records[0].Result.Depletions {
		if d.Refused != "" {
			continue
		}
		compared++
		if w, ok := want[d.Element]; !ok || !(math.Abs(d.D.X-w) < 0.011) {
			t.Errorf("D(%s) = %.3f, published %.2f (%v)", d.Element, d.D.X, w, ok)
		}
	}
	if compared < 8 {
		t.Errorf("only %d elements compared of %d", compared, len(want))
	}
}

const columnsCSV = `sightline,species,logN,logN_err,logN_kind,logN_HI,logN_HI_err,logN_H2,logN_H2_err,logN_H2_max
Lantern 4,Ti II,11.70,0.05,,21.20,0.08,20.55,0.07,
Lantern 4,Na I,12.70,0.05,,,,,,
Lantern 4,Zn II,12.70,,lower,,,,,
Lantern 4,Cr II,12.10,,upper,,,,,
Lantern 5,Ti II,11.10,0.05,,20.45,0.10,,,19.60
`

func TestDeplete(t *testing.T) {
	dir := t.TempDir()
	file := write(t, dir, "columns.csv", columnsCSV)
	out := filepath.Join(dir, "depletions.ecsv")
	text := works(t, "deplete", "--scale", "asplund2021", file, "--out", out)
	for _, w := range []string{"Lantern 4 · solar scale asplund2021", "Lantern 5", "trace ion: needs ionization correction", "an interval", "σ without scale"} {
		if !strings.Contains(text, w) {
			t.Errorf("no %q in\n%s", w, text)
		}
	}
	// D = log N(X) − log N(H) − (ε − 12); N(H) = N(H I) + 2 N(H₂) = 10^21.3607;
	// ε(Ti) = 4.90 (Asplund et al. 2021, Table 2, meteoritic).
	h := math.Log10(math.Pow(10, 21.20) + 2*math.Pow(10, 20.55))
	if d := fmt.Sprintf("Ti         −%.2f", -(11.70 - h - (4.90 - 12))); !strings.Contains(text, d) {
		t.Errorf("no %q in\n%s", d, text)
	}
	tab, err := table.Read(out)
	if err != nil || tab.Rows() != 5 {
		t.Fatalf("%v", err)
	}
	kinds := map[string]string{}
	obj, _ := tab.Col("object")
	el, _ := tab.Col("element")
	kind, _ := tab.Col("D_kind")
	for i := range tab.Rows() {
		o, _ := tab.String(obj, i)
		e, _ := tab.String(el, i)
		kinds[o+" "+e], _ = tab.String(kind, i)
	}
	for key, want := range map[string]string{"Lantern 4 Ti": "value", "Lantern 4 Na": "", "Lantern 4 Zn": "lower", "Lantern 4 Cr": "upper", "Lantern 5 Ti": "interval"} {
		if got, ok := kinds[key]; !ok || got != want {
			t.Errorf("%s: D is %q, want %q", key, got, want)
		}
	}
}

// The columns that a survey adopts can go straight to deplete, once hydrogen
// stands beside them.
func TestDepleteMistakes(t *testing.T) {
	dir := t.TempDir()
	good := write(t, dir, "columns.csv", columnsCSV)
	mistake(t, 2, []string{"columns.csv", "no solar scale is named", "asplund2021"}, "deplete", good)
	mistake(t, 2, []string{`no solar scale "asplund2020"`, "did you mean asplund2021"}, "deplete", good, "--scale", "asplund2020")
	mistake(t, 1, []string{filepath.Join(good, "d.ecsv")}, "deplete", good, "--scale", "asplund2021", "--out", filepath.Join(good, "d.ecsv"))
	for _, tc := range []struct {
		text  string
		words []string
	}{
		{"", []string{"bad.csv"}},
		{"a,b\n1,2\n", []string{"bad.csv: no column \"sightline\""}},
		{"sightline,species,logN,logN_err,logN_HI,logN_HI_err\nx,Ti II,eleven,0.1,21,0.1\n", []string{"line 2", "logN", "eleven"}},
		{"sightline,species,logN,logN_err,logN_HI,logN_HI_err\nx,Ti II,nan,0.1,21,0.1\n", []string{"line 2", "logN"}},
		{"sightline,species,logN,logN_err,logN_HI,logN_HI_err\nx,Ti II,11,-0.1,21,0.1\n", []string{"line 2", "logN_err"}},
		{"sightline,species,logN,logN_err,logN_HI,logN_HI_err\nx,Ti II,11,,21,0.1\n", []string{"line 2", "logN_err"}},
		{"sightline,species,logN,logN_err,logN_HI,logN_HI_err\nx,Qq II,11,0.1,21,0.1\n", []string{"line 2", "Qq II"}},
		{"sightline,species,logN,logN_err,logN_HI\nx,Ti II,11,0.1,21\n", []string{"logN_HI_err"}},
		{"sightline,species,logN,logN_err,logN_kind,logN_HI,logN_HI_err\nx,Ti II,11,0.1,maybe,21,0.1\n", []string{"line 2", "maybe"}},
	} {
		mistake(t, 2, tc.words, "deplete", write(t, dir, "bad.csv", tc.text), "--scale", "asplund2021", "--out", filepath.Join(dir, "d.ecsv"))
	}
	if got := names(t, dir); len(got) != 2 {
		t.Errorf("left behind: %v", got)
	}
}
