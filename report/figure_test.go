package report

import (
	"bytes"
	"os"
	"path/filepath"
	"testing"
)

// svg writes a figure, and if LACUNA_LOOK names a folder also puts it there for
// people to look at.
func svg(t testing.TB, f Figure) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := f.WriteSVG(&b); err != nil {
		t.Fatal(err)
	}
	if dir := os.Getenv("LACUNA_LOOK"); dir != "" {
		if err := os.WriteFile(filepath.Join(dir, f.Name+".svg"), b.Bytes(), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return b.Bytes()
}

func TestFigures(t *testing.T) {
	for _, r := range everything() {
		for _, f := range Figures(r) {
			svg(t, f)
		}
	}
}
