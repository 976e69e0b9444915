package fits_test

import (
	"bytes"
	"compress/gzip"
	"encoding/binary"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/internal/oops"
	"lacuna/spectrum/fits"
)

// riceTile packs whole numbers by the words of FITS Standard 4.0, section 10.4.1,
// one bit at a time: the reader has to undo it.
func riceTile(v []int64, block, size int) []byte {
	var bits []byte
	put := func(x uint64, n int) {
		for k := n - 1; k >= 0; k-- {
			bits = append(bits, byte(x>>k&1))
		}
	}
	width := 8 * size
	head, most := map[int]int{1: 3, 2: 4, 4: 5}[size], map[int]int{1: 6, 2: 14, 4: 25}[size]
	mask := uint64(1)<<width - 1
	put(uint64(v[0])&mask, width)
	last := v[0]
	for a := 0; a < len(v); a += block {
		b := min(a+block, len(v))
		var folded []uint64
		sum := uint64(0)
		for _, x := range v[a:b] {
			d := int64(uint64(x-last) << (64 - width)) // wraps in the size of the values
			d >>= 64 - width
			last = x
			u := uint64(d<<1) & mask
			if d < 0 {
				u = uint64(^(d << 1)) & mask
			}
			folded = append(folded, u)
			sum += u
		}
		fs := 0
		for mean := sum / uint64(b-a); mean > 1 && fs < most; mean >>= 1 {
			fs++
		}
		switch {
		case sum == 0:
			put(0, head)
		case fs >= most:
			put(uint64(most)+1, head)
			for _, u := range folded {
				put(u, width)
			}
		default:
			put(uint64(fs)+1, head)
			for _, u := range folded {
				for range u >> fs {
					bits = append(bits, 0)
				}
				bits = append(bits, 1)
				put(u&(1<<fs-1), fs)
			}
		}
	}
	out := make([]byte, (len(bits)+7)/8)
	for i, b := range bits {
		out[i/8] |= b << (7 - i%8)
	}
	return out
}

// tileFile is a compressed image of these tiles, one table row each.
func tileFile(tiles [][]byte, cards ...string) []byte {
	var rows, heap []byte
	for _, t := range tiles {
		rows = binary.BigEndian.AppendUint32(rows, uint32(len(t)))
		rows = binary.BigEndian.AppendUint32(rows, uint32(len(heap)))
		heap = append(heap, t...)
	}
	return table(8, len(tiles), len(heap), append(rows, heap...), append([]string{"TFIELDS = 1", "TTYPE1  = 'COMPRESSED_DATA'", "TFORM1  = '1PB'", "ZIMAGE  = T"}, cards...)...)
}

func gz(b []byte) []byte {
	var out bytes.Buffer
	z := gzip.NewWriter(&out)
	z.Write(b)
	z.Close()
	return out.Bytes()
}

