// Package disk writes files that appear complete or not at all.
package disk

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
)

// AtomicWrite writes path through a temporary file in the same folder, synced
// and renamed at the end. After an error nothing new stands at path.
func AtomicWrite(path string, write func(io.Writer) error) (err error) {
	dir := filepath.Dir(path)
	f, err := os.CreateTemp(dir, ".lacuna-*")
	if err != nil {
		var p *fs.PathError
		if errors.As(err, &p) {
			err = p.Err // the name of the temporary file helps nobody
		}
		return fmt.Errorf("writing %s: %w", path, err)
	}
	defer func() {
		if err != nil {
			f.Close()
			os.Remove(f.Name())
		}
	}()
	w := bufio.NewWriter(f)
	if err = write(w); err != nil {
		return err
	}
	if err = w.Flush(); err != nil {
		return err
	}
	if err = f.Chmod(0o644); err != nil {
		return err
	}
	if err = f.Sync(); err != nil {
		return err
	}
	if err = f.Close(); err != nil {
		return err
	}
	if err = os.Rename(f.Name(), path); err != nil {
		var l *os.LinkError
		if errors.As(err, &l) {
			err = l.Err
		}
		return fmt.Errorf("writing %s: %w", path, err)
	}
	if d, e := os.Open(dir); e == nil {
		d.Sync() // best effort: not every file system syncs folders
		d.Close()
	}
	return nil
}
