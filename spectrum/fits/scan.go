package fits

import (
	"fmt"
	"io"
	"math/bits"
	"strconv"
	"strings"

	"lacuna/internal/oops"
)

const (
	block    = 2880
	card     = 80
	maxCards = 100000
	maxHDUs  = 10000
)

// A Kind is what an HDU holds.
type Kind int

// The kinds.
const (
	Empty Kind = iota // no data
	Image
	Binary // BINTABLE
	Ascii  // TABLE
	Other  // an extension that is not known, or random groups
)

// A File is a FITS file that has been scanned: nothing but headers was read.
type File struct {
	Name  string
	HDUs  []*HDU
	Notes []string

	content *Content
}

// An HDU is one header and data unit.
type HDU struct {
	Header
	Index  int
	Kind   Kind
	Bitpix int
	Axes   []int64  // NAXISn
	Rows   int64    // of a table
	Cols   []Column // of a table, in the file's order
	Err    error    // why it cannot be read, though its size is known

	// Compression is how the tiles of a compressed image are packed (RICE_1 …), ""
	// for any other HDU. Such an HDU is an image like any other.
	Compression string

	tiled *tiled

	r          io.ReaderAt
	start      int64 // of the header
	data, size int64 // of the data unit, without padding
	heap       int64 // start of the heap, from the start of the data
}

// Open scans a FITS file; gzip is unpacked. Close releases it.
func Open(path string) (*File, error) {
	c, err := Load(path)
	if err != nil {
		return nil, err
	}
	f, err := New(c)
	if err != nil {
		c.Close()
		return nil, err
	}
	return f, nil
}

// New scans FITS content. It reads headers only; every size is checked against
// the bytes that are there.
func New(c *Content) (*File, error) {
	f := &File{Name: c.Name, content: c}
	var start [8]byte
	c.ReadAt(start[:], 0)
	if string(start[:]) != "SIMPLE  " {
		return nil, oops.Input(c.Name, "", "not a FITS file: it does not begin with SIMPLE", "")
	}
	for off := int64(0); off < c.Size; {
		if len(f.HDUs) > 0 && !isExtension(c, off) {
			f.Notes = append(f.Notes, fmt.Sprintf("%d bytes after HDU %d are not a header and were ignored", c.Size-off, len(f.HDUs)-1))
			break
		}
		if len(f.HDUs) == maxHDUs {
			return nil, oops.Inputf(c.Name, "", "take the file apart", "more than %d HDUs", maxHDUs)
		}
		h := &HDU{Index: len(f.HDUs), r: c, start: off}
		h.file, h.where = c.Name, fmt.Sprintf("HDU %d", h.Index)
		next, err := h.scan(c, off)
		if err != nil {
			return nil, err
		}
		f.HDUs = append(f.HDUs, h)
		off = next
	}
	return f, nil
}

// Close releases the file.
func (f *File) Close() error { return f.content.Close() }

func isExtension(c *Content, off int64) bool {
	var b [8]byte
	n, _ := c.ReadAt(b[:], off)
	return n == len(b) && string(b[:]) == "XTENSION"
}

// Name returns EXTNAME.
func (h *HDU) Name() string { return h.Str("EXTNAME") }

// Where returns "HDU 1 (SPECTRUM)".
func (h *HDU) Where() string { return h.where }

// Describe returns index, kind and size in one line, for lists in errors.
func (h *HDU) Describe() string {
	switch {
	case h.Err != nil:
		return h.where + ": damaged or unknown"
	case h.Kind == Image:
		return fmt.Sprintf("%s: image %v", h.where, h.Axes)
	case h.Kind == Binary || h.Kind == Ascii:
		var names []string
		for i, c := range h.Cols {
			if i == 12 {
				names = append(names, "…")
				break
			}
			names = append(names, c.Name)
		}
		return fmt.Sprintf("%s: table of %d rows, columns %s", h.where, h.Rows, strings.Join(names, ", "))
	}
	return h.where + ": no data"
}

// scan reads a header at off and returns where the next one may begin.
func (h *HDU) scan(c *Content, off int64) (next int64, err error) {
	end, err := h.readCards(c, off)
	if err != nil {
		return 0, err
	}
	if name := h.Name(); name != "" {
		h.where += " (" + name + ")"
	}
	h.data = end
	if err := h.layout(c.Size - end); err != nil {
		return 0, err
	}
	pad := (block - h.size%block) % block
	return h.data + min(h.size+pad, c.Size-h.data), nil
}

// readCards reads cards up to END and returns where the data begin.
func (h *HDU) readCards(c *Content, off int64) (int64, error) {
	h.first = map[string]int{}
	buf := make([]byte, block)
	for {
		n, _ := c.ReadAt(buf, off)
		for i := 0; i+card <= n; i += card {
			raw := buf[i : i+card]
			if at := notText(raw); at >= 0 {
				return 0, h.Fail(fmt.Sprintf("no END card within the file: card %d holds the byte 0x%02x, which is not text; the header is damaged",
					len(h.Cards)+1, raw[at]), "fetch the file again")
			}
			if strings.TrimRight(string(raw), " ") == "END" {
				return min(off+block, c.Size), nil
			}
			if len(h.Cards) == maxCards {
				return 0, h.Fail(fmt.Sprintf("no END card among the first %d cards", maxCards), "the header is damaged; fetch the file again")
			}
			h.add(latin1(raw))
		}
		if n < block {
			return 0, h.Fail("no END card within the file; the header is damaged", "fetch the file again")
		}
		off += block
	}
}

