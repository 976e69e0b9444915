package main

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/internal/table"
	"lacuna/survey"
)

// The starter's batch runs as it is written.
func TestGrowthStarter(t *testing.T) {
	dir := t.TempDir()
	works(t, "new", dir)
	file := filepath.Join(dir, "growth.toml")
	text := works(t, "growth", file)
	for _, w := range []string{"Lantern 1", "Ca II", "Δχ² = 1", "growth.ecsv"} {
		if !strings.Contains(text, w) {
			t.Errorf("no %q in\n%s", w, text)
		}
	}
	out := filepath.Join(dir, "growth-results")
	for _, name := range names(t, out) {
		wellFormed(t, filepath.Join(out, name))
	}
	if _, err := os.Stat(filepath.Join(out, "figures", "Lantern_1-growth-Ca_II.svg")); err != nil {
		t.Error(err)
	}
	resolved := works(t, "growth", "--dry-run", file)
	if !strings.Contains(resolved, "# default") || !strings.Contains(resolved, `line = "Ca II 3933.66"`) {
		t.Errorf("resolved batch:\n%s", resolved)
	}
}

// Exact widths of CN lines for given N(N=0), N(N=1) and one b give these three
// back. Source: checks/cn_excitation_computed.csv of the reference material
// (quadrature of the exact curve of growth, one Gaussian component). Its rest
// wavelengths differ from ours by 5 mÅ of 3875 Å and its lines are damped a little
// differently, so columns may differ by some 1e-4 dex where nothing is saturated;
// 0.01 dex and 1 % of b are allowed.
func TestGrowthOfCN(t *testing.T) {
	rows := check.CSV(t, check.Shared(t, "checks/cn_excitation_computed.csv"))
	const err = 0.01 // mÅ
	var widths, batch strings.Builder
	widths.WriteString("sightline,line,W_mA,W_err_mA\n")
	batch.WriteString("[growth]\nname = \"CN\"\nb_range = [0.1, 30.0]\ntable = \"widths.csv\"\n")
	type truth struct{ n0, n1, b float64 }
	want := map[string]truth{}
	for _, r := range rows {
		weakest := check.F(t, r, "W_P(1)_mA")
		if tau := check.F(t, r, "tau0_R(1)"); weakest < 20*err || tau < 0.6 || tau > 20 {
			continue // R(1) against P(1) says nothing of b, or both are flat
		}
		name := r["id"]
		want[name] = truth{math.Log10(check.F(t, r, "N0_cm2")), math.Log10(check.F(t, r, "N1_cm2")), check.F(t, r, "b_kms")}
		for _, l := range []string{"R(0)", "R(1)", "P(1)"} {
			fmt.Fprintf(&widths, "%s,CN %s,%.6f,%g\n", name, l, check.F(t, r, "W_"+l+"_mA"), err)
		}
		fmt.Fprintf(&batch, "[[sightline]]\nname = %q\n[[sightline.share_b]]\nspecies = [\"CN N=0\", \"CN N=1\"]\n", name)
	}
	if len(want) < 5 {
		t.Fatalf("only %d cases", len(want))
	}
	dir := t.TempDir()
	write(t, dir, "widths.csv", widths.String())
	file := write(t, dir, "cn.toml", batch.String())
	r := lacuna(t, "growth", "--json", "--no-figures", file, "--out", filepath.Join(dir, "out"))
	if r.code != 0 || r.err != "" {
		t.Fatalf("exit code %d\n%s", r.code, r.err)
	}
	var records []survey.Record
	if err := json.Unmarshal([]byte(r.out), &records); err != nil || len(records) != len(want) {
		t.Fatalf("%d records of %d, %v", len(records), len(want), err)
	}
	for _, rec := range records {
		w := want[rec.Name]
		if len(rec.Result.Growth) != 1 || len(rec.Result.Growth[0].Levels) != 2 {
			t.Errorf("%s: not one fit of two levels", rec.Name)
			continue
		}
		g := rec.Result.Growth[0]
		for i, n := range []float64{w.n0, w.n1} {
			if got := g.LogN[i].X; !(math.Abs(got-n) < 0.01) {
				t.Errorf("%s: log N(%s) = %.4f, want %.4f", rec.Name, g.Levels[i], got, n)
			}
		}
		if got := g.B.X; !(math.Abs(got/w.b-1) < 0.01) {
			t.Errorf("%s: b = %.4f, want %.3f", rec.Name, got, w.b)
		}
	}
	if got := names(t, filepath.Join(dir, "out")); len(got) != 1 || got[0] != "growth.ecsv" {
		t.Errorf("--no-figures wrote %v", got)
	}
	tab, rerr := table.Read(filepath.Join(dir, "out", "growth.ecsv"))
	if rerr != nil || tab.Rows() != 2*len(want) {
		t.Errorf("growth.ecsv: %v", rerr)
	}
}