// Whole numbers of every size, with calm, wild and constant stretches and blocks
// that the tile does not fill; 5 × 3 pixels in tiles of 2 × 2, the last ones short.
func TestRiceTiles(t *testing.T) {
	for _, size := range []int{1, 2, 4} {
		lo, hi := int64(-1)<<(8*size-1), int64(1)<<(8*size-1)-1
		if size == 1 {
			lo, hi = 0, 255
		}
		var want []int64
		for i := range int64(200) {
			switch {
			case i < 60:
				want = append(want, 100+i%7)
			case i < 90:
				want = append(want, 5)
			case i%2 == 0:
				want = append(want, lo)
			default:
				want = append(want, hi)
			}
		}
		for _, block := range []int{16, 32} {
			b := tileFile([][]byte{riceTile(want, block, size)}, fmt.Sprintf("ZBITPIX = %d", 8*size), "ZCMPTYPE= 'RICE_1'", "ZNAXIS  = 1", "ZNAXIS1 = 200",
				"ZNAME1  = 'BLOCKSIZE'", fmt.Sprintf("ZVAL1   = %d", block), "ZNAME2  = 'BYTEPIX'", fmt.Sprintf("ZVAL2   = %d", size), "ZBLANK  = 5", "BZERO   = 1000", "BSCALE  = 2")
			h := open(t, b).HDUs[1]
			if h.Err != nil {
				t.Fatal(h.Err)
			}
			got, err := h.Line(0)
			if err != nil || h.Kind != fits.Image || h.Compression != "RICE_1" {
				t.Fatalf("%d bytes, blocks of %d: %v", size, block, err)
			}
			for i, x := range got {
				w := 1000 + 2*float64(want[i])
				if want[i] == 5 {
					w = math.NaN()
				}
				if !same([]float64{x}, []float64{w}) {
					t.Fatalf("%d bytes, blocks of %d: pixel %d is %g, want %g", size, block, i, x, w)
				}
			}
		}
	}
	at := func(x, y int64) int64 { return 10*y + x }
	var tiles [][]byte
	for ty := int64(0); ty < 3; ty += 2 {
		for tx := int64(0); tx < 5; tx += 2 {
			var v []int64
			for y := ty; y < min(ty+2, 3); y++ {
				for x := tx; x < min(tx+2, 5); x++ {
					v = append(v, at(x, y))
				}
			}
			tiles = append(tiles, riceTile(v, 32, 4))
		}
	}
	h := open(t, tileFile(tiles, "ZBITPIX = 32", "ZCMPTYPE= 'RICE_1'", "ZNAXIS  = 2", "ZNAXIS1 = 5", "ZNAXIS2 = 3", "ZTILE1  = 2", "ZTILE2  = 2")).HDUs[1]
	if h.Err != nil {
		t.Fatal(h.Err)
	}
	for y := range int64(3) {
		got, err := h.Line(y)
		if err != nil || len(got) != 5 {
			t.Fatal(got, err)
		}
		for x := range int64(5) {
			if got[x] != float64(at(x, y)) {
				t.Errorf("pixel %d, %d: %g, want %d", x, y, got[x], at(x, y))
			}
		}
	}
}

// Bytes laid out by hand: big-endian, and shuffled with the most significant first.
func TestGzipTiles(t *testing.T) {
	f32 := func(x float32) []byte { return binary.BigEndian.AppendUint32(nil, math.Float32bits(x)) }
	a, b := f32(1.5), f32(float32(math.NaN()))
	for kind, raw := range map[string][]byte{
		"GZIP_1": append(bytes.Clone(a), b...),
		"GZIP_2": {a[0], b[0], a[1], b[1], a[2], b[2], a[3], b[3]},
	} {
		h := open(t, tileFile([][]byte{gz(raw)}, "ZBITPIX = -32", "ZCMPTYPE= '"+kind+"'", "ZNAXIS  = 1", "ZNAXIS1 = 2")).HDUs[1]
		if got, err := h.Line(0); err != nil || !same(got, []float64{1.5, math.NaN()}) {
			t.Errorf("%s: %v, %v", kind, got, err)
		}
	}
	// Two-byte numbers, and the same kept in four bytes, as some writers do.
	for _, raw := range [][]byte{{0xff, 0xfe, 0, 7}, {0xff, 0xff, 0xff, 0xfe, 0, 0, 0, 7}} {
		h := open(t, tileFile([][]byte{gz(raw)}, "ZBITPIX = 16", "ZCMPTYPE= 'GZIP_1'", "ZNAXIS  = 1", "ZNAXIS1 = 2")).HDUs[1]
		if got, err := h.Line(0); err != nil || !same(got, []float64{-2, 7}) {
			t.Errorf("%v: %v, %v", raw, got, err)
		}
	}
}

