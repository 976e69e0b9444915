package fits

import (
	"bytes"
	"compress/gzip"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"strings"
)

// A tiled is a tile-compressed image: a table of which each row holds one tile.
// To the rest of the package the HDU is an image; only the tiles of the line that
// is asked for are unpacked.
//
// Source: FITS Standard 4.0, section 10.
type tiled struct {
	table     HDU // the table as it stands in the file
	tile      []int64
	count     []int64 // tiles along each axis
	kind      string  // ZCMPTYPE
	data      int     // columns, −1 absent
	gzipped   int
	plain     int
	scale     tileNumber
	zero      tileNumber
	blank     tileNumber
	blockSize int
	bytePix   int
	dither    int   // 0 none, 1 or 2
	seed      int64 // ZDITHER0
	size      int64 // pixels of a full tile

	row    int64 // of the cache, −1 none
	values []float64
}

// A tileNumber stands in a column, or in a keyword for all tiles.
type tileNumber struct {
	col   int
	value float64
	there bool
}

// tiles reads the keywords of a tile-compressed image and turns the HDU into an
// image of the size before compression.
func (h *HDU) tiles() error {
	t := &tiled{table: *h, row: -1, kind: strings.ToUpper(h.Str("ZCMPTYPE"))}
	switch t.kind {
	case "RICE_1", "GZIP_1", "GZIP_2", "NOCOMPRESS":
	case "RICE_ONE":
		t.kind = "RICE_1"
	default:
		return h.Fail(fmt.Sprintf("tiles are compressed with ZCMPTYPE = '%s', which is not read here (RICE_1, GZIP_1, GZIP_2)", t.kind), "unpack the file with funpack")
	}
	bitpix, err := h.need("ZBITPIX")
	if err != nil {
		return err
	}
	switch bitpix {
	case 8, 16, 32, 64, -32, -64:
	default:
		return h.Fail(fmt.Sprintf("ZBITPIX = %d is not a FITS type", bitpix), "the header is damaged")
	}
	if err := t.shape(h); err != nil {
		return err
	}
	if err := t.columns(h, bitpix); err != nil {
		return err
	}
	if err := t.parameters(h, bitpix); err != nil {
		return err
	}
	h.Kind, h.Bitpix, h.Axes, h.Rows, h.Cols = Image, int(bitpix), t.axes(h), 0, nil
	h.tiled = t
	h.Compression = t.kind
	return nil
}

// axes returns ZNAXISn, checked by shape.
func (t *tiled) axes(h *HDU) []int64 {
	out := make([]int64, len(t.tile))
	for i := range out {
		out[i], _ = h.Int(fmt.Sprintf("ZNAXIS%d", i+1), 0)
	}
	return out
}

// shape reads the sizes of image and tiles; there must be as many tiles as rows.
func (t *tiled) shape(h *HDU) error {
	naxis, err := h.need("ZNAXIS")
	if err != nil {
		return err
	}
	if naxis < 1 || naxis > 999 {
		return h.Fail(fmt.Sprintf("ZNAXIS = %d is not between 1 and 999", naxis), "the header is damaged")
	}
	rows, pixels := int64(1), int64(1)
	t.size = 1
	for i := int64(1); i <= naxis; i++ {
		n, err := h.need(fmt.Sprintf("ZNAXIS%d", i))
		if err != nil {
			return err
		}
		usual := int64(1)
		if i == 1 {
			usual = n
		}
		tile, err := h.Int(fmt.Sprintf("ZTILE%d", i), usual)
		if err != nil {
			return err
		}
		if n < 1 || tile < 1 || pixels > math.MaxInt64/n {
			return h.Fail(fmt.Sprintf("ZNAXIS%d = %d in tiles of %d", i, n, tile), "the header is damaged")
		}
		pixels *= n
		tile = min(tile, n)
		t.tile, t.count = append(t.tile, tile), append(t.count, (n+tile-1)/tile)
		rows *= t.count[i-1] // fits, for it is at most pixels
		t.size *= tile
	}
	if t.size > MaxValues {
		return h.Fail(fmt.Sprintf("a tile of %d pixels is too large (limit %d)", t.size, MaxValues), "unpack the file with funpack")
	}
	if rows != h.Rows {
		return h.Fail(fmt.Sprintf("the image has %d tiles, but the table %d rows", rows, h.Rows), "the file is damaged; fetch it again")
	}
	return nil
}