// The table of widths that a survey writes is a batch's table as it stands.
func TestGrowthOfASurveysWidths(t *testing.T) {
	dir := t.TempDir()
	b := read(t, filepath.Join(demo(t), "results", "widths.ecsv"))
	write(t, dir, "widths.ecsv", b)
	file := write(t, dir, "batch.toml", "[growth]\nname = \"again\"\ntable = \"widths.ecsv\"\n")
	out := filepath.Join(dir, "out")
	text := works(t, "growth", file, "--out", out, "--workers", "2")
	if !strings.Contains(text, "Lantern 3") || !strings.Contains(text, "Fe II") {
		t.Errorf("no Fe II of Lantern 3 in\n%s", text)
	}
	one := filepath.Join(dir, "one")
	if got := works(t, "growth", "--workers", "1", file, "--out", one); strings.ReplaceAll(got, one, out) != text {
		t.Error("the text depends on the number of workers")
	}
	sameTables(t, "one worker", tables(t, one), tables(t, out))
}

func TestGrowthMistakes(t *testing.T) {
	const head = "[growth]\nname = \"b\"\n"
	const star = head + "[[sightline]]\nname = \"a\"\n"
	for _, tc := range []struct {
		toml  string
		words []string
	}{
		{"", []string{"batch.toml: nothing in it", "lacuna new"}},
		{head, []string{"batch.toml", "sightline"}},
		{star, []string{"sightline 1 (a)", "width"}},
		{star + "[[sightline.width]]\nline = \"Ca II K\"\nW_mA = 5\n", []string{"err_mA"}},
		{star + "[[sightline.width]]\nline = \"Ca II K\"\nW_mA = 5\nerr_mA = 0\n", []string{"err_mA", "0"}},
		{star + "[[sightline.width]]\nline = \"Ca II K\"\nW_mA = nan\nerr_mA = 1\n", []string{"W_mA", "NaN"}},
		{star + "[[sightline.width]]\nline = \"Ca II K\"\nW_mA = 5\nerr_mA = 1\nlimit_mA = 3\n", []string{"limit_mA"}},
		{star + "[[sightline.width]]\nline = \"Ca II Q\"\nW_mA = 5\nerr_mA = 1\n", []string{"Ca II Q", "Ca II 3933.66"}},
		{star + "[[sightline.width]]\nlien = \"Ca II K\"\nline = \"Ca II K\"\nW_mA = 5\nerr_mA = 1\n", []string{"lien: unknown key", "line"}},
		{"[survey]\nname = \"s\"\n", []string{"batch.toml: a survey", "lacuna run takes it"}},
		{head + "table = \"nosuch.csv\"\n", []string{"nosuch.csv"}},
	} {
		dir := t.TempDir()
		mistake(t, 2, tc.words, "growth", write(t, dir, "batch.toml", tc.toml))
		if got := names(t, dir); len(got) != 1 {
			t.Errorf("%q: wrote %v", tc.toml, got)
		}
	}
	dir := t.TempDir()
	works(t, "new", dir)
	mistake(t, 1, []string{"results folder", "growth.toml"}, "growth", filepath.Join(dir, "growth.toml"), "--out", filepath.Join(dir, "growth.toml", "out"))
}
