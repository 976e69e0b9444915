package report

import (
	"os"
	"path/filepath"
	"testing"

	"lacuna/internal/oops"
	"lacuna/internal/table"
)

func TestWriteResults(t *testing.T) {
	dir := t.TempDir()
	if err := WriteResults(dir, everything()); err != nil {
		t.Fatal(err)
	}
	for name, rows := range map[string]int{"widths": 18, "columns": 12, "depletions": 8, "growth": 1} { // counted in the fixture
		tab, err := table.Read(filepath.Join(dir, name+".ecsv"))
		if err != nil {
			t.Fatal(err)
		}
		if tab.Rows() != rows {
			t.Errorf("%s: %d rows, want %d", name, tab.Rows(), rows)
		}
	}
	for _, f := range []string{"Lantern_1-lines", "Lantern_2-lines", "Lantern_2-lines-2", "Lantern_2-growth-Fe_II", "Lantern_2-depletion"} {
		if _, err := os.Stat(filepath.Join(dir, "figures", f+".svg")); err != nil {
			t.Error(err)
		}
	}
}

func TestWriteGrowth(t *testing.T) {
	dir := t.TempDir()
	if err := WriteGrowth(dir, everything(), false); err != nil {
		t.Fatal(err)
	}
	if _, err := os.Stat(filepath.Join(dir, "figures")); err == nil {
		t.Error("figures although none were wanted")
	}
	if err := WriteGrowth(dir, everything(), true); err != nil {
		t.Fatal(err)
	}
	if _, err := os.Stat(filepath.Join(dir, "figures", "Lantern_2-growth-Fe_II.svg")); err != nil {
		t.Error(err)
	}
}

func TestWriteLineFigure(t *testing.T) {
	dir := t.TempDir()
	if err := WriteLineFigure(filepath.Join(dir, "x.PDF"), uv()); !oops.IsInput(err) {
		t.Errorf("an unknown ending gives %v", err)
	}
	if err := WriteLineFigure(filepath.Join(dir, "none", "x.svg"), uv()); err == nil || oops.IsInput(err) {
		t.Errorf("a folder that is not there gives %v", err)
	}
	if err := WriteLineFigure(filepath.Join(dir, "x.svg"), uv()); err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"x.svg", "x-2.svg"} {
		if _, err := os.Stat(filepath.Join(dir, name)); err != nil {
			t.Error(err)
		}
	}
}