// columns finds the columns that hold tiles and their scales.
func (t *tiled) columns(h *HDU, bitpix int64) error {
	t.data, t.gzipped, t.plain = h.Col("COMPRESSED_DATA"), h.Col("GZIP_COMPRESSED_DATA"), h.Col("UNCOMPRESSED_DATA")
	if t.data < 0 && t.gzipped < 0 && t.plain < 0 {
		return h.Fail("no column COMPRESSED_DATA", "the file is damaged; fetch it again")
	}
	for _, c := range []int{t.data, t.gzipped} {
		if c >= 0 && (!h.Cols[c].Variable || h.Cols[c].Type != 'B') {
			return h.Fail(fmt.Sprintf("column %s does not hold arrays of bytes", h.Cols[c].Name), "the file is damaged; fetch it again")
		}
	}
	for _, x := range []struct {
		name string
		into *tileNumber
	}{{"ZSCALE", &t.scale}, {"ZZERO", &t.zero}, {"ZBLANK", &t.blank}} {
		x.into.col = h.Col(x.name)
		if x.into.col >= 0 {
			if c := &h.Cols[x.into.col]; c.Variable || c.Repeat != 1 {
				return h.Fail(fmt.Sprintf("column %s does not hold one number a row", c.Name), "the file is damaged; fetch it again")
			}
			x.into.there = true
		} else if h.Has(x.name) {
			v, err := h.Float(x.name, 0)
			if err != nil {
				return err
			}
			x.into.value, x.into.there = v, true
		}
	}
	if bitpix > 0 && !t.blank.there && h.Has("BLANK") {
		v, err := h.Float("BLANK", 0)
		if err != nil {
			return err
		}
		t.blank = tileNumber{-1, v, true}
	}
	return nil
}

// parameters reads the settings of the algorithm.
func (t *tiled) parameters(h *HDU, bitpix int64) error {
	t.blockSize, t.bytePix = 32, 4
	for i := 1; i < 100 && h.Has(fmt.Sprintf("ZNAME%d", i)); i++ {
		name, key := h.Str(fmt.Sprintf("ZNAME%d", i)), fmt.Sprintf("ZVAL%d", i)
		if name != "BLOCKSIZE" && name != "BYTEPIX" {
			continue
		}
		v, err := h.Int(key, 0)
		if err != nil {
			return err
		}
		if name == "BLOCKSIZE" {
			t.blockSize = int(min(max(v, 0), 1<<20))
		} else {
			t.bytePix = int(min(max(v, 0), 9))
		}
	}
	if t.kind == "RICE_1" && (t.blockSize < 1 || t.blockSize > 4096 || t.bytePix != 1 && t.bytePix != 2 && t.bytePix != 4) {
		return h.Fail(fmt.Sprintf("RICE_1 with BLOCKSIZE %d and BYTEPIX %d", t.blockSize, t.bytePix), "unpack the file with funpack")
	}
	switch q := strings.ToUpper(h.Str("ZQUANTIZ")); q {
	case "", "NO_DITHER", "NONE":
	case "SUBTRACTIVE_DITHER_1", "SUBTRACTIVE_DITHER_2":
		t.dither = int(q[len(q)-1] - '0')
		var err error
		if t.seed, err = h.need("ZDITHER0"); err != nil {
			return err
		}
		if t.seed < 1 || t.seed > ditherTable {
			return h.Fail(fmt.Sprintf("ZDITHER0 = %d is not between 1 and %d", t.seed, ditherTable), "the header is damaged")
		}
	default:
		return h.Fail(fmt.Sprintf("ZQUANTIZ = '%s' is not known", q), "unpack the file with funpack")
	}
	if t.dither > 0 && (bitpix > 0 || !t.scale.there) {
		return h.Fail("dithering without ZSCALE or of whole numbers", "the header is damaged")
	}
	return nil
}

