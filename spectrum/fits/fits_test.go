package fits_test

import (
	"bytes"
	"compress/gzip"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/internal/oops"
	"lacuna/spectrum/fits"
)

// header makes one header of cards, filled up to a block.
func header(cards ...string) []byte {
	var b bytes.Buffer
	for _, c := range append(cards, "END") {
		b.WriteString((c + strings.Repeat(" ", 80))[:80])
	}
	return pad(b.Bytes(), ' ')
}

func pad(b []byte, with byte) []byte {
	return append(b, bytes.Repeat([]byte{with}, (2880-len(b)%2880)%2880)...)
}

var empty = header("SIMPLE  =                    T", "BITPIX  =                    8", "NAXIS   =                    0")

// table is a BINTABLE of the given row bytes, heap and further cards.
func table(width, rows, heap int, data []byte, cards ...string) []byte {
	h := []string{"XTENSION= 'BINTABLE'", "BITPIX  =                    8", "NAXIS   =                    2",
		"NAXIS1  = " + itoa(width), "NAXIS2  = " + itoa(rows), "PCOUNT  = " + itoa(heap), "GCOUNT  =                    1"}
	return append(append(bytes.Clone(empty), header(append(h, cards...)...)...), pad(bytes.Clone(data), 0)...)
}

func itoa(n int) string { return strconv.Itoa(n) }