// FITS Standard 4.0, 10.2: stored I becomes (I − r + 0.5) ZSCALE + ZZERO with the
// random numbers of appendix I, NaN where ZBLANK stands, and 0 where method 2
// keeps a zero. Tile 1 with ZDITHER0 = 1 starts at index int(500 r₁) = 0 of the
// table, for r₁ = 16807/2147483647; r₂ = 282475249/2147483647.
func TestDither(t *testing.T) {
	const blank = -2147483647
	stored := []int64{10, 20, blank, -2147483646, -2147483648}
	r := []float64{16807 / 2147483647.0, 282475249 / 2147483647.0}
	for method, want := range map[int][]float64{
		1: {(10-r[0]+0.5)*0.25 + 3, (20-r[1]+0.5)*0.25 + 3, math.NaN()},
		2: {(10-r[0]+0.5)*0.25 + 3, (20-r[1]+0.5)*0.25 + 3, math.NaN(), 0},
	} {
		h := open(t, tileFile([][]byte{riceTile(stored, 32, 4)}, "ZBITPIX = -64", "ZCMPTYPE= 'RICE_1'", "ZNAXIS  = 1", "ZNAXIS1 = 5", fmt.Sprintf("ZBLANK  = %d", blank),
			"ZSCALE  = 0.25", "ZZERO   = 3.0", fmt.Sprintf("ZQUANTIZ= 'SUBTRACTIVE_DITHER_%d'", method), "ZDITHER0= 1")).HDUs[1]
		got, err := h.Line(0)
		if err != nil {
			t.Fatal(h.Err, err)
		}
		for i, w := range want {
			if math.IsNaN(w) != math.IsNaN(got[i]) || !math.IsNaN(w) && !(math.Abs(got[i]-w) < 1e-7*0.25) { // the table is kept in single precision
				t.Errorf("method %d: pixel %d is %.12g, want %.12g", method, i, got[i], w)
			}
		}
	}
	// Without ZBLANK the two values that no writer uses for a number are NaN.
	h := open(t, tileFile([][]byte{riceTile(stored, 32, 4)}, "ZBITPIX = -64", "ZCMPTYPE= 'RICE_1'", "ZNAXIS  = 1", "ZNAXIS1 = 5", "ZSCALE  = 0.25")).HDUs[1]
	if got, err := h.Line(0); err != nil || !same(got, []float64{2.5, 5, math.NaN(), -2147483646 * 0.25, math.NaN()}) {
		t.Errorf("%v, %v", got, err)
	}
}

func TestTilesRefused(t *testing.T) {
	one := [][]byte{riceTile([]int64{1, 2, 3}, 32, 4)}
	axis := []string{"ZBITPIX = 32", "ZNAXIS  = 1", "ZNAXIS1 = 3"}
	with := func(cards ...string) []string { return append(append([]string{}, axis...), cards...) }
	rice := "ZCMPTYPE= 'RICE_1'"
	for name, tc := range map[string]struct {
		b    []byte
		want string
	}{
		"HCOMPRESS":       {tileFile(one, with("ZCMPTYPE= 'HCOMPRESS_1'")...), "HCOMPRESS_1"},
		"PLIO":            {tileFile(one, with("ZCMPTYPE= 'PLIO_1'")...), "PLIO_1"},
		"no algorithm":    {tileFile(one, with()...), "ZCMPTYPE"},
		"tiles":           {tileFile(one, with(rice, "ZTILE1  = 2")...), "2 tiles"},
		"huge tile":       {tileFile(one, rice, "ZBITPIX = 32", "ZNAXIS  = 1", "ZNAXIS1 = 999999999999"), "999999999999"},
		"overflow":        {tileFile(one, rice, "ZBITPIX = 32", "ZNAXIS  = 2", "ZNAXIS1 = 4294967296", "ZNAXIS2 = 4294967296"), "ZNAXIS2"},
		"no axes":         {tileFile(one, rice, "ZBITPIX = 32"), "ZNAXIS"},
		"BITPIX":          {tileFile(one, rice, "ZBITPIX = 33", "ZNAXIS  = 1", "ZNAXIS1 = 3"), "ZBITPIX"},
		"block":           {tileFile(one, with(rice, "ZNAME1  = 'BLOCKSIZE'", "ZVAL1   = 0")...), "BLOCKSIZE"},
		"quantised how":   {tileFile(one, with(rice, "ZQUANTIZ= 'MAGIC'")...), "MAGIC"},
		"dither of whole": {tileFile(one, with(rice, "ZQUANTIZ= 'SUBTRACTIVE_DITHER_1'", "ZDITHER0= 1")...), "dither"},
		"dither seed":     {tileFile(one, with(rice, "ZQUANTIZ= 'SUBTRACTIVE_DITHER_1'", "ZDITHER0= 0")...), "ZDITHER0"},
	} {
		if err := open(t, tc.b).HDUs[1].Err; !oops.IsInput(err) || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("%s: %v; want %q", name, err, tc.want)
		}
	}
	// A promise of many pixels in few bytes must not allocate; damaged bytes are said.
	for name, b := range map[string][]byte{
		"cut":       tileFile([][]byte{one[0][:5]}, with(rice)...),
		"promise":   tileFile(one, rice, "ZBITPIX = 32", "ZNAXIS  = 1", "ZNAXIS1 = 60000000"),
		"not gzip":  tileFile([][]byte{{1, 2, 3}}, with("ZCMPTYPE= 'GZIP_1'")...),
		"too short": tileFile([][]byte{gz([]byte{1, 2, 3, 4})}, with("ZCMPTYPE= 'GZIP_1'")...),
		"too long":  tileFile([][]byte{gz(make([]byte, 1<<16))}, with("ZCMPTYPE= 'GZIP_2'")...),
		"empty":     tileFile([][]byte{{}}, with(rice)...),
		"reals":     tileFile(one, rice, "ZBITPIX = -32", "ZNAXIS  = 1", "ZNAXIS1 = 3"),
	} {
		h := open(t, b).HDUs[1]
		if _, err := h.Line(0); h.Err != nil || !oops.IsInput(err) || !strings.Contains(err.Error(), "tile 1") {
			t.Errorf("%s: %v, %v", name, h.Err, err)
		}
	}
}

