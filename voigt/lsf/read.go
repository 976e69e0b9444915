package lsf

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"os"
	"strconv"
	"strings"

	"lacuna/internal/oops"
)

// maxRows bounds a profile file; real ones have some hundred rows.
const maxRows = 1_000_000

// Read reads a line spread function from a text file:
//
//	# any comment
//	offset_A   1200   1700
//	-0.12      0.0    0.0
//	…
//
// The first line that is no comment names the columns: offset_A, offset_kms or
// offset_pixel, then the wavelengths (Å, vacuum) of the profiles, or one word for a
// single profile that serves everywhere. Columns are separated by blanks, tabs or
// commas. pixelA is the size of a pixel in Å, needed for offset_pixel only.
func Read(path string, pixelA float64) (*Tabulated, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, oops.Inputf(path, "", "check the path", "cannot be opened: %v", err)
	}
	defer f.Close()
	t, err := parse(f, path, pixelA)
	if err != nil {
		return nil, err
	}
	p, err := NewTabulated(t)
	var m *oops.Mistake
	if errors.As(err, &m) {
		m.File = path
	}
	return p, err
}

func parse(r io.Reader, name string, pixelA float64) (Table, error) {
	t := Table{PixelA: pixelA}
	lines := bufio.NewScanner(r)
	lines.Buffer(nil, 1<<20)
	cols := 0
	for n := 1; lines.Scan(); n++ {
		where := fmt.Sprintf("line %d", n)
		text := strings.TrimSpace(lines.Text())
		if text == "" || text[0] == '#' {
			continue
		}
		words := strings.FieldsFunc(text, func(r rune) bool { return r == ',' || r == ' ' || r == '\t' })
		if cols == 0 {
			if err := t.header(words, name, where); err != nil {
				return Table{}, err
			}
			cols = len(words)
			continue
		}
		if len(words) != cols {
			return Table{}, oops.Inputf(name, where, "give every row as many numbers as the header has names", "%d columns in place of %d", len(words), cols)
		}
		if len(t.Offset) == maxRows {
			return Table{}, oops.Inputf(name, where, "is this a profile?", "more than %d rows", maxRows)
		}
		for k, w := range words {
			x, err := strconv.ParseFloat(w, 64)
			if err != nil {
				return Table{}, oops.Inputf(name, where, "give a number", "column %d, %q, is not a number", k+1, w)
			}
			if k == 0 {
				t.Offset = append(t.Offset, x)
			} else {
				t.Density[k-1] = append(t.Density[k-1], x)
			}
		}
	}
	if err := lines.Err(); err != nil {
		return Table{}, oops.Inputf(name, "", "is this a text file?", "cannot be read: %v", err)
	}
	if cols == 0 {
		return Table{}, oops.Input(name, "", "it holds no table", "begin with a line such as: offset_A 1200 1700")
	}
	return t, nil
}

// header reads the names of the columns.
func (t *Table) header(words []string, name, where string) error {
	first := ""
	if len(words) > 0 { // a line of separators has none
		first = words[0]
	}
	unit, ok := strings.CutPrefix(first, "offset_")
	if !ok || len(words) < 2 {
		return oops.Inputf(name, where, "name the columns first: offset_A, offset_kms or offset_pixel, then the wavelengths in Å",
			"the header begins with %q and has %d columns", first, len(words))
	}
	t.Unit = Unit(unit)
	t.Density = make([][]float64, len(words)-1)
	if _, err := strconv.ParseFloat(words[1], 64); err != nil && len(words) == 2 {
		return nil // one profile, by any name
	}
	for _, w := range words[1:] {
		x, err := strconv.ParseFloat(w, 64)
		if err != nil {
			return oops.Inputf(name, where, "head each of several profiles with its wavelength in Å", "%q is not a wavelength", w)
		}
		t.Wave = append(t.Wave, x)
	}
	return nil
}