func open(t *testing.T, b []byte) *fits.File {
	t.Helper()
	f, err := fits.New(fits.FromBytes("test.fits", b))
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func TestCards(t *testing.T) {
	f := open(t, header("SIMPLE  =                    T", "BITPIX  =                    8 / bits", "NAXIS   =                    0",
		"A       = 1e-2", "B       = 12/comment", "C       = 1.5d-2", "D       = .5", "E       = 'it''s '/ quoted", "F       =",
		"G       = 1", "G       = 2", "HIERARCH  ESO  QC vrad HELICOR=13.887876/ km/s", "HIERARCH ESO X = 'y'",
		"LONG    = 'one &'", "CONTINUE  'two&'", "CONTINUE  '' / end", "AMP     = 'ends in &'", "CONTINUE  3", "UNCLOSED= 'abc",
		"H       = 32768.0", "COMMENT = 3", "I       = 1e400", "J       = 0x10", "K       = nan"))
	h := &f.HDUs[0].Header
	for key, want := range map[string]float64{"A": 0.01, "B": 12, "C": 0.015, "D": 0.5, "G": 1, "ESO QC VRAD HELICOR": 13.887876, "H": 32768} {
		if got, err := h.Float(key, -1); err != nil || got != want {
			t.Errorf("%s = %g, %v; want %g", key, got, err, want)
		}
	}
	for key, want := range map[string]string{"E": "it's", "LONG": "one two", "AMP": "ends in &", "ESO X": "y", "UNCLOSED": "abc", "F": "", "NONE": ""} {
		if got := h.Str(key); got != want {
			t.Errorf("%s = %q, want %q", key, got, want)
		}
	}
	if h.Has("F") || !h.Has("E") {
		t.Error("an undefined value counts as there, or a defined one does not")
	}
	for _, key := range []string{"E", "I", "J", "K"} {
		_, err := h.Float(key, 0)
		if !oops.IsInput(err) || !strings.Contains(err.Error(), key) {
			t.Errorf("%s as a number: %v", key, err)
		}
	}
	if n, err := h.Int("H", 0); err != nil || n != 32768 {
		t.Errorf("H = %d, %v", n, err)
	}
	if _, err := h.Int("A", 0); err == nil {
		t.Error("0.01 was taken for an integer")
	}
}

// The cells are written by hand, byte by byte: big-endian integers and IEEE 754.
func TestTableValues(t *testing.T) {
	row := func(i int16, u uint16, b byte, l byte, d uint64, n, off int32) []byte {
		return []byte{byte(uint16(i) >> 8), byte(i), byte(u >> 8), byte(u), b, l,
			byte(d >> 56), byte(d >> 48), byte(d >> 40), byte(d >> 32), byte(d >> 24), byte(d >> 16), byte(d >> 8), byte(d),
			byte(n >> 24), byte(n >> 16), byte(n >> 8), byte(n), byte(off >> 24), byte(off >> 16), byte(off >> 8), byte(off), 'a', 'b', 0, 'x'}
	}
	data := append(row(4, 0x9c40-0x8000, 255, 'T', 0x4009_21fb_5444_2d18, 3, 0), row(-7, 0, 1, 'F', 0x7ff8_0000_0000_0001, 1, 2)...)
	gap := []byte{0xde, 0xad} // between the rows and an explicit THEAP
	data = append(append(data, gap...), 0, 1, 0, 2, 0xff, 0xff)
	f := open(t, table(26, 2, 8, data, "TFIELDS = 9", "TTYPE1  = 'scaled  '", "TFORM1  = 'I'", "TSCAL1  = 0.5", "TZERO1  = 10", "TNULL1  = -7",
		"TTYPE2  = 'unsigned'", "TFORM2  = '1I'", "TZERO2  = 32768", "TTYPE3  = 'b'", "TFORM3  = 'B'", "TTYPE4  = 'logic'", "TFORM4  = 'L'",
		"TTYPE5  = 'd'", "TFORM5  = 'D'", "TTYPE6  = 'nothing'", "TFORM6  = '0E'", "TTYPE7  = 'var'", "TFORM7  = '1PI(3)'", "TTYPE8  = 'text'", "TFORM8  = '4A'",
		"TTYPE9  = 'none'", "TFORM9  = '0A'", "THEAP   = 54"))
	h := f.HDUs[1]
	if h.Err != nil {
		t.Fatal(h.Err)
	}
	nan := math.NaN()
	for _, tc := range []struct {
		name string
		want []float64
	}{
		{"SCALED", []float64{12, nan}}, {"unsigned", []float64{40000 - 32768 - 0 + 32768, 32768}}, {"b", []float64{255, 1}},
		{"logic", []float64{1, 0}}, {"d", []float64{math.Pi, nan}},
	} {
		got, err := h.Column(h.Col(tc.name))
		if err != nil || !same(got, tc.want) {
			t.Errorf("%s = %v, %v; want %v", tc.name, got, err, tc.want)
		}
		if one, err := h.Cell(h.Col(tc.name), 1); err != nil || !same(one, tc.want[1:]) {
			t.Errorf("%s, row 2 = %v, %v; want %v", tc.name, one, err, tc.want[1:])
		}
	}
	if h.Col("nothing") >= 0 || h.Col("none") >= 0 {
		t.Error("a column of no width is listed")
	}
	for r, want := range [][]float64{{1, 2, -1}, {2}} {
		if got, err := h.Cell(h.Col("var"), int64(r)); err != nil || !same(got, want) {
			t.Errorf("variable array, row %d: %v, %v; want %v", r+1, got, err, want)
		}
	}
	if s, err := h.Text(h.Col("text"), 0); err != nil || s != "ab" {
		t.Errorf("text %q, %v", s, err)
	}
	for _, bad := range []struct{ col, row int }{{-1, 0}, {99, 0}, {0, 2}, {0, -1}} {
		if _, err := h.Cell(bad.col, int64(bad.row)); !oops.IsInput(err) {
			t.Errorf("cell %d, %d: %v", bad.col, bad.row, err)
		}
	}
}

func same(a, b []float64) bool {
	if len(a) != len(b) {
		return false
	}
	for i := range a {
		if a[i] != b[i] && !(math.IsNaN(a[i]) && math.IsNaN(b[i])) {
			return false
		}
	}
	return true
}

// An ASCII table as in section 7.2 of the FITS Standard: fields by TBCOL and TFORM.
func TestAsciiTable(t *testing.T) {
	rows := "5000.0 1.5D0 Ca II" + "5001.5       K I  "
	b := append(bytes.Clone(empty), header("XTENSION= 'TABLE   '", "BITPIX  = 8", "NAXIS   = 2", "NAXIS1  = 18", "NAXIS2  = 2", "PCOUNT  = 0", "GCOUNT  = 1", "TFIELDS = 3",
		"TTYPE1  = 'wave'", "TBCOL1  = 1", "TFORM1  = 'F6.1'", "TTYPE2  = 'flux'", "TBCOL2  = 8", "TFORM2  = 'D5.1'", "TSCAL2  = 2.0", "TTYPE3  = 'ion'", "TBCOL3  = 14", "TFORM3  = 'A5'")...)
	h := open(t, append(b, pad([]byte(rows), ' ')...)).HDUs[1]
	if h.Err != nil {
		t.Fatal(h.Err)
	}
	for i, want := range [][]float64{{5000, 5001.5}, {3, math.NaN()}} {
		if got, err := h.Column(i); err != nil || !same(got, want) {
			t.Errorf("column %d: %v, %v; want %v", i, got, err, want)
		}
	}
	if s, err := h.Text(2, 1); err != nil || s != "K I" {
		t.Errorf("text %q, %v", s, err)
	}
	if _, err := h.Column(2); !oops.IsInput(err) {
		t.Errorf("text as numbers: %v", err)
	}
}

func TestImageScaling(t *testing.T) {
	b := append(header("SIMPLE  = T", "BITPIX  = 16", "NAXIS   = 2", "NAXIS1  = 2", "NAXIS2  = 2", "BSCALE  = 2.0", "BZERO   = 1", "BLANK   = -1"),
		pad([]byte{0, 1, 0xff, 0xff, 0xff, 0xfe, 0, 3}, 0)...)
	h := open(t, b).HDUs[0]
	for i, want := range [][]float64{{3, math.NaN()}, {-3, 7}} {
		if got, err := h.Line(int64(i)); err != nil || !same(got, want) {
			t.Errorf("line %d: %v, %v; want %v", i, got, err, want)
		}
	}
	if _, err := h.Line(2); !oops.IsInput(err) {
		t.Errorf("line 3 of 2: %v", err)
	}
}

// Headers that panic, hang or fill the memory in other hands.
func TestHostileHeaders(t *testing.T) {
	for name, tc := range map[string]struct {
		b    []byte
		want string
	}{
		"empty file":     {nil, "not a FITS file"},
		"no END":         {append([]byte("SIMPLE  = T"+strings.Repeat(" ", 69)), 0, 1), "END"},
		"negative NAXIS": {header("SIMPLE  = T", "BITPIX  = 8", "NAXIS   = -1"), "NAXIS"},
		"NAXIS real":     {header("SIMPLE  = T", "BITPIX  = 8", "NAXIS   = 1.5"), "NAXIS"},
		"NAXIS1 text":    {header("SIMPLE  = T", "BITPIX  = 8", "NAXIS   = 1", "NAXIS1  = 'abc'"), "NAXIS1"},
		"NAXIS1 missing": {header("SIMPLE  = T", "BITPIX  = 8", "NAXIS   = 1"), "NAXIS1"},
		"terabytes":      {header("SIMPLE  = T", "BITPIX  = -64", "NAXIS   = 1", "NAXIS1  = 999999999999"), "7999999999992"},
		"overflow":       {header("SIMPLE  = T", "BITPIX  = 8", "NAXIS   = 3", "NAXIS1  = 4294967296", "NAXIS2  = 4294967296", "NAXIS3  = 4294967296"), "NAXIS3"},
		"BITPIX":         {header("SIMPLE  = T", "BITPIX  = 7", "NAXIS   = 0"), "BITPIX"},
		"CONTINUE first": {header("CONTINUE  'x'"), "not a FITS file"},
		"no NAXIS":       {header("SIMPLE  = T", "BITPIX  = 8"), "NAXIS"},
	} {
		_, err := fits.New(fits.FromBytes("bad.fits", tc.b))
		if !oops.IsInput(err) || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("%s: %v; want %q", name, err, tc.want)
		}
	}
	for name, tc := range map[string]struct {
		b    []byte
		want string
	}{
		"row width":        {table(12, 1, 0, make([]byte, 12), "TFIELDS = 2", "TFORM1  = 'D'", "TFORM2  = 'D'"), "16 bytes"},
		"no TFORM":         {table(8, 1, 0, make([]byte, 8), "TFIELDS = 1", "TTYPE1  = 'a'"), "TFORM1"},
		"TFORM":            {table(8, 1, 0, make([]byte, 8), "TFIELDS = 1", "TFORM1  = 'Z'"), "TFORM1"},
		"TFORM bare count": {table(8, 1, 0, make([]byte, 8), "TFIELDS = 1", "TFORM1  = '8'"), "TFORM1"},
		"THEAP":            {table(8, 1, 8, make([]byte, 16), "TFIELDS = 1", "TFORM1  = '1PD'", "THEAP   = 17"), "THEAP"},
		"TFIELDS":          {table(8, 1, 0, make([]byte, 8), "TFIELDS = 1000"), "TFIELDS"},
		"huge repeat":      {table(8, 1, 0, make([]byte, 8), "TFIELDS = 1", "TFORM1  = '9223372036854775807D'"), "TFORM1"},
	} {
		f := open(t, tc.b)
		if err := f.HDUs[1].Err; !oops.IsInput(err) || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("%s: %v; want %q", name, err, tc.want)
		}
	}
	// A descriptor that points outside the heap must not allocate.
	for _, d := range [][]byte{{0x7f, 0xff, 0xff, 0xff, 0, 0, 0, 0}, {0, 0, 0, 1, 0, 0, 0, 9}, {0xff, 0xff, 0xff, 0xff, 0, 0, 0, 0}, {0, 0, 0, 1, 0xff, 0xff, 0xff, 0xff}} {
		f := open(t, table(8, 1, 8, append(bytes.Clone(d), make([]byte, 8)...), "TFIELDS = 1", "TTYPE1  = 'a'", "TFORM1  = '1PD'"))
		if _, err := f.HDUs[1].Cell(0, 0); !oops.IsInput(err) || !strings.Contains(err.Error(), "heap") {
			t.Errorf("descriptor %v: %v", d, err)
		}
	}
}

