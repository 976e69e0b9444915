package fits

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"io"
	"math"
	"strings"

	"github.com/astrogo/fitsio"
)

// MaxValues is the largest number of values that one image line, cell or column
// may have: a file of a terabyte must not fill the memory.
const MaxValues = 1 << 26

// bitpixOf gives the image type that holds values of a column type.
var bitpixOf = map[byte]int{'B': 8, 'L': 8, 'I': 16, 'J': 32, 'K': 64, 'E': -32, 'D': -64}

// Lines returns how many lines of NAXIS1 pixels an image has: the product of
// the further axes.
func (h *HDU) Lines() int64 {
	n := int64(1)
	for _, a := range h.Axes[min(1, len(h.Axes)):] {
		n *= a
	}
	return n
}

// Line returns line i (from 0) of an image as physical values,
// BZERO + BSCALE · stored, with NaN where an integer image holds BLANK.
func (h *HDU) Line(i int64) ([]float64, error) {
	if h.Err != nil {
		return nil, h.Err
	}
	if h.Kind != Image {
		return nil, h.Fail("not an image", "")
	}
	if i < 0 || i >= h.Lines() {
		return nil, h.Fail(fmt.Sprintf("there is no image line %d; it has %d", i+1, h.Lines()), "choose another row")
	}
	scale, err := h.Float("BSCALE", 1)
	if err != nil {
		return nil, err
	}
	zero, err := h.Float("BZERO", 0)
	if err != nil {
		return nil, err
	}
	if h.tiled != nil {
		out, err := h.tiled.line(h, i)
		if err == nil && (scale != 1 || zero != 0) {
			for k, x := range out {
				out[k] = zero + scale*x
			}
		}
		return out, err
	}
	var blank *int64
	if h.Bitpix > 0 && h.Has("BLANK") {
		b, err := h.Int("BLANK", 0)
		if err != nil {
			return nil, err
		}
		blank = &b
	}
	size := h.Axes[0] * int64(max(h.Bitpix, -h.Bitpix)/8)
	return h.numbers(io.NewSectionReader(h.r, h.data+i*size, size), h.Bitpix, h.Axes[0], scale, zero, blank)
}

// numbers decodes n big-endian values. The library is given a header written
// here, which says no more than type and count, and exactly the bytes.
func (h *HDU) numbers(r io.Reader, bitpix int, n int64, scale, zero float64, null *int64) ([]float64, error) {
	if n == 0 {
		return []float64{}, nil
	}
	if n > MaxValues {
		return nil, h.Fail(fmt.Sprintf("%d values in one piece are no spectrum (limit %d)", n, MaxValues), "cut out what you need")
	}
	head := make([]byte, 0, block)
	for _, line := range []string{"XTENSION= 'IMAGE   '", fmt.Sprintf("BITPIX  = %20d", bitpix), "NAXIS   =                    1",
		fmt.Sprintf("NAXIS1  = %20d", n), "PCOUNT  =                    0", "GCOUNT  =                    1", "END"} {
		head = append(head, fmt.Sprintf("%-80s", line)...)
	}
	head = append(head, bytes.Repeat([]byte(" "), block-len(head))...)
	size := n * int64(max(bitpix, -bitpix)/8)
	pad := make([]byte, (block-size%block)%block)
	hdu, err := fitsio.NewDecoder(io.MultiReader(bytes.NewReader(head), r, bytes.NewReader(pad))).DecodeHDU()
	if err != nil {
		return nil, fmt.Errorf("reading %s, %s: %w", h.file, h.where, err)
	}
	img, ok := hdu.(fitsio.Image)
	if !ok {
		return nil, fmt.Errorf("reading %s, %s: not decoded as an image", h.file, h.where)
	}
	out := make([]float64, n)
	switch bitpix {
	case 8:
		err = widen[uint8](img, out, null)
	case 16:
		err = widen[int16](img, out, null)
	case 32:
		err = widen[int32](img, out, null)
	case 64:
		err = widen[int64](img, out, null)
	case -32:
		err = widen[float32](img, out, nil)
	case -64:
		err = img.Read(&out)
	}
	if err != nil {
		return nil, fmt.Errorf("reading %s, %s: %w", h.file, h.where, err)
	}
	if scale != 1 || zero != 0 {
		for i, x := range out {
			out[i] = zero + scale*x
		}
	}
	return out, nil
}

// widen reads the stored values and turns null into NaN.
func widen[T uint8 | int16 | int32 | int64 | float32](img fitsio.Image, out []float64, null *int64) error {
	stored := make([]T, len(out))
	if err := img.Read(&stored); err != nil {
		return err
	}
	for i, x := range stored {
		out[i] = float64(x)
		if null != nil && int64(x) == *null {
			out[i] = math.NaN()
		}
	}
	return nil
}

