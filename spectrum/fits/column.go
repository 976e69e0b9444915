package fits

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// A Column of a table.
type Column struct {
	Name        string // TTYPE, trimmed
	Unit        string // TUNIT
	UCD, Utype  string // TUCD, TUTYP
	Comment     string // of the TTYPE card
	Type        byte   // L X B I J K A E D C M of the cells
	Repeat      int64  // values a cell; of a variable array the largest number promised
	Variable    bool   // cells are arrays of any length, kept in the heap
	Scale, Zero float64

	n             int // 1-based number in the header
	offset, width int64
	long          bool // descriptors of 64 bits
	null          *int64
	text          string // TFORM of an ASCII table
}

// bytes of one value by type; X counts bits and is treated apart.
var typeSize = map[byte]int64{'L': 1, 'B': 1, 'A': 1, 'I': 2, 'J': 4, 'E': 4, 'K': 8, 'D': 8, 'C': 8, 'M': 16}

// Col returns the number of a column by name, in any case, or −1.
func (h *HDU) Col(name string) int {
	for i := range h.Cols {
		if strings.EqualFold(h.Cols[i].Name, name) {
			return i
		}
	}
	return -1
}

// tableSize reads what both kinds of table share.
func (h *HDU) tableSize() (fields int64, err error) {
	if len(h.Axes) != 2 || h.Bitpix != 8 {
		return 0, h.Fail(fmt.Sprintf("a table must have NAXIS = 2 and BITPIX = 8, not %d and %d", len(h.Axes), h.Bitpix), "the header is damaged")
	}
	h.Rows = h.Axes[1]
	if fields, err = h.need("TFIELDS"); err != nil {
		return 0, err
	}
	if fields < 0 || fields > 999 {
		return 0, h.Fail(fmt.Sprintf("TFIELDS = %d is not between 0 and 999", fields), "the header is damaged")
	}
	return fields, nil
}

// column reads the keywords that both kinds of table share.
func (h *HDU) column(n int64) (Column, error) {
	key := func(root string) string { return root + strconv.FormatInt(n, 10) }
	name, _ := h.Lookup(key("TTYPE"))
	c := Column{Name: strings.TrimSpace(name.Value), Comment: name.Comment, Unit: h.Str(key("TUNIT")), UCD: h.Str(key("TUCD")),
		Utype: h.Str(key("TUTYP")), n: int(n), Scale: 1}
	var err error
	if c.Scale, err = h.Float(key("TSCAL"), 1); err != nil {
		return c, err
	}
	if c.Zero, err = h.Float(key("TZERO"), 0); err != nil {
		return c, err
	}
	if !h.Has(key("TFORM")) {
		return c, h.Fail("no "+key("TFORM")+" card", "the header is damaged")
	}
	return c, nil
}

// binaryColumns reads the columns of a BINTABLE and checks that their widths
// make up NAXIS1 and that the heap lies inside the data unit.
func (h *HDU) binaryColumns() error {
	fields, err := h.tableSize()
	if err != nil {
		return err
	}
	var sum int64
	var forms []string
	for n := int64(1); n <= fields; n++ {
		c, err := h.column(n)
		if err != nil {
			return err
		}
		form := h.Str(fmt.Sprintf("TFORM%d", n))
		if err := c.parseForm(form); err != nil {
			return h.Fail(fmt.Sprintf("TFORM%d = '%s' is not a column format (%v)", n, form, err), "the header is damaged")
		}
		if len(forms) < 8 {
			forms = append(forms, fmt.Sprintf("TFORM%d=%s", n, form))
		}
		if null := fmt.Sprintf("TNULL%d", n); h.Has(null) && strings.IndexByte("BIJK", c.Type) >= 0 {
			v, err := h.Int(null, 0)
			if err != nil {
				return err
			}
			c.null = &v
		}
		c.offset = sum
		if sum += c.width; sum < 0 || sum > math.MaxInt64/4 {
			return h.Fail("the column widths overflow", "the header is damaged")
		}
		if c.width > 0 { // columns of width zero hold nothing
			h.Cols = append(h.Cols, c)
		}
	}
	if sum != h.Axes[0] {
		return h.Fail(fmt.Sprintf("columns need %d bytes per row (%s) but NAXIS1=%d", sum, strings.Join(forms, ", "), h.Axes[0]),
			"the header is damaged; fetch the file again")
	}
	main := h.Axes[0] * h.Axes[1] // checked by measure
	if h.heap, err = h.Int("THEAP", main); err != nil {
		return err
	}
	if h.heap < main || h.heap > h.size {
		return h.Fail(fmt.Sprintf("THEAP = %d lies outside the data (%d to %d)", h.heap, main, h.size), "the header is damaged")
	}
	return nil
}

// parseForm reads a TFORM of a binary table: rT, or rPt(max) for arrays of
// variable length.
func (c *Column) parseForm(form string) error {
	i := 0
	for i < len(form) && form[i] >= '0' && form[i] <= '9' {
		i++
	}
	c.Repeat = 1
	if i > 0 {
		r, err := strconv.ParseInt(form[:i], 10, 64)
		if err != nil || r > 1<<40 {
			return fmt.Errorf("repeat count %s", form[:i])
		}
		c.Repeat = r
	}
	if i == len(form) {
		return fmt.Errorf("no type letter")
	}
	c.Type = form[i]
	switch c.Type {
	case 'P', 'Q':
		if c.Repeat > 1 || i+1 >= len(form) {
			return fmt.Errorf("array descriptor")
		}
		c.Variable, c.long = true, c.Type == 'Q'
		c.width = 8 * c.Repeat
		if c.long {
			c.width *= 2
		}
		c.Type = form[i+1]
		c.Repeat = 0
		if max, ok := strings.CutPrefix(form[i+2:], "("); ok {
			c.Repeat, _ = strconv.ParseInt(strings.TrimSuffix(strings.TrimSpace(max), ")"), 10, 64)
		}
		if typeSize[c.Type] == 0 && c.Type != 'X' {
			return fmt.Errorf("array type %q", form[i+1:])
		}
	case 'X':
		c.width = (c.Repeat + 7) / 8
	default:
		size, ok := typeSize[c.Type]
		if !ok {
			return fmt.Errorf("type letter %q", form[i:])
		}
		c.width = c.Repeat * size
	}
	return nil
}

// asciiColumns reads the columns of a TABLE.
func (h *HDU) asciiColumns() error {
	fields, err := h.tableSize()
	if err != nil {
		return err
	}
	for n := int64(1); n <= fields; n++ {
		c, err := h.column(n)
		if err != nil {
			return err
		}
		start, err := h.need(fmt.Sprintf("TBCOL%d", n))
		if err != nil {
			return err
		}
		c.text = strings.ToUpper(h.Str(fmt.Sprintf("TFORM%d", n)))
		width := int64(0)
		if len(c.text) > 1 {
			digits, _, _ := strings.Cut(c.text[1:], ".")
			width, _ = strconv.ParseInt(digits, 10, 64)
		}
		if width < 1 || strings.IndexByte("AIFED", c.text[0]) < 0 || start < 1 || start-1 > h.Axes[0]-width {
			return h.Fail(fmt.Sprintf("TBCOL%d = %d with TFORM%d = '%s' does not lie in a row of %d bytes", n, start, n, c.text, h.Axes[0]), "the header is damaged")
		}
		c.Type, c.Repeat, c.offset, c.width = 'D', 1, start-1, width
		if c.text[0] == 'A' {
			c.Type, c.Repeat = 'A', width
		}
		h.Cols = append(h.Cols, c)
	}
	return nil
}