func TestWriteAndVerify(t *testing.T) {
	dir := t.TempDir()
	line := []float64{1, 0.5, math.NaN()}
	cards := []fits.Entry{{"OBJECT", "Lantern 1 'north'", "invented"}, {"SPECSYS", "HELIOCEN", ""}, {"WAVEREF", 3933.6612345678901, "[Angstrom]"}, {"STEP", 1e-7, ""},
		{"ESO QC VRAD HELICOR", 13.887876, "km/s, to be added, with a comment that is too long for what is left of the line"}, {"COMMENT", nil, "two lines: flux, 1 sigma error"}}
	var img, tab bytes.Buffer
	if err := fits.WriteImage(&img, [][]float64{line, {0.1, 0.1, 0.2}}, cards); err != nil {
		t.Fatal(err)
	}
	cols := []fits.Vector{
		{Name: "ORDER", Type: 'J', Rows: [][]float64{{87}, {88}}}, {Name: "LABEL", Type: 'A', Text: []string{"order 87", "x"}},
		{Name: "WAVE", Unit: "Angstrom", UCD: "em.wl;obs.atmos", Utype: "Spectrum.Data.SpectralAxis.Value", Type: 'D', Rows: [][]float64{{1, 2, 3}, {4, 5, 6}}},
		{Name: "FLUX", Type: 'E', Rows: [][]float64{line, line}}, {Name: "QUAL", Type: 'I', Rows: [][]float64{{0, 1, 2}, {0, 0, -1}}},
	}
	if err := fits.WriteTable(&tab, []fits.Entry{{"ORIGIN", "test", ""}}, "SPECTRUM", cols, cards); err != nil {
		t.Fatal(err)
	}
	for name, b := range map[string][]byte{"image.fits": img.Bytes(), "table.fits": tab.Bytes()} {
		p := filepath.Join(dir, name)
		if err := os.WriteFile(p, b, 0o644); err != nil {
			t.Fatal(err)
		}
		f, err := fits.Open(p)
		if err != nil {
			t.Fatal(err)
		}
		defer f.Close()
		h := f.HDUs[len(f.HDUs)-1]
		if h.Err != nil {
			t.Fatal(h.Err)
		}
		if x, err := h.Float("WAVEREF", 0); err != nil || x != 3933.6612345678901 {
			t.Errorf("%s: WAVEREF = %.17g, %v", name, x, err)
		}
		if s := h.Str("OBJECT"); s != "Lantern 1 'north'" {
			t.Errorf("%s: OBJECT = %q", name, s)
		}
		if x, err := h.Float("ESO QC VRAD HELICOR", 0); err != nil || x != 13.887876 {
			t.Errorf("%s: HELICOR = %g, %v", name, x, err)
		}
		verify(t, p)
	}
	h := open(t, tab.Bytes()).HDUs[1]
	for i := range cols {
		for r := range 2 {
			if cols[i].Type == 'A' {
				if s, err := h.Text(i, int64(r)); err != nil || s != cols[i].Text[r] {
					t.Errorf("text %q, %v", s, err)
				}
			} else if got, err := h.Cell(i, int64(r)); err != nil || !same(got, cols[i].Rows[r]) {
				t.Errorf("%s, row %d: %v, %v", cols[i].Name, r, got, err)
			}
		}
	}
	if got, err := open(t, img.Bytes()).HDUs[0].Line(0); err != nil || !same(got, line) {
		t.Errorf("line %v, %v", got, err)
	}
}