// Cell returns the values of one cell (column from 0 in Cols, row from 0) as
// physical values, TZERO + TSCAL · stored, with NaN where TNULL stands. Logical
// values are 1 and 0, NaN where neither T nor F; bits are 1 and 0.
func (h *HDU) Cell(col int, row int64) ([]float64, error) {
	if err := h.inside(col, row); err != nil {
		return nil, err
	}
	c := &h.Cols[col]
	if h.Kind == Ascii {
		x, err := h.asciiNumber(c, row)
		return []float64{x}, err
	}
	at, n, err := h.locate(c, row)
	if err != nil {
		return nil, err
	}
	if c.Type == 'X' && !c.Variable {
		if n > MaxValues {
			return nil, h.notNumbers(c)
		}
		b := make([]byte, c.width)
		if _, err := h.r.ReadAt(b, at); err != nil {
			return nil, fmt.Errorf("reading %s, %s: %w", h.file, h.where, err)
		}
		out := make([]float64, n)
		for i := range out {
			out[i] = float64(b[i/8] >> (7 - i%8) & 1)
		}
		return out, nil
	}
	bitpix, ok := bitpixOf[c.Type]
	if !ok {
		return nil, h.notNumbers(c)
	}
	return h.values(c, io.NewSectionReader(h.r, at, n*typeSize[c.Type]), bitpix, n)
}

// Column returns a column of one value a row.
func (h *HDU) Column(col int) ([]float64, error) {
	if err := h.inside(col, 0); err != nil {
		return nil, err
	}
	c := &h.Cols[col]
	if h.Rows > MaxValues {
		return nil, h.Fail(fmt.Sprintf("%d rows are no spectrum (limit %d)", h.Rows, MaxValues), "cut out what you need")
	}
	if h.Kind == Ascii {
		out := make([]float64, h.Rows)
		for i := range out {
			var err error
			if out[i], err = h.asciiNumber(c, int64(i)); err != nil {
				return nil, err
			}
		}
		return out, nil
	}
	bitpix, ok := bitpixOf[c.Type]
	if !ok || c.Variable {
		return nil, h.notNumbers(c)
	}
	if c.Repeat != 1 {
		return nil, h.Fail(fmt.Sprintf("column %s has %d values a row, not one", c.Name, c.Repeat), "choose another column")
	}
	return h.values(c, &strided{h: h, c: c}, bitpix, h.Rows)
}

// Text returns a cell of characters up to the first NUL, blanks at the end dropped.
func (h *HDU) Text(col int, row int64) (string, error) {
	if err := h.inside(col, row); err != nil {
		return "", err
	}
	c := &h.Cols[col]
	if c.Type != 'A' || c.Variable {
		return "", h.Fail(fmt.Sprintf("column %s is not text of fixed length", c.Name), "choose another column")
	}
	b := make([]byte, min(c.width, 1<<16)) // no name is longer
	if _, err := h.r.ReadAt(b, h.data+row*h.Axes[0]+c.offset); err != nil {
		return "", fmt.Errorf("reading %s, %s: %w", h.file, h.where, err)
	}
	if i := bytes.IndexByte(b, 0); i >= 0 {
		b = b[:i]
	}
	return strings.TrimRight(strings.ToValidUTF8(string(b), "?"), " "), nil
}

// values decodes and applies what the column says.
func (h *HDU) values(c *Column, r io.Reader, bitpix int, n int64) ([]float64, error) {
	if c.Type != 'L' {
		return h.numbers(r, bitpix, n, c.Scale, c.Zero, c.null)
	}
	out, err := h.numbers(r, bitpix, n, 1, 0, nil)
	for i, x := range out {
		switch x {
		case 'T':
			out[i] = 1
		case 'F':
			out[i] = 0
		default:
			out[i] = math.NaN()
		}
	}
	return out, err
}

// inside checks column and row.
func (h *HDU) inside(col int, row int64) error {
	switch {
	case h.Err != nil:
		return h.Err
	case h.Kind != Binary && h.Kind != Ascii:
		return h.Fail("not a table", "")
	case h.Rows == 0:
		return h.Fail("table has no rows (NAXIS2=0)", "")
	case col < 0 || col >= len(h.Cols):
		return h.Fail(fmt.Sprintf("there is no column %d; it has %d", col+1, len(h.Cols)), "choose another column")
	case row < 0 || row >= h.Rows:
		return h.Fail(fmt.Sprintf("there is no row %d; it has %d", row+1, h.Rows), "choose another row")
	}
	return nil
}

// locate returns where the values of a cell begin and how many there are; array
// descriptors are checked against the heap.
func (h *HDU) locate(c *Column, row int64) (at, n int64, err error) {
	at = h.data + row*h.Axes[0] + c.offset
	if !c.Variable {
		return at, c.Repeat, nil
	}
	b := make([]byte, c.width)
	if _, err := h.r.ReadAt(b, at); err != nil {
		return 0, 0, fmt.Errorf("reading %s, %s: %w", h.file, h.where, err)
	}
	var off int64
	if c.long {
		n, off = int64(binary.BigEndian.Uint64(b)), int64(binary.BigEndian.Uint64(b[8:]))
	} else {
		n, off = int64(int32(binary.BigEndian.Uint32(b))), int64(int32(binary.BigEndian.Uint32(b[4:])))
	}
	size := max(typeSize[c.Type], 1)
	room := h.size - h.heap
	if n < 0 || off < 0 || off > room || n > (room-off)/size {
		return 0, 0, h.Fail(fmt.Sprintf("column %s, row %d: array of %d values at byte %d does not lie in the heap of %d bytes", c.Name, row+1, n, off, room),
			"the table is damaged; fetch the file again")
	}
	return h.data + h.heap + off, n, nil
}

func (h *HDU) notNumbers(c *Column) error {
	return h.Fail(fmt.Sprintf("column %s of type %c does not hold real numbers", c.Name, c.Type), "choose another column")
}
