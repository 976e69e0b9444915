package fits

import (
	"bytes"
	"compress/gzip"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
)

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