// verify runs the FITS verifier of NASA's HEASARC, where it is installed.
func verify(t *testing.T, path string) {
	t.Helper()
	prog, err := exec.LookPath("fitsverify")
	if err != nil {
		if os.Getenv("LACUNA_REQUIRE_ALL") == "1" {
			t.Error("fitsverify is not installed (LACUNA_REQUIRE_ALL=1)")
		}
		t.Log("fitsverify is not installed: the file is checked by our own reader only")
		return
	}
	out, err := exec.Command(prog, path).CombinedOutput()
	if err != nil || !strings.Contains(string(out), "found 0 warning(s) and 0 error(s)") {
		t.Errorf("%s: %v\n%s", path, err, out)
	}
}

func TestWriteRefuses(t *testing.T) {
	one := [][]float64{{1}}
	for name, err := range map[string]error{
		"NaN card":     fits.WriteImage(&bytes.Buffer{}, one, []fits.Entry{{"A", math.NaN(), ""}}),
		"not ASCII":    fits.WriteImage(&bytes.Buffer{}, one, []fits.Entry{{"A", "Å", ""}}),
		"too long":     fits.WriteImage(&bytes.Buffer{}, one, []fits.Entry{{"A", strings.Repeat("x", 80), ""}}),
		"no pixel":     fits.WriteImage(&bytes.Buffer{}, nil, nil),
		"ragged image": fits.WriteImage(&bytes.Buffer{}, [][]float64{{1}, {1, 2}}, nil),
		"no column":    fits.WriteTable(&bytes.Buffer{}, nil, "X", nil, nil),
		"ragged table": fits.WriteTable(&bytes.Buffer{}, nil, "X", []fits.Vector{{Name: "A", Type: 'D', Rows: [][]float64{{1}, {1, 2}}}}, nil),
		"type":         fits.WriteTable(&bytes.Buffer{}, nil, "X", []fits.Vector{{Name: "A", Type: 'Z', Rows: one}}, nil),
	} {
		if err == nil {
			t.Errorf("%s was written", name)
		}
	}
}

