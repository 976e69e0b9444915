// Package check helps tests to read the reference material that lies beside a
// developer's checkout.
package check

import (
	"encoding/csv"
	"os"
	"path/filepath"
	"strconv"
	"testing"
)

// Root returns the folder of go.mod.
func Root(t testing.TB) string {
	t.Helper()
	dir, err := os.Getwd()
	if err != nil {
		t.Fatal(err)
	}
	for {
		if _, err := os.Stat(filepath.Join(dir, "go.mod")); err == nil {
			return dir
		}
		up := filepath.Dir(dir)
		if up == dir {
			t.Fatal("no go.mod above the working directory")
		}
		dir = up
	}
}

// Shared returns the path of a file or folder in ../shared. Where it is absent
// the test is skipped, or fails if LACUNA_REQUIRE_ALL=1.
func Shared(t testing.TB, name string) string {
	t.Helper()
	p := filepath.Join(Root(t), "..", "shared", filepath.FromSlash(name))
	if _, err := os.Stat(p); err != nil {
		Missing(t, "../shared/"+name+" is not beside this checkout")
	}
	return p
}

// Missing skips the test for want of something outside the repository, or fails
// it if LACUNA_REQUIRE_ALL=1.
func Missing(t testing.TB, what string) {
	t.Helper()
	if os.Getenv("LACUNA_REQUIRE_ALL") == "1" {
		t.Fatal(what + " (LACUNA_REQUIRE_ALL=1)")
	}
	t.Skip(what)
}

// CSV reads a table with a header line, # lines left out, as one map a row.
func CSV(t testing.TB, path string) []map[string]string {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	r.FieldsPerRecord = -1
	all, err := r.ReadAll()
	if err != nil || len(all) < 2 {
		t.Fatalf("%s: %d rows, %v", path, len(all), err)
	}
	out := make([]map[string]string, 0, len(all)-1)
	for _, rec := range all[1:] {
		m := make(map[string]string, len(rec))
		for i, name := range all[0] {
			if i < len(rec) {
				m[name] = rec[i]
			}
		}
		out = append(out, m)
	}
	return out
}

// F returns a column as a number; the test fails where it is none.
func F(t testing.TB, row map[string]string, col string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(row[col], 64)
	if err != nil {
		t.Fatalf("column %s: %q is not a number", col, row[col])
	}
	return x
}
