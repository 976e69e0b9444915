package main

import (
	"encoding/json"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"lacuna/atomic"
)

func listed(t testing.TB, args ...string) []atomic.Line {
	t.Helper()
	r := lacuna(t, append([]string{"lines", "--json"}, args...)...)
	if r.code != 0 || r.err != "" {
		t.Fatalf("%v: exit code %d\n%s", args, r.code, r.err)
	}
	var out []atomic.Line
	if err := json.Unmarshal([]byte(r.out), &out); err != nil {
		t.Fatal(err)
	}
	return out
}

func TestLines(t *testing.T) {
	all := listed(t)
	if len(all) != len(atomic.Default().Lines()) {
		t.Errorf("%d lines listed of %d", len(all), len(atomic.Default().Lines()))
	}
	works(t, "lines")
	for _, l := range listed(t, "--from", "3900", "--to", "4000") {
		if l.Wave < 3900 || l.Wave > 4000 {
			t.Errorf("%s at %.3f Å is not between 3900 and 4000", l.Name, l.Wave)
		}
	}
	text := works(t, "lines", "--species", "Ca II")
	for _, w := range []string{"Ca II 3933.66", "Ca II 3968.47", "K", "H", "vacuum Å", "air Å", "Morton2003", "2 lines", "m memory"} {
		if !strings.Contains(text, w) {
			t.Errorf("no %q in\n%s", w, text)
		}
	}
	if text := works(t, "lines", "--from", "3934", "--to", "3935"); !strings.Contains(text, "1 line,") {
		t.Errorf("one line is not 1 line:\n%s", text)
	}
	if text := works(t, "lines", "--from", "3950", "--to", "3951"); text != "no lines\n" {
		t.Errorf("where there is none: %q", text)
	}
	if got := listed(t, "--species", "CaII"); len(got) != 2 {
		t.Errorf("%d lines of CaII", len(got))
	}
	if got := listed(t, "--from", "3950", "--to", "3951"); got == nil || len(got) != 0 {
		t.Errorf("where there is none, JSON has %v", got)
	}
	sets := strings.Fields(works(t, "lines", "--f-set", "list"))
	if !slices.Contains(sets, "default") || len(sets) < 5 {
		t.Errorf("sets of f: %v", sets)
	}
	for _, s := range sets {
		works(t, "lines", "--f-set", s, "--species", "Fe II")
	}
}

func TestLinesOfMyOwn(t *testing.T) {
	dir := t.TempDir()
	own := write(t, dir, "own.csv", "species,lambda_vac_A,f,f_src\nTi II,3384.7300,0.4000,my laboratory\nTi II,3400.0000,0.0100,my laboratory\n")
	text := works(t, "lines", "--species", "Ti II", "--line-table", own, "--from", "3380", "--to", "3401")
	for _, w := range []string{"0.4", "3400.0000", "own.csv", "my laboratory", "u"} {
		if !strings.Contains(text, w) {
			t.Errorf("no %q in\n%s", w, text)
		}
	}
	for _, tc := range []struct {
		text  string
		words []string
	}{
		{"", []string{"bad.csv"}},
		{"species,lambda_vac_A,f\nTi II,3384.73,0.4\n", []string{"bad.csv", "f_src"}},
		{"species,lambda_vac_A,f,f_src\nTi II,3384.73,-0.4,x\n", []string{"bad.csv", "line 2", "f"}},
		{"species,lambda_vac_A,f,f_src\nTi II,nan,0.4,x\n", []string{"bad.csv", "line 2", "lambda_vac_A"}},
		{"species,lambda_vac_A,f,f_src\nTi II,3384.75,0.4,x\n", []string{"bad.csv", "line 2", "replaces"}},
	} {
		mistake(t, 2, tc.words, "lines", "--line-table", write(t, dir, "bad.csv", tc.text))
	}
	mistake(t, 2, []string{"own.csv"}, "lines", "--line-table", filepath.Join(own, "own.csv"))
}