func TestGzip(t *testing.T) {
	dir := t.TempDir()
	var b bytes.Buffer
	raw := append(bytes.Clone(empty), bytes.Repeat([]byte(" "), 2880)...)
	for _, part := range [][]byte{raw[:1000], raw[1000:]} { // two members
		z := gzip.NewWriter(&b)
		z.Write(part)
		z.Close()
	}
	p := filepath.Join(dir, "two.fits.gz")
	for name, tc := range map[string]struct {
		b    []byte
		want string
	}{"whole": {b.Bytes(), ""}, "cut": {b.Bytes()[:b.Len()-9], "unexpected end"}, "damaged": {append(bytes.Clone(b.Bytes()[:b.Len()-6]), 1, 2, 3, 4, 5, 6), "gzip"}} {
		os.WriteFile(p, tc.b, 0o644)
		c, err := fits.Load(p)
		if tc.want == "" {
			if err != nil {
				t.Fatal(err)
			}
			if !c.Gzip || c.Size != int64(len(raw)) {
				t.Errorf("gzip %v, %d bytes, want %d", c.Gzip, c.Size, len(raw))
			}
			continue
		}
		if !oops.IsInput(err) || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("%s: %v", name, err)
		}
	}
	for _, bad := range []string{dir, filepath.Join(dir, "none.fits")} {
		if _, err := fits.Load(bad); !oops.IsInput(err) {
			t.Errorf("%s: %v", bad, err)
		}
	}
}

