package fits

import (
	"fmt"
	"io"
	"math"
	"reflect"
	"strings"

	"github.com/astrogo/fitsio"
)

// An Entry is one card to write. Value is a string, bool, int or float64; with
// the key COMMENT or HISTORY it is nil and the text stands in Comment.
type Entry struct {
	Key     string
	Value   any
	Comment string
}

// A Vector is one column to write: each row is a cell of the same number of
// values.
type Vector struct {
	Name, Unit, UCD, Utype string
	Type                   byte        // D or E (reals), J or I (integers), A (text)
	Rows                   [][]float64 // of D, E, J, I
	Text                   []string    // of A
}

// WriteImage writes a primary image of doubles: one line is NAXIS=1, several of
// equal length are NAXIS=2. cards follow the structural ones.
func WriteImage(w io.Writer, lines [][]float64, cards []Entry) error {
	if len(lines) == 0 || len(lines[0]) == 0 {
		return fmt.Errorf("writing FITS: an image needs at least one pixel")
	}
	axes := []int{len(lines[0])}
	if len(lines) > 1 {
		axes = append(axes, len(lines))
	}
	var all []float64
	for _, l := range lines {
		if len(l) != axes[0] {
			return fmt.Errorf("writing FITS: image lines of %d and %d pixels", axes[0], len(l))
		}
		all = append(all, l...)
	}
	head := primary(-64, axes)
	if err := put(head, cards); err != nil {
		return err
	}
	img, err := fitsio.NewPrimaryHDU(head)
	if err != nil {
		return fmt.Errorf("writing FITS: %w", err)
	}
	if err := img.Write(all); err != nil {
		return fmt.Errorf("writing FITS: %w", err)
	}
	return encode(w, img)
}

// WriteTable writes an empty primary HDU with its cards and one binary table of
// that EXTNAME. All columns have the same number of rows.
func WriteTable(w io.Writer, first []Entry, extname string, cols []Vector, cards []Entry) error {
	head := primary(8, nil)
	if err := put(head, append([]Entry{{"EXTEND", true, "a table follows"}}, first...)); err != nil {
		return err
	}
	empty, err := fitsio.NewPrimaryHDU(head)
	if err != nil {
		return fmt.Errorf("writing FITS: %w", err)
	}
	if err := encode(w, empty); err != nil {
		return err
	}
	columns, forms := make([]fitsio.Column, len(cols)), make([]string, len(cols))
	width, rows := 0, -1
	for i := range cols {
		form, size, n, err := cols[i].form()
		if err != nil {
			return err
		}
		if rows >= 0 && n != rows {
			return fmt.Errorf("writing FITS: columns of %d and %d rows", rows, n)
		}
		rows, width = n, width+size
		forms[i] = form
		// The library puts a NUL in front of text: it gets bytes instead.
		columns[i] = fitsio.Column{Name: cols[i].Name, Format: strings.Replace(form, "A", "B", 1)}
	}
	if rows < 1 {
		return fmt.Errorf("writing FITS: a table needs at least one column and row")
	}
	table, err := fitsio.NewTable(extname, columns, fitsio.BINARY_TBL)
	if err != nil {
		return fmt.Errorf("writing FITS: %w", err)
	}
	for r := range rows {
		args := make([]any, len(cols))
		for i := range cols {
			args[i] = cols[i].cell(r)
		}
		if err := table.Write(args...); err != nil {
			return fmt.Errorf("writing FITS: %w", err)
		}
	}
	// The library's own cards break the standard (TBCOLn, THEAP without a heap),
	// so it gets ours instead, after the last row.
	h := table.Header()
	h.Clear()
	if err := put(h, tableCards(extname, cols, forms, width, rows, cards)); err != nil {
		return err
	}
	return encode(w, table)
}

func tableCards(extname string, cols []Vector, forms []string, width, rows int, cards []Entry) []Entry {
	out := []Entry{{"XTENSION", "BINTABLE", "binary table"}, {"BITPIX", 8, ""}, {"NAXIS", 2, ""}, {"NAXIS1", width, "bytes in a row"},
		{"NAXIS2", rows, "rows"}, {"PCOUNT", 0, ""}, {"GCOUNT", 1, ""}, {"TFIELDS", len(cols), "columns"}}
	for i, c := range cols {
		add := func(root, value string) {
			if value != "" {
				out = append(out, Entry{fmt.Sprintf("%s%d", root, i+1), value, ""})
			}
		}
		add("TTYPE", c.Name)
		add("TFORM", forms[i])
		add("TUNIT", c.Unit)
		add("TUCD", c.UCD)
		add("TUTYP", c.Utype)
	}
	out = append(out, Entry{"EXTNAME", extname, ""})
	return append(out, cards...)
}

