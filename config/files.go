package config

import (
	"errors"
	"fmt"
	"io/fs"
	"os"

	"lacuna/internal/oops"
)

// CheckFiles looks for every spectrum that the survey names and reports all that
// are missing, not only the first.
func (s *Survey) CheckFiles() error {
	l := &loader{file: s.File}
	seen := map[string]error{}
	look := func(where, name string) {
		p := s.Path(name)
		err, known := seen[p]
		if !known {
			err = regular(p)
			seen[p] = err
		}
		if err != nil {
			l.add(oops.Inputf(s.File, where, "paths start at the folder of the survey file", "%s: %v", show(name), err))
		}
	}
	for i, x := range s.Sightlines {
		for j, sp := range x.Spectra {
			where := nth(place(i, x.Name)+": spectrum", j)
			look(at(where, "file"), sp.File)
			if sp.LineSpread != "" {
				look(at(where, "line_spread"), sp.LineSpread)
			}
			if sp.ContinuumFile != "" {
				look(at(where, "continuum_file"), sp.ContinuumFile)
			}
		}
	}
	if n := len(l.errs); n > maxMistakes {
		return errors.Join(append(l.errs[:maxMistakes:maxMistakes], oops.Inputf(s.File, "", "", "and %d more of %d missing files", n-maxMistakes, n))...)
	}
	return l.err()
}

func regular(path string) error {
	st, err := os.Stat(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return errors.New("no such file")
	case err != nil:
		var p *fs.PathError
		if errors.As(err, &p) {
			return p.Err
		}
		return err
	case st.IsDir():
		return errors.New("is a folder")
	case !st.Mode().IsRegular():
		return fmt.Errorf("is not a file (%s)", st.Mode().Type())
	}
	return nil
}
