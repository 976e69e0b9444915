package disk_test

import (
	"errors"
	"io"
	"os"
	"path/filepath"
	"testing"

	"lacuna/internal/disk"
)

func TestAtomicWriteLeavesNothingAfterAnError(t *testing.T) {
	dir := t.TempDir()
	p := filepath.Join(dir, "a.txt")
	if err := disk.AtomicWrite(p, func(w io.Writer) error { _, err := io.WriteString(w, "old"); return err }); err != nil {
		t.Fatal(err)
	}
	bad := errors.New("half way")
	err := disk.AtomicWrite(p, func(w io.Writer) error { io.WriteString(w, "new"); return bad })
	if !errors.Is(err, bad) {
		t.Fatalf("error %v, want %v", err, bad)
	}
	got, _ := os.ReadFile(p)
	left, _ := os.ReadDir(dir)
	if string(got) != "old" || len(left) != 1 {
		t.Errorf("content %q, %d files; want the old content alone", got, len(left))
	}
}
