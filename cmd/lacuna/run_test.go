package main

import (
	"context"
	"encoding/json"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"lacuna/internal/table"
	"lacuna/survey"
)

// tables are the parts of a results folder that must not depend on how a run
// went: all but the manifest (times), the journal (order) and its lock.
func tables(t testing.TB, dir string) map[string]string {
	t.Helper()
	out := map[string]string{}
	for _, name := range names(t, dir) {
		switch name {
		case "manifest.json", "journal.lock":
		case "journal.jsonl":
			lines := strings.SplitAfter(read(t, filepath.Join(dir, name)), "\n")
			slices.Sort(lines)
			out[name] = strings.Join(lines, "")
		default:
			out[name] = read(t, filepath.Join(dir, name))
		}
	}
	return out
}

func sameTables(t testing.TB, what string, got, want map[string]string) {
	t.Helper()
	for name := range want {
		if got[name] != want[name] {
			t.Errorf("%s: %s differs", what, name)
		}
	}
	for name := range got {
		if _, ok := want[name]; !ok {
			t.Errorf("%s: %s should not be there", what, name)
		}
	}
}

// objects are the sightlines of a table, each once.
func objects(t testing.TB, path string) []string {
	t.Helper()
	tab, err := table.Read(path)
	if err != nil {
		t.Fatal(err)
	}
	col, err := tab.Col("object")
	if err != nil {
		t.Fatal(err)
	}
	var out []string
	for i := range tab.Rows() {
		if s, _ := tab.String(col, i); !slices.Contains(out, s) {
			out = append(out, s)
		}
	}
	return out
}

// smallSurvey is a survey of three sightlines with few lines, which takes little
// time; its folder has links to the demo's spectra.
const smallSurvey = `[survey]
name = "Small"
scale = "asplund2021"

[[sightline]]
name = "Lantern 1"
velocity = [-40, 20]
lines = ["Na I 5889.95", "Na I 5895.92"]
[[sightline.spectrum]]
file = "lantern1_red.fits"

[[sightline]]
name = "Lantern 2"
velocity = [-15, 25]
lines = ["Ti II 3383.76"]
[[sightline.spectrum]]
file = "lantern2_blue.fits"
[sightline.hydrogen]
logN_HI = 20.45
logN_HI_err = 0.10
logN_H2_max = 19.60
source = "invented"

[[sightline]]
name = "Lantern 3"
velocity = [-15, 45]
lines = ["Zn II 2062.66"]
[[sightline.spectrum]]
file = "lantern3_uv.fits"
`

// The same bytes come out for any number of workers, of one run or of runs in
// pieces, and after a run that was stopped.
func TestSameBytes(t *testing.T) {
	dir := spectra(t)
	file := write(t, dir, "survey.toml", smallSurvey)
	out := func(name string) string { return filepath.Join(dir, name) }

	one := lacuna(t, "run", file, "--workers", "1", "--out", out("one"))
	if one.code != 0 || one.err != "" {
		t.Fatalf("exit code %d\n%s", one.code, one.err)
	}
	readable(t, []string{"run"}, one.out)
	want := tables(t, out("one"))
	if len(want) < 8 {
		t.Fatalf("only %d files to compare", len(want))
	}
	two := lacuna(t, "run", "--workers=2", file, "--out", out("two"))
	sameTables(t, "two workers", tables(t, out("two")), want)
	if strings.ReplaceAll(two.out, out("two"), out("one")) != one.out {
		t.Error("the summary depends on the number of workers")
	}

	// In pieces, last sightline first: tables hold what is done so far.
	r := lacuna(t, "run", file, "--only", "Lantern 3", "--out", out("pieces"))
	if r.code != 0 || strings.Contains(r.out, "Lantern 1") || !strings.Contains(r.out, "1 sightline: 1 done") {
		t.Errorf("--only: exit code %d\n%s%s", r.code, r.err, r.out)
	}
	if got := objects(t, out("pieces/widths.ecsv")); !slices.Equal(got, []string{"Lantern 3"}) {
		t.Errorf("after --only, widths of %v", got)
	}
	lacuna(t, "run", file, "--only", "Lantern 1", "--only=Lantern 2", "--out", out("pieces"))
	sameTables(t, "in pieces", tables(t, out("pieces")), want)

	// Stopped as soon as the first record is on the disk, then taken up again.
	ctx, cancel := context.WithCancel(context.Background())
	go func() {
		defer cancel()
		for range 60000 {
			if info, err := os.Stat(out("stopped/journal.jsonl")); err == nil && info.Size() > 0 {
				return
			}
			time.Sleep(time.Millisecond)
		}
	}()
	r = lacunaIn(ctx, t, "run", file, "--workers", "1", "--out", out("stopped"))
	<-ctx.Done()
	if r.code != 1 || !strings.Contains(r.err, "stopped before the end") || !strings.Contains(r.err, "the journal keeps what was done") {
		t.Errorf("a stopped run: exit code %d, %s", r.code, r.err)
	}
	if _, err := os.Stat(out("stopped/widths.ecsv")); err == nil {
		t.Error("a stopped run wrote tables")
	}
	kept := strings.Count(read(t, out("stopped/journal.jsonl")), "\n")
	if kept < 1 {
		t.Error("a stopped run kept nothing")
	}
	if r = lacuna(t, "run", file, "--out", out("stopped")); r.code != 0 || r.err != "" {
		t.Errorf("after a stopped run: exit code %d, %s", r.code, r.err)
	}
	sameTables(t, "after a stopped run", tables(t, out("stopped")), want)
	if !strings.HasPrefix(want["journal.jsonl"], `{"crc":`) {
		t.Error("the journal's lines have no checksum")
	}

	t.Run("damaged journal", func(t *testing.T) { damagedJournal(t, file, out("pieces"), want) })
	t.Run("one run at a time", func(t *testing.T) {
		j, err := survey.OpenJournal(out("two"))
		if err != nil {
			t.Fatal(err)
		}
		defer j.Close()
		mistake(t, 2, []string{out("two"), "another run works here", "--out"}, "run", file, "--out", out("two"))
	})
	t.Run("results beside the survey", func(t *testing.T) {
		r := lacuna(t, "run", file, "--json", "--only", "Lantern 2")
		var records []survey.Record
		if err := json.Unmarshal([]byte(r.out), &records); err != nil || r.code != 0 || len(records) != 1 || records[0].Name != "Lantern 2" {
			t.Fatalf("exit code %d, %d records, %v\n%s", r.code, len(records), err, r.err)
		}
		if r.err != "" {
			t.Errorf("beside the JSON: %s", r.err)
		}
		if _, err := os.Stat(filepath.Join(dir, "results", "widths.ecsv")); err != nil {
			t.Error(err)
		}
	})
}