// line returns the stored values of an image line, before BSCALE and BZERO.
func (t *tiled) line(h *HDU, i int64) ([]float64, error) {
	n := h.Axes[0]
	if n > MaxValues {
		return nil, h.Fail(fmt.Sprintf("%d values in one piece are no spectrum (limit %d)", n, MaxValues), "cut out what you need")
	}
	// Tile row, first of the tiles along axis 1, and the line inside a tile.
	row, inside := int64(0), int64(0)
	stride, tileStride := t.count[0], int64(1)
	for k := 1; k < len(h.Axes); k++ {
		at := i % h.Axes[k]
		i /= h.Axes[k]
		row += at / t.tile[k] * stride
		stride *= t.count[k]
		inside += at % t.tile[k] * tileStride
		tileStride *= t.height(h, k, at/t.tile[k])
	}
	out := []float64{}
	for c := int64(0); c < t.count[0]; c++ {
		width := t.height(h, 0, c)
		v, err := t.unpack(h, row+c, width*tileStride)
		if err != nil {
			return nil, err
		}
		out = append(out, v[inside*width:(inside+1)*width]...)
	}
	return out, nil
}

// height returns the pixels of tile c along axis k: the last may be short.
func (t *tiled) height(h *HDU, k int, c int64) int64 { return min(t.tile[k], h.Axes[k]-c*t.tile[k]) }

// unpack returns tile row (from 0) of n pixels. The last tile is kept: the next
// line is often in it.
func (t *tiled) unpack(h *HDU, row, n int64) ([]float64, error) {
	if t.row == row && int64(len(t.values)) == n {
		return t.values, nil
	}
	v, err := t.decode(h, row, n)
	if err != nil {
		return nil, err
	}
	t.row, t.values = row, v
	return v, nil
}

// decode reads one tile.
func (t *tiled) decode(h *HDU, row, n int64) ([]float64, error) {
	packed, err := t.cell(t.data, row)
	if err != nil {
		return nil, err
	}
	bad := func(err error) error {
		return h.Fail(fmt.Sprintf("tile %d of %d pixels (%s): %v", row+1, n, t.kind, err), "the file is damaged; fetch it again")
	}
	if len(packed) == 0 {
		v, err := t.lossless(h, row, n)
		if err != nil && !errors.Is(err, errTile) {
			return nil, err
		} else if err != nil {
			return nil, bad(err)
		}
		return v, nil
	}
	quantised := h.Bitpix < 0 && t.scale.there
	size := int64(max(h.Bitpix, -h.Bitpix) / 8)
	if quantised {
		size = 4
	}
	var whole []int64
	switch t.kind {
	case "RICE_1":
		if h.Bitpix < 0 && !quantised {
			return nil, bad(errTileFloats)
		}
		whole, err = rice(packed, int(n), t.blockSize, t.bytePix)
	case "NOCOMPRESS":
		if int64(len(packed)) != n*size {
			return nil, bad(fmt.Errorf("%w: %d bytes, %d expected", errTile, len(packed), n*size))
		}
		if !quantised && h.Bitpix < 0 {
			return floats(packed, h.Bitpix), nil
		}
		whole = integers(packed, int(size))
	default:
		var raw []byte
		if raw, err = inflate(packed, n*max(size, 4)); err != nil {
			return nil, bad(err)
		}
		if int64(len(raw)) != n*size {
			if size = 4; int64(len(raw)) != n*size || h.Bitpix < 0 { // small integers may be kept in 4 bytes
				return nil, bad(fmt.Errorf("%w: it unpacks to %d bytes", errTile, len(raw)))
			}
		}
		if t.kind == "GZIP_2" {
			raw = unshuffle(raw, int(size))
		}
		if !quantised && h.Bitpix < 0 {
			return floats(raw, h.Bitpix), nil
		}
		whole = integers(raw, int(size))
	}
	if err != nil {
		return nil, bad(err)
	}
	return t.physical(h, row, whole, quantised)
}

// lossless reads a tile that would not compress: its pixels as they were.
func (t *tiled) lossless(h *HDU, row, n int64) ([]float64, error) {
	packed, err := t.cell(t.gzipped, row)
	if err != nil {
		return nil, err
	}
	size := int64(max(h.Bitpix, -h.Bitpix) / 8)
	if len(packed) > 0 {
		raw, err := inflate(packed, n*size)
		if err != nil {
			return nil, err
		}
		if int64(len(raw)) != n*size {
			return nil, fmt.Errorf("%w: it unpacks to %d bytes, %d expected", errTile, len(raw), n*size)
		}
		if h.Bitpix < 0 {
			return floats(raw, h.Bitpix), nil
		}
		return t.physical(h, row, integers(raw, int(size)), false)
	}
	if t.plain < 0 {
		return nil, fmt.Errorf("%w: it is empty", errTile)
	}
	v, err := t.table.Cell(t.plain, row)
	if err != nil {
		return nil, err
	}
	if int64(len(v)) != n {
		return nil, fmt.Errorf("%w: %d values", errTile, len(v))
	}
	return v, nil
}

