package main

import (
	"bytes"
	"encoding/json"
	"encoding/xml"
	"errors"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"lacuna/internal/table"
	"lacuna/survey"
)

// wellFormed reads a result file by its ending: tables with rows, one JSON
// document, drawings that a browser would take.
func wellFormed(t *testing.T, path string) {
	t.Helper()
	b := []byte(read(t, path))
	switch filepath.Ext(path) {
	case ".ecsv":
		if _, err := table.Read(path); err != nil {
			t.Errorf("%v", err)
		}
	case ".json":
		if !json.Valid(b) {
			t.Errorf("%s is not JSON", path)
		}
	case ".jsonl":
		for i, line := range bytes.Split(bytes.TrimSuffix(b, []byte("\n")), []byte("\n")) {
			if !json.Valid(line) {
				t.Errorf("%s: line %d is not JSON", path, i+1)
			}
		}
	case ".svg":
		drawing(t, path, b)
	}
}

func drawing(t *testing.T, path string, b []byte) {
	t.Helper()
	root := ""
	for d := xml.NewDecoder(bytes.NewReader(b)); ; {
		tok, err := d.Token()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			t.Errorf("%s: %v", path, err)
			return
		}
		if e, ok := tok.(xml.StartElement); ok && root == "" {
			root = e.Name.Local
		}
	}
	if root != "svg" {
		t.Errorf("%s: a drawing of <%s>", path, root)
	}
}

func TestDemo(t *testing.T) {
	dir := demo(t)
	if demoSaid.err != "" {
		t.Errorf("standard error of the demo:\n%s", demoSaid.err)
	}
	readable(t, []string{"demo"}, demoSaid.out)
	for _, w := range []string{"Lantern 1", "Lantern 2", "Lantern 3", "3 sightlines: 3 done, 0 failed",
		"Results: lantern/results", "lantern/truth.ecsv", "trace ion: needs ionization correction"} {
		if !strings.Contains(demoSaid.out, w) {
			t.Errorf("the demo does not say %q", w)
		}
	}
	have := map[string]bool{}
	for _, name := range names(t, dir) {
		have[name] = true
		wellFormed(t, filepath.Join(dir, name))
	}
	for _, name := range []string{"survey.toml", "truth.ecsv", "results/widths.ecsv", "results/columns.ecsv", "results/depletions.ecsv",
		"results/growth.ecsv", "results/manifest.json", "results/journal.jsonl",
		"results/figures/Lantern_1-lines.svg", "results/figures/Lantern_2-lines.svg", "results/figures/Lantern_3-lines.svg"} {
		if !have[name] {
			t.Errorf("the demo did not write %s", name)
		}
	}
	var m survey.Manifest
	if err := json.Unmarshal([]byte(read(t, filepath.Join(dir, "results", "manifest.json"))), &m); err != nil {
		t.Fatal(err)
	}
	if got := strings.Join(m.Command, " "); got != "demo" {
		t.Errorf("the manifest's command is %q", got)
	}
	if len(m.Inputs) != 5 || len(m.Rows) == 0 || m.Sightlines != 3 || len(m.Failed) != 0 {
		t.Errorf("manifest: %d inputs, %d rows of data tables, %d sightlines, %v failed", len(m.Inputs), len(m.Rows), m.Sightlines, m.Failed)
	}
}

// A demo does not go where a run is at work, nor into a folder with other things.
func TestDemoRefuses(t *testing.T) {
	dir := t.TempDir()
	write(t, dir, "truth.ecsv", read(t, filepath.Join(demo(t), "truth.ecsv")))
	if err := os.Mkdir(filepath.Join(dir, "results"), 0o755); err != nil {
		t.Fatal(err)
	}
	j, err := survey.OpenJournal(filepath.Join(dir, "results"))
	if err != nil {
		t.Fatal(err)
	}
	stray := write(t, filepath.Join(dir, "results"), "old.svg", "")
	mistake(t, 2, []string{"another run works here", "--out"}, "demo", "--out", dir)
	if err := j.Close(); err != nil {
		t.Fatal(err)
	}
	if _, err := os.Stat(stray); err != nil {
		t.Error("a demo that was refused removed results")
	}
	if err := removeResults(filepath.Join(dir, "results")); err != nil {
		t.Error(err)
	}
	if got := names(t, dir); len(got) != 1 {
		t.Errorf("results of an earlier demo stay: %v", got)
	}

	other := t.TempDir()
	write(t, other, "thesis.tex", "mine")
	mistake(t, 2, []string{other, "not an earlier demo", "--out"}, "demo", "--out", other)
	if got := names(t, other); len(got) != 1 {
		t.Errorf("the demo wrote into a folder of mine: %v", got)
	}
	file := write(t, other, "file", "")
	mistake(t, 1, []string{"the demo's folder", file}, "demo", "--out", file)
}
