package table_test

import (
	"bytes"
	"io"
	"reflect"
	"testing"

	"lacuna/internal/oops"
	"lacuna/internal/table"
)

var csvSeeds = []string{
	"a,b\n1,2\n", "\xEF\xBB\xBFa (nm),\"b, c\"\r\n1e5,\"x\"\"y\"\r\n", "# c\nN\n1\n\"\"\n", "a,b\n\"1\n2\",\n,\"\"\n", "a\ttrue\n", "x,y\nTrue,1d3\nfalse,nan\n",
	"\"#a\",b\n\"#1\", 2\n", "a [dex(1 / cm2)],b\n,\n",
}

func FuzzReadCSV(f *testing.F) {
	for _, s := range csvSeeds {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, in []byte) {
		roundTrip(t, in, table.ReadCSV, (*table.Table).WriteCSV, false)
	})
}

func FuzzReadECSV(f *testing.F) {
	const head = "# %ECSV 1.0\n# ---\n# datatype:\n# - {name: a, unit: km / s, datatype: float64, format: '%.2f', description: 'x: y'}\n# - {name: b, datatype: string}\n# delimiter: ','\n"
	for _, s := range []string{
		head + "# meta: !!omap\n# - object: Lantern 07\n# - {v: 1.5}\n# - n: [1, two, null, 2001-01-01, .nan]\n# schema: astropy-2.0\na,b\n1.0,\"x\ny\"\n,\n",
		head + "# meta: {a: &x [1, 2], b: *x, c: {d: yes}}\na,b\nnan,\"\"\n",
		"# %ECSV 0.9\n# ---\n# datatype:\n# - name: a\n#   datatype: bool\n# - {name: b, datatype: int32}\na b\nTrue 1\n\"\"   2  \n",
	} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, in []byte) {
		roundTrip(t, in, table.ReadECSV, (*table.Table).WriteECSV, true)
	})
}

// What a reader accepts can be written, reads back the same, and is written
// again with the same bytes. What it refuses is the user's to mend.
func roundTrip(t *testing.T, in []byte, read func(io.Reader, string) (*table.Table, error), write func(*table.Table, io.Writer) error, typed bool) {
	a, err := read(bytes.NewReader(in), "fuzz")
	if err != nil {
		if !oops.IsInput(err) {
			t.Fatalf("%q: %v is not an input error", in, err)
		}
		return
	}
	var one, two bytes.Buffer
	if err := write(a, &one); err != nil {
		t.Fatalf("%q was accepted but cannot be written: %v", in, err)
	}
	b, err := read(bytes.NewReader(one.Bytes()), "fuzz")
	if err != nil {
		t.Fatalf("%q was written as %q: %v", in, &one, err)
	}
	if len(a.Cols) != len(b.Cols) {
		t.Fatalf("%q: %d columns, %d after writing", in, len(a.Cols), len(b.Cols))
	}
	for i := range a.Cols {
		x, y := a.Cols[i], b.Cols[i]
		if !typed { // CSV has no units
			x.Unit, y.Unit = "", ""
		}
		if len(a.Cols) == 1 && x.Type == table.Text { // missing and "" are one there
			for j := range x.Cells {
				x.Cells[j].Set = true
			}
		}
		if !reflect.DeepEqual(x, y) {
			t.Fatalf("%q: column %+v, after writing %+v", in, x, y)
		}
	}
	if err := write(b, &two); err != nil || !bytes.Equal(one.Bytes(), two.Bytes()) {
		t.Fatalf("%q: written as %q, then as %q (%v)", in, &one, &two, err)
	}
	for _, other := range []func() error{func() error { return a.WriteJSON(io.Discard) }, func() error { return a.WriteText(io.Discard, table.TextOptions{Width: 80, ASCII: true}) }} {
		if err := other(); err != nil {
			t.Fatalf("%q: %v", in, err)
		}
	}
}