// physical scales the whole numbers of a tile, with NaN where ZBLANK stands.
func (t *tiled) physical(h *HDU, row int64, whole []int64, quantised bool) ([]float64, error) {
	blank, err := t.number(t.blank, row)
	if err != nil {
		return nil, err
	}
	out := make([]float64, len(whole))
	if !quantised {
		for i, x := range whole {
			if out[i] = float64(x); t.blank.there && float64(x) == blank {
				out[i] = math.NaN()
			}
		}
		return out, nil
	}
	scale, err := t.number(t.scale, row)
	if err != nil {
		return nil, err
	}
	zero, err := t.number(t.zero, row)
	if err != nil {
		return nil, err
	}
	d := newDither(row, t.seed)
	for i, x := range whole {
		shift := 0.0
		if t.dither > 0 {
			shift = 0.5 - d.next()
		}
		switch {
		case t.blank.there && float64(x) == blank, !t.blank.there && x <= reserved:
			out[i] = math.NaN()
		case t.dither == 2 && x == exactZero:
			out[i] = 0
		default:
			out[i] = (float64(x)+shift)*scale + zero
		}
		if h.Bitpix == -32 {
			out[i] = float64(float32(out[i]))
		}
	}
	return out, nil
}

// number returns a scale of a tile.
func (t *tiled) number(x tileNumber, row int64) (float64, error) {
	if x.col < 0 {
		return x.value, nil
	}
	v, err := t.table.Cell(x.col, row)
	if err != nil {
		return 0, err
	}
	return v[0], nil
}

// cell returns the bytes of an array cell, none where the column is absent.
func (t *tiled) cell(col int, row int64) ([]byte, error) {
	if col < 0 {
		return nil, nil
	}
	h := &t.table
	if err := h.inside(col, row); err != nil {
		return nil, err
	}
	at, n, err := h.locate(&h.Cols[col], row)
	if err != nil {
		return nil, err
	}
	b := make([]byte, n)
	if _, err := h.r.ReadAt(b, at); err != nil && !(errors.Is(err, io.EOF) && n == 0) {
		return nil, fmt.Errorf("reading %s, %s: %w", h.file, h.where, err)
	}
	return b, nil
}

var (
	errTile       = errors.New("its bytes are not a tile")
	errTileFloats = errors.New("reals without ZSCALE cannot be packed so")
)

// inflate unpacks gzip to at most limit bytes.
func inflate(b []byte, limit int64) ([]byte, error) {
	z, err := gzip.NewReader(bytes.NewReader(b))
	if err == nil {
		var out []byte
		if out, err = io.ReadAll(io.LimitReader(z, limit+1)); err == nil {
			return out, nil
		}
	}
	return nil, fmt.Errorf("%w (gzip: %v)", errTile, err)
}

// unshuffle puts bytes back that stand sorted by their significance.
func unshuffle(b []byte, size int) []byte {
	n := len(b) / size
	out := make([]byte, len(b))
	for i := range n {
		for k := range size {
			out[i*size+k] = b[k*n+i]
		}
	}
	return out
}

// integers reads big-endian whole numbers; single bytes have no sign.
func integers(b []byte, size int) []int64 {
	out := make([]int64, len(b)/size)
	for i := range out {
		switch p := b[i*size:]; size {
		case 1:
			out[i] = int64(p[0])
		case 2:
			out[i] = int64(int16(binary.BigEndian.Uint16(p)))
		case 4:
			out[i] = int64(int32(binary.BigEndian.Uint32(p)))
		default:
			out[i] = int64(binary.BigEndian.Uint64(p))
		}
	}
	return out
}

func floats(b []byte, bitpix int) []float64 {
	size := -bitpix / 8
	out := make([]float64, len(b)/size)
	for i := range out {
		if size == 4 {
			out[i] = float64(math.Float32frombits(binary.BigEndian.Uint32(b[4*i:])))
		} else {
			out[i] = math.Float64frombits(binary.BigEndian.Uint64(b[8*i:]))
		}
	}
	return out
}
