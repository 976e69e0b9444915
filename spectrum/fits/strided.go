package fits

import (
	"fmt"
	"io"
	"math"
	"strings"
)

// strided reads one column of consecutive rows as if it lay in one piece.
type strided struct {
	h    *HDU
	c    *Column
	row  int64
	buf  []byte
	rest []byte
}

func (s *strided) Read(p []byte) (int, error) {
	if len(s.rest) == 0 {
		if err := s.fill(); err != nil {
			return 0, err
		}
	}
	n := copy(p, s.rest)
	s.rest = s.rest[n:]
	return n, nil
}

// fill gathers the column from as many rows as make about a megabyte.
func (s *strided) fill() error {
	width := s.h.Axes[0]
	rows := min(max(1, (1<<20)/width), s.h.Rows-s.row)
	if rows == 0 {
		return io.EOF
	}
	from := s.h.data + s.row*width + s.c.offset
	s.rest = s.rest[:0]
	if width > 1<<20 {
		s.buf = grow(s.buf, s.c.width)
	} else {
		s.buf = grow(s.buf, (rows-1)*width+s.c.width)
	}
	if _, err := s.h.r.ReadAt(s.buf, from); err != nil {
		return err
	}
	out := make([]byte, 0, rows*s.c.width)
	for i := int64(0); i < rows; i++ {
		out = append(out, s.buf[i*width:i*width+s.c.width]...)
	}
	s.rest = out
	s.row += rows
	return nil
}

func grow(b []byte, n int64) []byte {
	if int64(cap(b)) < n {
		return make([]byte, n)
	}
	return b[:n]
}

// asciiNumber reads a field of an ASCII table; blank is NaN.
func (h *HDU) asciiNumber(c *Column, row int64) (float64, error) {
	b := make([]byte, min(c.width, 80)) // no number is longer
	if _, err := h.r.ReadAt(b, h.data+row*h.Axes[0]+c.offset); err != nil {
		return 0, fmt.Errorf("reading %s, %s: %w", h.file, h.where, err)
	}
	s := strings.TrimSpace(string(b))
	if c.Type == 'A' {
		return 0, h.notNumbers(c)
	}
	if s == "" || s == h.Str(fmt.Sprintf("TNULL%d", c.n)) {
		return math.NaN(), nil
	}
	x, ok := ParseNumber(s)
	if !ok {
		return 0, h.Fail(fmt.Sprintf("column %s, row %d: %q is not a number", c.Name, row+1, s), "correct the table")
	}
	return c.Zero + c.Scale*x, nil
}
