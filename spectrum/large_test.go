package spectrum

import (
	"encoding/binary"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"testing"

	"lacuna/spectrum/fits"
)

// A counter counts the bytes that are read from a file.
type counter struct {
	io.ReaderAt
	bytes int64
}

func (c *counter) ReadAt(p []byte, off int64) (int, error) {
	n, err := c.ReaderAt.ReadAt(p, off)
	c.bytes += int64(n)
	return n, err
}

// sparse makes a file of that size, which takes no room on the disk, with bytes at
// some places.
func sparse(t *testing.T, size int64, parts map[int64][]byte) *fits.Content {
	t.Helper()
	f, err := os.Create(filepath.Join(t.TempDir(), "large.fits"))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { f.Close() })
	if err := f.Truncate(size); err != nil {
		t.Skip("no sparse files here: ", err)
	}
	for at, b := range parts {
		if _, err := f.WriteAt(b, at); err != nil {
			t.Fatal(err)
		}
	}
	return &fits.Content{ReaderAt: f, Name: "large.fits", Size: size}
}

func doubles(v ...float64) []byte {
	var b []byte
	for _, x := range v {
		b = binary.BigEndian.AppendUint64(b, math.Float64bits(x))
	}
	return b
}

// One order of a file of 500 MB: no more is read than that order, the header and
// the blocks in which the file is looked through, and memory holds the order alone.
func TestOneOrderOfALargeFile(t *testing.T) {
	const pixels, orders = 1 << 17, 500 // 1 MiB an order: 524 MB of doubles
	const want = 321
	flux := make([]float64, pixels)
	for i := range flux {
		flux[i] = float64(i + 1)
	}
	wave := make([]float64, pixels)
	for i := range wave {
		wave[i] = 5000 + 0.001*float64(i)
	}
	var specs strings.Builder
	specs.WriteString("wtype=multispec")
	for o := range orders {
		fmt.Fprintf(&specs, ` spec%d = "%d %d 0 5000 0.001 %d 0"`, o+1, o+1, 600-o, pixels)
	}
	image := []string{"SIMPLE  = T", "BITPIX  = -64", "NAXIS   = 2", fmt.Sprintf("NAXIS1  = %d", pixels), fmt.Sprintf("NAXIS2  = %d", orders)}
	multispec := rawHeader(append(append(image, "WAT0_001= 'system=multispec'"), watCards(2, specs.String())...)...)
	var poly []string
	for o := range orders {
		poly = append(poly, fmt.Sprintf("HIERARCH ESO DRS CAL TH COEFF LL%d = 5000", 2*o), fmt.Sprintf("HIERARCH ESO DRS CAL TH COEFF LL%d = 0.001", 2*o+1))
	}
	e2ds := rawHeader(append(append(image, "HIERARCH ESO DRS CAL TH DEG LL = 1"), poly...)...)
	// A table of two array cells a row, and one order in each row.
	const row = 16 * pixels
	table := append(rawHeader("SIMPLE  = T", "BITPIX  = 8", "NAXIS   = 0"), rawHeader("XTENSION= 'BINTABLE'", "BITPIX  = 8", "NAXIS   = 2", fmt.Sprintf("NAXIS1  = %d", row), fmt.Sprintf("NAXIS2  = %d", orders/2), "PCOUNT  = 0",
		"GCOUNT  = 1", "TFIELDS = 2", "TTYPE1  = 'WAVE'", fmt.Sprintf("TFORM1  = '%dD'", pixels), "TUNIT1  = 'Angstrom'", "TTYPE2  = 'FLUX'", fmt.Sprintf("TFORM2  = '%dD'", pixels))...)
	for name, tc := range map[string]struct {
		head  []byte
		at    int64 // of the wanted order's bytes behind the header
		bytes []byte
		row   int
	}{
		"multispec": {multispec, 8 * pixels * (want - 1), doubles(flux...), want},
		"e2ds":      {e2ds, 8 * pixels * (want - 1), doubles(flux...), want},
		"table":     {table, row * (want/2 - 1), append(doubles(wave...), doubles(flux...)...), want / 2},
	} {
		data := int64(8*pixels*orders+2879) / 2880 * 2880
		c := sparse(t, int64(len(tc.head))+data, map[int64][]byte{0: tc.head, int64(len(tc.head)) + tc.at: tc.bytes})
		if c.Size < 500e6 {
			t.Fatalf("%d bytes are not 500 MB", c.Size)
		}
		count := &counter{ReaderAt: c.ReaderAt}
		c.ReaderAt = count
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		s, err := read(c, Options{Row: tc.row, NoSum: true})
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		runtime.ReadMemStats(&after)
		g := &s.Segments[0]
		if len(s.Segments) != 1 || len(g.Flux) != pixels || g.Flux[pixels-1] != pixels || !(math.Abs(g.Wave[pixels-1]-wave[pixels-1]) < 1e-9) {
			t.Fatalf("%s: %d segments of %d pixels", name, len(s.Segments), len(g.Flux))
		}
		if limit := int64(len(tc.bytes) + len(tc.head) + 64<<10); count.bytes > limit {
			t.Errorf("%s: %d bytes read, the order and the header have %d", name, count.bytes, limit)
		}
		// Wavelengths, flux, mask and what reading and checking need beside them.
		if used := int64(after.TotalAlloc - before.TotalAlloc); used > 24*8*pixels {
			t.Errorf("%s: %d MB allocated for an order of %d MB", name, used>>20, 8*pixels>>20)
		}
	}
}