// notText returns the index of the first control byte, or −1. Letters of
// Latin-1, which the standard forbids, occur in comments and are let through.
func notText(b []byte) int {
	for i, x := range b {
		if x < 0x20 && x != '\t' || x >= 0x7f && x < 0xa0 {
			return i
		}
	}
	return -1
}

// latin1 keeps one byte a column: letters beyond ASCII become '?'.
func latin1(b []byte) string {
	out := make([]byte, len(b))
	for i, x := range b {
		switch {
		case x == '\t':
			x = ' '
		case x >= 0x7f:
			x = '?'
		}
		out[i] = x
	}
	return string(out)
}

// layout finds kind and size of the data unit; avail bytes follow the header.
func (h *HDU) layout(avail int64) error {
	bitpix, err := h.need("BITPIX")
	if err != nil {
		return err
	}
	switch bitpix {
	case 8, 16, 32, 64, -32, -64:
	default:
		return h.Fail(fmt.Sprintf("BITPIX = %d is not a FITS type (8, 16, 32, 64, -32, -64)", bitpix), "the header is damaged")
	}
	h.Bitpix = int(bitpix)
	naxis, err := h.need("NAXIS")
	if err != nil {
		return err
	}
	if naxis < 0 || naxis > 999 {
		return h.Fail(fmt.Sprintf("NAXIS = %d is not between 0 and 999", naxis), "the header is damaged")
	}
	for i := range naxis {
		n, err := h.need("NAXIS" + strconv.FormatInt(i+1, 10))
		if err != nil {
			return err
		}
		if n < 0 {
			return h.Fail(fmt.Sprintf("NAXIS%d = %d is negative", i+1, n), "the header is damaged")
		}
		h.Axes = append(h.Axes, n)
	}
	if err := h.measure(avail); err != nil {
		return err
	}
	h.classify()
	return nil
}

// need returns an integer that must be there.
func (h *HDU) need(key string) (int64, error) {
	if !h.Has(key) {
		return 0, h.Fail("no "+key+" card", "the header is damaged; fetch the file again")
	}
	return h.Int(key, 0)
}

// measure computes |BITPIX|/8 · GCOUNT · (PCOUNT + NAXIS1 · … · NAXISn) without
// overflow and compares it with the bytes that follow the header.
func (h *HDU) measure(avail int64) error {
	pcount, err := h.Int("PCOUNT", 0)
	if err != nil {
		return err
	}
	gcount, err := h.Int("GCOUNT", 1)
	if err != nil {
		return err
	}
	if pcount < 0 || gcount < 0 {
		return h.Fail(fmt.Sprintf("PCOUNT = %d, GCOUNT = %d: neither may be negative", pcount, gcount), "the header is damaged")
	}
	axes := h.Axes
	if h.Index == 0 {
		if h.Bool("GROUPS") && len(axes) > 0 && axes[0] == 0 {
			axes = axes[1:] // random groups
		} else {
			pcount, gcount = 0, 1
		}
	}
	total, over := uint64(0), false
	if len(h.Axes) > 0 {
		total = 1
		for _, n := range axes {
			total, over = times(total, uint64(n), over)
		}
		var carry uint64
		total, carry = bits.Add64(total, uint64(pcount), 0)
		over = over || carry != 0
		total, over = times(total, uint64(gcount), over)
		total, over = times(total, uint64(max(h.Bitpix, -h.Bitpix)/8), over)
	}
	if over || total > uint64(avail) {
		promise := strconv.FormatUint(total, 10)
		if over {
			promise = "more than 10¹⁹"
		}
		var shape []string
		for i, n := range h.Axes {
			if i == 4 {
				shape = append(shape, "…")
				break
			}
			shape = append(shape, fmt.Sprintf("NAXIS%d=%d", i+1, n))
		}
		return h.Fail(fmt.Sprintf("file is truncated or its header is wrong: %s, BITPIX=%d needs %s data bytes, but %d follow the header",
			strings.Join(shape, ", "), h.Bitpix, promise, avail), "fetch the file again")
	}
	h.size = int64(total)
	return nil
}

func times(a, b uint64, over bool) (uint64, bool) {
	hi, lo := bits.Mul64(a, b)
	return lo, over || hi != 0
}

// classify decides the kind and reads the columns of tables. What is wrong here
// spoils this HDU only.
func (h *HDU) classify() {
	xt := h.Str("XTENSION")
	switch {
	case h.Index == 0 && len(h.Axes) > 0 && h.Axes[0] == 0 && h.Bool("GROUPS"):
		h.Kind, h.Err = Other, h.Fail("random groups are not a spectrum", "export it as an image or table")
	case h.Index == 0 || xt == "IMAGE" || xt == "IUEIMAGE":
		h.Kind = Image
		if h.size == 0 {
			h.Kind = Empty
		}
	case xt == "BINTABLE" || xt == "A3DTABLE":
		h.Kind = Binary
		if h.Err = h.binaryColumns(); h.Err == nil && h.Bool("ZIMAGE") {
			h.Err = h.tiles()
		}
	case xt == "TABLE":
		h.Kind = Ascii
		h.Err = h.asciiColumns()
	default:
		fix := ""
		if near := oops.Nearest(xt, []string{"IMAGE", "BINTABLE", "TABLE"}, 1); len(near) > 0 {
			fix = "did you mean " + near[0] + "?"
		}
		h.Kind, h.Err = Other, h.Fail(fmt.Sprintf("XTENSION '%s' is not known (IMAGE, BINTABLE, TABLE)", xt), fix)
	}
}