// form returns TFORM, the bytes of a cell and the number of rows.
func (v *Vector) form() (form string, size, rows int, err error) {
	if v.Type == 'A' {
		n := v.textWidth()
		return fmt.Sprintf("%dA", n), n, len(v.Text), nil
	}
	if v.Type == 0 || !strings.Contains("DEJI", string(v.Type)) || len(v.Rows) == 0 || len(v.Rows[0]) == 0 {
		return "", 0, 0, fmt.Errorf("writing FITS: column %s of type %q with %d rows", v.Name, v.Type, len(v.Rows))
	}
	n := len(v.Rows[0])
	for _, r := range v.Rows {
		if len(r) != n {
			return "", 0, 0, fmt.Errorf("writing FITS: column %s has cells of %d and %d values", v.Name, n, len(r))
		}
	}
	return fmt.Sprintf("%d%c", n, v.Type), n * int(typeSize[v.Type]), len(v.Rows), nil
}

// textWidth is at least 2, for the library makes no array of one byte.
func (v *Vector) textWidth() int {
	n := 2
	for _, s := range v.Text {
		n = max(n, len(s))
	}
	return n
}

// cell returns a pointer to what the library wants for one cell: an array, or a
// plain value where the cell holds one.
func (v *Vector) cell(row int) any {
	if v.Type == 'A' {
		n := v.textWidth()
		p := reflect.New(reflect.ArrayOf(n, reflect.TypeFor[byte]()))
		copy(p.Elem().Slice(0, n).Bytes(), fmt.Sprintf("%-*s", n, v.Text[row]))
		return p.Interface()
	}
	elem := map[byte]reflect.Type{'D': reflect.TypeFor[float64](), 'E': reflect.TypeFor[float32](),
		'J': reflect.TypeFor[int32](), 'I': reflect.TypeFor[int16]()}[v.Type]
	values := v.Rows[row]
	if len(values) == 1 {
		p := reflect.New(elem)
		p.Elem().Set(reflect.ValueOf(values[0]).Convert(elem))
		return p.Interface()
	}
	p := reflect.New(reflect.ArrayOf(len(values), elem))
	switch a := p.Elem().Slice(0, len(values)).Interface().(type) {
	case []float64:
		copy(a, values)
	case []float32:
		for i, x := range values {
			a[i] = float32(x)
		}
	case []int32:
		for i, x := range values {
			a[i] = int32(x)
		}
	case []int16:
		for i, x := range values {
			a[i] = int16(x)
		}
	}
	return p.Interface()
}

// primary returns the structural cards of a primary HDU.
func primary(bitpix int, axes []int) *fitsio.Header {
	cards := []fitsio.Card{{Name: "SIMPLE", Value: true, Comment: "FITS standard"}, {Name: "BITPIX", Value: bitpix}, {Name: "NAXIS", Value: len(axes)}}
	for i, n := range axes {
		cards = append(cards, fitsio.Card{Name: fmt.Sprintf("NAXIS%d", i+1), Value: n})
	}
	return fitsio.NewHeader(cards, fitsio.IMAGE_HDU, bitpix, axes)
}

// put appends cards after checking that each fits one line.
func put(h *fitsio.Header, cards []Entry) error {
	for _, e := range cards {
		c := fitsio.Card{Name: e.Key, Value: e.Value}
		if bad := strings.IndexFunc(e.Key+e.Comment, notASCII); bad >= 0 {
			return fmt.Errorf("writing FITS: card %s: only ASCII may stand in a header", e.Key)
		}
		room := 80 - 10 - 20
		if len(e.Key) > 8 { // HIERARCH key =
			room = 80 - len("HIERARCH = ") - len(e.Key) - 20
		}
		switch v := e.Value.(type) {
		case nil:
			if len(e.Comment) > 72 {
				return fmt.Errorf("writing FITS: card %s is longer than a line", e.Key)
			}
			c.Comment = e.Comment
			if err := h.Append(c); err != nil {
				return fmt.Errorf("writing FITS: %w", err)
			}
			continue
		case string:
			v = strings.ReplaceAll(v, "'", "''")
			if strings.IndexFunc(v, notASCII) >= 0 {
				return fmt.Errorf("writing FITS: card %s: only ASCII may stand in a header", e.Key)
			}
			if len(v) > room+17 {
				return fmt.Errorf("writing FITS: card %s: %d characters do not fit a line", e.Key, len(v))
			}
			c.Value = v
			room -= max(0, len(v)-18)
		case float64:
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return fmt.Errorf("writing FITS: card %s: %g cannot stand in a header", e.Key, v)
			}
			room -= 6 // up to 26 digits, sign and exponent
		case bool, int:
		default:
			return fmt.Errorf("writing FITS: card %s: a value of type %T", e.Key, v)
		}
		c.Comment = e.Comment[:max(0, min(len(e.Comment), room-3))]
		if err := h.Append(c); err != nil {
			return fmt.Errorf("writing FITS: %w", err)
		}
	}
	return nil
}

func notASCII(r rune) bool { return r < ' ' || r > '~' }

func encode(w io.Writer, hdu fitsio.HDU) error {
	if err := fitsio.NewEncoder(w).EncodeHDU(hdu); err != nil {
		return fmt.Errorf("writing FITS: %w", err)
	}
	return nil
}