// A flipped bit inside a line, and a last line cut short: the one is named and
// kept, the other cut off; both sightlines are computed again.
func damagedJournal(t *testing.T, file, dir string, want map[string]string) {
	path := filepath.Join(dir, "journal.jsonl")
	b := []byte(read(t, path))
	b[len(b)/10] ^= 1
	cut := b[:len(b)-100]
	if err := os.WriteFile(path, cut, 0o644); err != nil {
		t.Fatal(err)
	}
	r := lacuna(t, "run", file, "--out", dir)
	if r.code != 0 || strings.Count(r.err, "\n") != 1 || !strings.HasPrefix(r.err, "note: ") ||
		!strings.Contains(r.err, "journal.jsonl") || !strings.Contains(r.err, "line 1 is damaged") {
		t.Errorf("exit code %d, standard error\n%s", r.code, r.err)
	}
	got := tables(t, dir)
	got["journal.jsonl"] = want["journal.jsonl"] // it keeps the damaged line
	sameTables(t, "after damage", got, want)
}

func TestDryRun(t *testing.T) {
	dir := spectra(t)
	file := write(t, dir, "survey.toml", smallSurvey)
	before := names(t, dir)
	text := works(t, "run", "--dry-run", file)
	for _, w := range []string{`name = "Lantern 2"`, "detection = 3.0", "# default", `file = "lantern3_uv.fits"`, `frame = "heliocentric"`} {
		if !strings.Contains(text, w) {
			t.Errorf("no %q in the resolved survey", w)
		}
	}
	if after := names(t, dir); !slices.Equal(before, after) {
		t.Errorf("--dry-run wrote something: %v", after)
	}
	// The resolved survey says the same again.
	resolved := write(t, dir, "resolved.toml", text)
	again := works(t, "run", "--dry-run", resolved)
	plain := func(s string) string {
		var out []string
		for line := range strings.Lines(s) {
			line, _, _ = strings.Cut(line, " #")
			out = append(out, strings.TrimSpace(line))
		}
		return strings.Join(out, "\n")
	}
	if plain(again) != plain(text) {
		t.Errorf("the resolved survey resolves to something else:\n%s", again)
	}
}

// One sightline that cannot be done does not take the others with it.
func TestRunWithOneFailure(t *testing.T) {
	dir := spectra(t)
	text := strings.Replace(smallSurvey, "velocity = [-15, 25]", "velocity = [4000, 4050]", 1)
	file := write(t, dir, "survey.toml", text)
	r := lacuna(t, "run", file, "--out", filepath.Join(dir, "out"))
	if r.code != 2 || strings.Count(r.err, "\n") != 1 {
		t.Errorf("exit code %d, standard error\n%s", r.code, r.err)
	}
	for _, w := range []string{"survey.toml", "Lantern 2", "Ti II 3383.76", "no spectrum holds its window", "3429"} {
		if !strings.Contains(r.err, w) {
			t.Errorf("no %q in %s", w, r.err)
		}
	}
	if !strings.Contains(r.out, "3 sightlines: 2 done, 1 failed") {
		t.Errorf("the summary ends\n%s", r.out[max(0, len(r.out)-300):])
	}
	if got := objects(t, filepath.Join(dir, "out", "widths.ecsv")); !slices.Equal(got, []string{"Lantern 1", "Lantern 3"}) {
		t.Errorf("widths of %v", got)
	}
	var m survey.Manifest
	if err := json.Unmarshal([]byte(read(t, filepath.Join(dir, "out", "manifest.json"))), &m); err != nil || !slices.Equal(m.Failed, []string{"Lantern 2"}) {
		t.Errorf("the manifest lists %v as failed, %v", m.Failed, err)
	}
}

func TestNew(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "a", "b")
	text := works(t, "new", dir)
	for _, name := range []string{"survey.toml", "growth.toml"} {
		if !strings.Contains(text, filepath.Join(dir, name)) {
			t.Errorf("new does not say that it wrote %s", name)
		}
	}
	if got := names(t, dir); len(got) != 2 {
		t.Errorf("new wrote %v", got)
	}
	before := read(t, filepath.Join(dir, "survey.toml"))
	mistake(t, 2, []string{"survey.toml", "there already"}, "new", dir)
	if read(t, filepath.Join(dir, "survey.toml")) != before {
		t.Error("new wrote over a file")
	}
	// The starter's star has no spectrum yet: that is said, and how to mend it.
	mistake(t, 2, []string{"lantern1.fits", "no such file"}, "run", filepath.Join(dir, "survey.toml"))
	if got := names(t, dir); len(got) != 2 {
		t.Errorf("a run that could not begin wrote %v", got)
	}
}
