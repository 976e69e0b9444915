package fits

import (
	"fmt"
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
