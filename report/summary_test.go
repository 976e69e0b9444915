package report

import (
	"bytes"
	"flag"
	"os"
	"path/filepath"
	"testing"
)

var update = flag.Bool("update", false, "rewrite the golden files")

// golden compares text with a file of testdata.
func golden(t *testing.T, name string, got []byte) {
	t.Helper()
	path := filepath.Join("testdata", name)
	if *update {
		if err := os.WriteFile(path, got, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(got, want) {
		t.Errorf("%s differs (go test ./report -update rewrites it); got:\n%s", path, got)
	}
}

func TestSummary(t *testing.T) {
	for name, o := range map[string]Options{"summary.txt": {}, "summary-ascii.txt": {ASCII: true, Width: 72}, "summary-color.txt": {Color: true}} {
		var b bytes.Buffer
		if err := Summary(&b, everything(), o); err != nil {
			t.Fatal(err)
		}
		golden(t, name, b.Bytes())
	}
}