// Every combination that astropy writes must be read as astropy reads it: whole
// numbers exactly, reals to the rounding of single precision. NaN in quantised
// tiles is left out: version 5 writes no ZBLANK and loses it.
func TestAstropyTiles(t *testing.T) {
	python := "/usr/bin/python3"
	if err := exec.Command(python, "-c", "import astropy").Run(); err != nil {
		check.Missing(t, "astropy is not installed")
	}
	dir := t.TempDir()
	script := `import sys, warnings
import numpy as np
from astropy.io import fits
warnings.simplefilter('ignore')
rng = np.random.default_rng(7)
n, m = 12345, 3
x = np.arange(n*m).reshape(m, n)
smooth = 1000 + 300*np.sin(x/90.) + rng.normal(0, 5, (m, n))
smooth[1, 100:140] = 0
holes = smooth.copy(); holes[0, 5:9] = np.nan; holes[2, -1] = np.nan
case = 0
def put(data, name, **kw):
    global case
    path = '%s/%02d_%s.fits' % (sys.argv[1], case, name)
    fits.CompImageHDU(data, name='FLUX', **kw).writeto(path)
    back = fits.open(path)[1].data.astype('>f8')
    back.tofile(path + '.raw')
    case += 1
for kind in ('RICE_1', 'GZIP_1', 'GZIP_2'):
    for dtype in ('u1', 'i2', 'u2', 'i4'):
        d = np.clip(smooth/8, 0, 255).astype(dtype) if dtype == 'u1' else smooth.astype(dtype)
        put(d, kind+dtype, compression_type=kind)
        put(d, kind+dtype+'tile', compression_type=kind, tile_size=(5000, 2))
    for dtype in ('f4', 'f8'):
        for method in (-1, 1, 2):
            put(smooth.astype(dtype), '%s%sq%d' % (kind, dtype, method), compression_type=kind, quantize_level=16, quantize_method=method, dither_seed=9999)
        if kind != 'RICE_1':
            put(holes.astype(dtype), kind+dtype+'lossless', compression_type=kind, quantize_level=0)
put(rng.normal(0, 1e30, (m, n)).astype('f4') * 10.**rng.integers(-30, 7, (m, n)).astype('f4'), 'wild', compression_type='RICE_1', quantize_level=1e9)
`
	if out, err := exec.Command(python, "-c", script, dir).CombinedOutput(); err != nil {
		t.Fatalf("%v\n%s", err, out)
	}
	names, _ := filepath.Glob(filepath.Join(dir, "*.fits"))
	if len(names) < 45 {
		t.Fatalf("only %d files", len(names))
	}
	for _, p := range names {
		f, err := fits.Open(p)
		if err != nil {
			t.Fatal(err)
		}
		raw, err := os.ReadFile(p + ".raw")
		if err != nil {
			t.Fatal(err)
		}
		h := f.HDUs[1]
		bad := 0
		for y := range int64(3) {
			got, err := h.Line(y)
			if err != nil || len(got) != 12345 {
				t.Fatalf("%s: %d pixels, %v, %v", filepath.Base(p), len(got), h.Err, err)
			}
			for x, v := range got {
				want := math.Float64frombits(binary.BigEndian.Uint64(raw[8*(int(y)*12345+x):]))
				if math.IsNaN(want) != math.IsNaN(v) || !math.IsNaN(v) && !(math.Abs(v-want) <= 1.2e-7*math.Abs(want)) {
					if bad++; bad < 3 {
						t.Errorf("%s: pixel %d of line %d is %g, want %g", filepath.Base(p), x, y, v, want)
					}
				}
			}
		}
		if bad > 0 {
			t.Errorf("%s: %d pixels differ", filepath.Base(p), bad)
		}
		f.Close()
	}
}