// FuzzFITS: whatever the bytes, no panic, no hang, no large allocation; what
// opens can be read or gives an error.
func FuzzFITS(f *testing.F) {
	f.Add(empty)
	f.Add(table(8, 1, 8, []byte{0, 0, 0, 1, 0, 0, 0, 0, 1, 2, 3, 4, 5, 6, 7, 8}, "TFIELDS = 1", "TTYPE1  = 'a'", "TFORM1  = '1PD(1)'"))
	f.Add(table(26, 1, 0, make([]byte, 26), "TFIELDS = 4", "TFORM1  = '2E'", "TFORM2  = '9X'", "TFORM3  = 'K'", "TFORM4  = '8A'", "TSCAL1  = 2.0", "TNULL3  = 0"))
	f.Add(append(header("SIMPLE  = T", "BITPIX  = -32", "NAXIS   = 2", "NAXIS1  = 3", "NAXIS2  = 2"), make([]byte, 2880)...))
	f.Fuzz(func(t *testing.T, b []byte) {
		file, err := fits.New(fits.FromBytes("fuzz.fits", b))
		if err != nil {
			if !oops.IsInput(err) {
				t.Fatalf("not the user's error: %v", err)
			}
			return
		}
		total := 0
		for _, h := range file.HDUs {
			h.Describe()
			for i := int64(0); i < min(h.Lines(), 3) && h.Kind == fits.Image; i++ {
				v, _ := h.Line(i)
				total += len(v)
			}
			for c := range h.Cols {
				v, _ := h.Column(c)
				w, _ := h.Cell(c, 0)
				h.Text(c, 0)
				total += len(v) + len(w)
			}
		}
		if total > 4000*len(b) {
			t.Errorf("%d values out of %d bytes", total, len(b))
		}
	})
}

func TestSharedSamplesScan(t *testing.T) {
	dir := check.Shared(t, "formats/samples")
	names, _ := filepath.Glob(filepath.Join(dir, "*.fits*"))
	if len(names) < 16 {
		t.Fatalf("%d samples", len(names))
	}
	for _, p := range names {
		f, err := fits.Open(p)
		if err != nil {
			t.Error(err)
			continue
		}
		for _, h := range f.HDUs {
			if h.Err != nil {
				t.Error(h.Err)
			}
		}
		f.Close()
	}
}

// A file that unpacks to more than is kept in memory goes through a temporary
// file, which is gone at once; its bytes are the same.
func TestGzipSpools(t *testing.T) {
	dir := t.TempDir()
	t.Setenv("TMPDIR", dir)
	p := filepath.Join(dir, "large.gz")
	f, err := os.Create(p)
	if err != nil {
		t.Fatal(err)
	}
	z, _ := gzip.NewWriterLevel(f, gzip.BestSpeed)
	zeros := make([]byte, 1<<20)
	for range 20 {
		z.Write(zeros)
	}
	z.Write([]byte("end"))
	z.Close()
	f.Close()
	c, err := fits.Load(p)
	if err != nil {
		t.Fatal(err)
	}
	defer c.Close()
	var last [3]byte
	c.ReadAt(last[:], c.Size-3)
	if c.Size != 20<<20+3 || string(last[:]) != "end" {
		t.Errorf("%d bytes, ending in %q", c.Size, last)
	}
	if left, _ := os.ReadDir(dir); len(left) != 1 {
		t.Errorf("%d files in the temporary folder, want the packed one alone", len(left))
	}
}

// Files of the ESO archive and two samples carry sums that their writers made; any
// flipped bit breaks them.
func TestCheckSums(t *testing.T) {
	seen := 0
	for _, name := range []string{"formats/samples/01_linear_wave_nm.fits", "formats/samples/08_sdp_row_vector.fits", "realdata/cen-x3/ADP.2021-08-26T17_24_42.195.fits",
		"realdata/qv-nor/ADP.2020-06-19T08_40_21.544.fits"} {
		b, err := os.ReadFile(check.Shared(t, name))
		if err != nil {
			t.Fatal(err)
		}
		for _, h := range open(t, b).HDUs {
			if what, err := h.CheckSums(); err != nil || what != "" {
				t.Errorf("%s, %s: %s, %v", name, h.Where(), what, err)
			}
			if h.Has("CHECKSUM") {
				seen++
			}
		}
		for _, at := range []int{len(b) / 2, len(b) - 3000} {
			b[at] ^= 4
			broken := 0
			for _, h := range open(t, b).HDUs {
				if what, err := h.CheckSums(); err != nil || what != "" {
					broken++
				}
			}
			if broken != 1 {
				t.Errorf("%s: byte %d changed, and %d HDUs say so", name, at, broken)
			}
			b[at] ^= 4
		}
	}
	if seen < 6 {
		t.Errorf("only %d sums were looked at", seen)
	}
}