// FuzzTiles: damaged tiles and parameters give an error or values, no panic and
// no large allocation.
func FuzzTiles(f *testing.F) {
	v := []int64{1, 2, 3, 70000, -5, 0, 0, 0}
	f.Add(riceTile(v, 4, 4), uint8(0), uint8(4), uint16(4), int64(8), int64(8), int64(32))
	f.Add(riceTile([]int64{1, 2, 3, 4}, 32, 2), uint8(0), uint8(2), uint16(32), int64(4), int64(2), int64(16))
	f.Add(gz(make([]byte, 32)), uint8(1), uint8(4), uint16(32), int64(8), int64(8), int64(-32))
	f.Add(gz(make([]byte, 64)), uint8(2), uint8(4), uint16(32), int64(8), int64(3), int64(-64))
	f.Add(make([]byte, 16), uint8(3), uint8(4), uint16(32), int64(4), int64(4), int64(32))
	f.Fuzz(func(t *testing.T, tile []byte, kind, bytePix uint8, block uint16, n, size, bitpix int64) {
		cards := []string{fmt.Sprintf("ZBITPIX = %d", bitpix), "ZCMPTYPE= '" + []string{"RICE_1", "GZIP_1", "GZIP_2", "NOCOMPRESS"}[kind%4] + "'", "ZNAXIS  = 2",
			fmt.Sprintf("ZNAXIS1 = %d", n), "ZNAXIS2 = 2", fmt.Sprintf("ZTILE1  = %d", size), "ZTILE2  = 2", "ZNAME1  = 'BLOCKSIZE'", fmt.Sprintf("ZVAL1   = %d", block),
			"ZNAME2  = 'BYTEPIX'", fmt.Sprintf("ZVAL2   = %d", bytePix)}
		if kind >= 128 {
			cards = append(cards, "ZSCALE  = 0.5", "ZZERO   = 3.0", "ZQUANTIZ= 'SUBTRACTIVE_DITHER_2'", "ZDITHER0= 9999", "ZBLANK  = -1")
		}
		h := open(t, tileFile([][]byte{tile}, cards...)).HDUs[1]
		for y := range min(h.Lines(), 2) {
			got, err := h.Line(y)
			if err != nil && !oops.IsInput(err) {
				t.Fatal(err)
			}
			if len(got) > 2000*(len(tile)+1) {
				t.Fatalf("%d values out of %d bytes", len(got), len(tile))
			}
		}
	})
}
