package table_test

import (
	"bytes"
	"encoding/json"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/internal/oops"
	"lacuna/internal/table"
)

// sample holds the awkward things: commas, quotes, #, blanks, missing cells,
// empty text, limits without errors, metadata of every type. Stars are invented.
func sample() *table.Table {
	t := table.New(
		table.Column{Name: "object", Type: table.Text, Description: "Sightline"},
		table.Column{Name: "ion", Type: table.Text},
		table.Column{Name: "lambda_vac_A", Unit: "Angstrom", Type: table.Real, Format: "%.4f", Description: "Rest wavelength in vacuum"},
		table.Column{Name: "order", Type: table.Integer},
		table.Column{Name: "logN_kind", Type: table.Text, Description: "value, upper, lower or marginal"},
		table.Column{Name: "logN", Unit: "dex(1 / cm2)", Type: table.Real, UCD: "phys.columnDensity"},
		table.Column{Name: "logN_err", Unit: "dex", Type: table.Real},
		table.Column{Name: "detected", Type: table.Logical},
		table.Column{Name: "note", Type: table.Text, Description: `it's "quoted": yes, # and all`},
	)
	t.Meta = []table.KV{{Key: "object", Value: "Lantern 07"}, {Key: "limit_sigma", Value: 3.0}, {Key: "rows", Value: 3}, {Key: "ok", Value: true}, {Key: "none", Value: nil},
		{Key: "words", Value: []string{"yes", "1.5", "a: b", "[x]", "it's"}}, {Key: "tiny", Value: 1e-21}, {Key: "big", Value: 1e21},
		{Key: "scale", Value: []table.KV{{Key: "name", Value: "Asplund et al. 2021"}, {Key: "eps", Value: []float64{7.46, 8.69}}}}}
	v, e := table.Round(11.8423, 0.0147)
	t.AddRow(table.Str("Lantern 07"), table.Str("Ca II"), table.Fixed(3934.775, 4), table.Int(87), table.Str("value"), table.Num(v), table.Num(e), table.Bool(true), table.Str(`5" slit, good`))
	t.AddRow(table.Str("#1 of two"), table.Str("Na I"), table.Fixed(5891.58333, 4), table.Missing, table.Str("lower"), table.Num(table.RoundLimit(12.6171, 2, false)), table.Missing, table.Bool(true), table.Missing)
	t.AddRow(table.Str(" Lantern λ "), table.Str("K I"), table.Exact(math.NaN()), table.Int(-3), table.Str("upper"), table.Num(table.RoundLimit(10.1712, 2, true)), table.Missing, table.Bool(false), table.Str("a"))
	return t
}

func TestECSVBytes(t *testing.T) {
	const want = `# %ECSV 1.0
# ---
# datatype:
# - {name: object, datatype: string, description: Sightline}
# - {name: ion, datatype: string}
# - {name: lambda_vac_A, unit: Angstrom, datatype: float64, format: '%.4f', description: Rest wavelength in vacuum}
# - {name: order, datatype: int64}
# - {name: logN_kind, datatype: string, description: 'value, upper, lower or marginal'}
# - {name: logN, unit: dex(1 / cm2), datatype: float64, meta: {ucd: phys.columnDensity}}
# - {name: logN_err, unit: dex, datatype: float64}
# - {name: detected, datatype: bool}
# - {name: note, datatype: string, description: 'it''s "quoted": yes, # and all'}
# delimiter: ','
# meta: !!omap
# - {object: Lantern 07}
# - {limit_sigma: 3.0}
# - {rows: 3}
# - {ok: true}
# - {none: null}
# - {words: ['yes', '1.5', 'a: b', '[x]', 'it''s']}
# - {tiny: 1.0e-21}
# - {big: 1.0e+21}
# - {scale: {name: Asplund et al. 2021, eps: [7.46, 8.69]}}
# schema: astropy-2.0
object,ion,lambda_vac_A,order,logN_kind,logN,logN_err,detected,note
Lantern 07,Ca II,3934.7750,87,value,11.842,0.015,True,"5"" slit, good"
"#1 of two",Na I,5891.5833,,lower,12.61,,True,
" Lantern λ ",K I,,-3,upper,10.18,,False,a
`
	var b bytes.Buffer
	if err := sample().WriteECSV(&b); err != nil {
		t.Fatal(err)
	}
	if b.String() != want {
		t.Errorf("got\n%s\nwant\n%s", &b, want)
	}
}

func TestECSVRoundTrip(t *testing.T) {
	in := sample()
	var b bytes.Buffer
	if err := in.WriteECSV(&b); err != nil {
		t.Fatal(err)
	}
	got, err := table.ReadECSV(bytes.NewReader(b.Bytes()), "a.ecsv")
	if err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(got.Cols, in.Cols) {
		t.Errorf("columns changed:\n%+v\n%+v", got.Cols, in.Cols)
	}
	for i, want := range []any{"Lantern 07", 3.0, int64(3), true, nil, []any{"yes", "1.5", "a: b", "[x]", "it's"}, 1e-21, 1e21,
		[]table.KV{{Key: "name", Value: "Asplund et al. 2021"}, {Key: "eps", Value: []any{7.46, 8.69}}}} {
		if !reflect.DeepEqual(got.Meta[i].Value, want) {
			t.Errorf("meta %s: %#v, want %#v", got.Meta[i].Key, got.Meta[i].Value, want)
		}
	}
	if got.Where(1) != "line 27" {
		t.Errorf("row 2 stands at %s, want line 27", got.Where(1))
	}
}

// astropy is an independent reader of ECSV (Astropy Collaboration 2022, ApJ 935, 167).
func TestAstropyReadsECSV(t *testing.T) {
	const python = "/usr/bin/python3"
	if err := exec.Command(python, "-c", "import astropy, yaml").Run(); err != nil {
		check.Missing(t, "python3 with astropy is not installed (apt-get install python3-astropy python3-yaml)")
	}
	p := filepath.Join(t.TempDir(), "a.ecsv")
	var b bytes.Buffer
	if err := sample().WriteECSV(&b); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(p, b.Bytes(), 0o644); err != nil {
		t.Fatal(err)
	}
	script := `
import sys, json, numpy as np
from astropy.table import Table
t = Table.read(sys.argv[1], format='ascii.ecsv')
def cell(x): return None if x is np.ma.masked else x.item() if hasattr(x, 'item') else x
print(json.dumps({'units': [str(t[c].unit) for c in t.colnames], 'kinds': [t[c].dtype.kind for c in t.colnames],
  'desc': t['note'].description, 'meta': dict(t.meta, scale=dict(t.meta['scale'])), 'rows': [[cell(x) for x in r] for r in t]}))`
	out, err := exec.Command(python, "-c", script, p).CombinedOutput()
	if err != nil {
		t.Fatalf("%v\n%s", err, out)
	}
	var got, want map[string]any
	if err := json.Unmarshal(out, &got); err != nil {
		t.Fatalf("%v\n%s", err, out)
	}
	// astropy drops blanks at the ends even of quoted text, and masks empty fields.
	const say = `{"units": ["None", "None", "Angstrom", "None", "None", "dex(1 / cm2)", "dex", "None", "None"], "kinds": ["U", "U", "f", "i", "U", "f", "f", "b", "U"],
	"desc": "it's \"quoted\": yes, # and all",
	"meta": {"object": "Lantern 07", "limit_sigma": 3.0, "rows": 3, "ok": true, "none": null, "words": ["yes", "1.5", "a: b", "[x]", "it's"], "tiny": 1e-21, "big": 1e21,
		"scale": {"name": "Asplund et al. 2021", "eps": [7.46, 8.69]}},
	"rows": [["Lantern 07", "Ca II", 3934.775, 87, "value", 11.842, 0.015, true, "5\" slit, good"], ["#1 of two", "Na I", 5891.5833, null, "lower", 12.61, null, true, null],
		["Lantern λ", "K I", null, -3, "upper", 10.18, null, false, "a"]]}`
	if err := json.Unmarshal([]byte(say), &want); err != nil {
		t.Fatal(err)
	}
	for _, k := range []string{"units", "kinds", "desc", "meta", "rows"} {
		if !reflect.DeepEqual(got[k], want[k]) {
			t.Errorf("astropy reads %s as\n%v, want\n%v", k, got[k], want[k])
		}
	}
}

func TestReadECSVOfOthers(t *testing.T) {
	p := check.Shared(t, "formats/samples/19_lsrk.ecsv")
	got, err := table.Read(p)
	if err != nil {
		t.Fatal(err)
	}
	// As the head of that file says.
	if got.Cols[0].Unit != "Angstrom" || got.Cols[3].Type != table.Logical || got.Cols[1].Description != `continuum = 1, "normalised"` {
		t.Errorf("columns: %+v", got.Cols[0].Name)
	}
	if got.Meta[3].Key != "v_lsrk_minus_bary_km_s" || got.Meta[3].Value != 16.3069 {
		t.Errorf("meta: %+v", got.Meta)
	}
	wave, err := got.Floats("wave")
	if err != nil || wave[1] != 3226.4262 {
		t.Errorf("wave: %v, %v", wave[1], err)
	}
}

func TestReadECSVWithBlanks(t *testing.T) {
	in := "# %ECSV 0.9\n# ---\n# datatype:\n# - {name: ion, datatype: string}\n# - {name: b, unit: km / s, datatype: float32}\n# meta: {object: Lantern 1}\nion b\n\"Ca II\"  2.1\n\"K I\" \"\"\n"
	got, err := table.ReadECSV(strings.NewReader(in), "a.ecsv")
	if err != nil {
		t.Fatal(err)
	}
	if s := got.Cols[0].Cells[0].Text; s != "Ca II" || got.Rows() != 2 || got.Cols[1].Cells[1].Set || got.Meta[0].Value != "Lantern 1" {
		t.Errorf("read %+v", got)
	}
}

func TestReadCSV(t *testing.T) {
	in := "\xEF\xBB\xBF# measured on a wet night\r\n\"Wavelength (nm)\",logN [dex(1 / cm2)],ion, n ,seen,note\r\n393.4775,11.8,Ca II,1,true,\"a\r\nb\"\r\n\r\n 589.1 ,,\"\",2,FALSE,\r\n"
	got, err := table.ReadCSV(strings.NewReader(in), "a.csv")
	if err != nil {
		t.Fatal(err)
	}
	cell := func(s string) table.Cell { return table.Cell{Text: s, Set: true} }
	want := []table.Column{
		{Name: "Wavelength", Unit: "nm", Type: table.Real, Cells: []table.Cell{cell("393.4775"), cell("589.1")}},
		{Name: "logN", Unit: "dex(1 / cm2)", Type: table.Real, Cells: []table.Cell{cell("11.8"), {}}},
		{Name: "ion", Type: table.Text, Cells: []table.Cell{cell("Ca II"), cell("")}},
		{Name: "n", Type: table.Integer, Cells: []table.Cell{cell("1"), cell("2")}},
		{Name: "seen", Type: table.Logical, Cells: []table.Cell{cell("true"), cell("false")}},
		{Name: "note", Type: table.Text, Cells: []table.Cell{cell("a\nb"), {}}},
	}
	if !reflect.DeepEqual(got.Cols, want) {
		t.Errorf("got\n%+v\nwant\n%+v", got.Cols, want)
	}
	if got.Lines[0] != 3 || got.Lines[1] != 6 {
		t.Errorf("rows on lines %v, want 3 and 6", got.Lines)
	}
}

func TestBadTables(t *testing.T) {
	const head = "# %ECSV 1.0\n# ---\n# datatype:\n# - {name: a, datatype: float64}\n# - {name: b, datatype: string}\n# delimiter: ','\n"
	for _, tc := range []struct{ name, in, want string }{
		{"too few fields", "a,b\n1,2\n3\n", "x: line 3: 1 fields, expected 2 (a, b)"},
		{"too many fields", "a,b\n1,2,3\n", "x: line 2: 3 fields, expected 2"},
		{"doubled name", "a,b,a\n", `x: line 1, column 3: the name "a" already stands in column 1`},
		{"no name", "a,,b\n1,2,3\n", "x: line 1, column 2: the column has no name"},
		{"open quote", "a,b\n1,\"2\n3,4\n", "x: line 2, field 2: a quote opens here"},
		{"bare quote", "a,b\n5\" slit,2\n", "x: line 2, field 1: a quote inside"},
		{"text after quote", "a,b\n\"1\"x,2\n", "x: line 2, field 1: text after a closing quote"},
		{"empty", "# nothing\n\n", "x: no table here"},
		{"UTF-16", "\xFF\xFEa\x00", "x: this is UTF-16 text"},
		{"NUL", "a,b\n1,\x00\n", "x: line 2: the character U+0000"},
		{"Latin-1", "a,b\n1,\xC5\n", "x: line 2: bytes that are not UTF-8"},
		{"ECSV number", head + "a,b\n1,x\n1.2.3,y\n", `x: line 9, column a: "1.2.3" is not a number, expected float64`},
		{"ECSV hex", head + "a,b\n0x1p3,y\n", `"0x1p3" is not a number`},
		{"ECSV overflow", head + "a,b\n1e999,y\n", `"1e999" is not a number`},
		{"ECSV names", head + "a,c\n1,x\n", `x: line 7, column 2: found the name "c", the header lists "b"`},
		{"ECSV name count", head + "a\n1\n", "x: line 7: 1 names, the header lists 2"},
		{"ECSV no data", head, "x: line 7: the line of column names is missing"},
		{"ECSV version", strings.Replace(head, "1.0", "7.0", 1) + "a,b\n", "ECSV version 7.0 is not known"},
		{"ECSV YAML", "# %ECSV 1.0\n# ---\n# datatype: [\na\n", "the YAML header cannot be read"},
		{"ECSV no columns", "# %ECSV 1.0\n# ---\n# meta: {a: 1}\na\n", "no list of columns"},
		{"ECSV type", strings.Replace(head, "float64", "complex64", 1) + "a,b\n", `x: line 4: column 1: datatype "complex64"`},
		{"ECSV arrays", strings.Replace(head, "float64", "string, subtype: 'float64[3]'", 1) + "a,b\n", "subtype float64[3]"},
		{"ECSV delimiter", strings.Replace(head, "','", "';'", 1) + "a,b\n", `";" is not a delimiter`},
		{"ECSV doubled name", strings.Replace(head, "name: b", "name: a", 1) + "a,a\n", `the name "a" already stands`},
		{"HTML", "<html><body>", "this is XML or HTML"},
		{"FITS", "SIMPLE  =                    T", "this is a FITS file"},
		{"gzip", "\x1F\x8B\x08", "this file is compressed"},
	} {
		p := filepath.Join(t.TempDir(), "x")
		if err := os.WriteFile(p, []byte(tc.in), 0o644); err != nil {
			t.Fatal(err)
		}
		_, err := table.Read(p)
		if err == nil || !oops.IsInput(err) || !strings.Contains(strings.ReplaceAll(err.Error(), p, "x"), tc.want) {
			t.Errorf("%s: error %v, want %q", tc.name, err, tc.want)
		}
	}
	if _, err := table.Read(filepath.Join(t.TempDir(), "nowhere.csv")); !oops.IsInput(err) {
		t.Errorf("a missing file: %v", err)
	}
}

func TestLookup(t *testing.T) {
	tab, err := table.ReadCSV(strings.NewReader("logN,logN_err,x\n\"11,8\",0.1,\n12,,\n"), "a.csv")
	if err != nil {
		t.Fatal(err)
	}
	if _, err := tab.Col("log_N"); err == nil || !strings.Contains(err.Error(), "did you mean logN") {
		t.Errorf("nearest name: %v", err)
	}
	if _, err := tab.Floats("logN"); err == nil || err.Error() != `a.csv: line 2, column logN: found "11,8", expected a number; write a decimal point, not a comma` {
		t.Errorf("decimal comma: %v", err)
	}
	if x, err := tab.Floats("logN_err"); err != nil || x[0] != 0.1 || !math.IsNaN(x[1]) {
		t.Errorf("errors %v, %v", x, err)
	}
}

func TestCheckRefuses(t *testing.T) {
	one := func(c table.Column) *table.Table { return table.New(c) }
	for name, bad := range map[string]*table.Table{
		"no columns":    table.New(),
		"no name":       one(table.Column{Type: table.Text}),
		"type":          one(table.Column{Name: "a", Type: "int"}),
		"number":        one(table.Column{Name: "a", Type: table.Real, Cells: []table.Cell{table.Str("x")}}),
		"control":       one(table.Column{Name: "a", Type: table.Text, Cells: []table.Cell{table.Str("x\r")}}),
		"doubled":       table.New(table.Column{Name: "a", Type: table.Text}, table.Column{Name: "a", Type: table.Text}),
		"unequal":       table.New(table.Column{Name: "a", Type: table.Text}, table.Column{Name: "b", Type: table.Text, Cells: []table.Cell{{}}}),
		"meta of a map": {Meta: []table.KV{{Key: "a", Value: map[string]int{}}}, Cols: []table.Column{{Name: "a", Type: table.Text}}},
	} {
		var b bytes.Buffer
		for _, write := range []func() error{func() error { return bad.WriteECSV(&b) }, func() error { return bad.WriteCSV(&b) }, func() error { return bad.WriteJSON(&b) }, func() error { return bad.WriteText(&b, table.TextOptions{}) }} {
			if err := write(); err == nil || b.Len() > 0 {
				t.Errorf("%s: written (%v, %d bytes)", name, err, b.Len())
			}
		}
	}
}

func TestJSON(t *testing.T) {
	tab := sample()
	tab.Cols[5].Cells[1] = table.Num("nan")
	tab.Cols[6].Cells[1] = table.Num("+.5")
	tab.Cols[3].Cells[0] = table.Num("007")
	var b bytes.Buffer
	if err := tab.WriteJSON(&b); err != nil {
		t.Fatal(err)
	}
	var got struct {
		Meta    map[string]any
		Columns []map[string]string
		Rows    []map[string]any
	}
	if err := json.Unmarshal(b.Bytes(), &got); err != nil {
		t.Fatalf("%v\n%s", err, &b)
	}
	if got.Meta["limit_sigma"] != 3.0 || got.Columns[5]["unit"] != "dex(1 / cm2)" || len(got.Rows) != 3 {
		t.Errorf("read back %+v", got)
	}
	r := got.Rows[1]
	if r["logN"] != nil || r["logN_err"] != 0.5 || r["order"] != nil || got.Rows[0]["order"] != 7.0 || r["detected"] != true || r["note"] != nil || r["object"] != "#1 of two" {
		t.Errorf("row %+v", r)
	}
	if !strings.Contains(b.String(), `"lambda_vac_A": 3934.7750,`) {
		t.Errorf("the printed digits are lost:\n%s", &b)
	}
}

func TestText(t *testing.T) {
	for _, width := range []int{0, 24, 40, 60, 100} {
		for _, ascii := range []bool{false, true} {
			var b bytes.Buffer
			if err := sample().WriteText(&b, table.TextOptions{Width: width, ASCII: ascii}); err != nil {
				t.Fatal(err)
			}
			for _, line := range strings.Split(b.String(), "\n") {
				if n := len([]rune(line)); width > 0 && n > width {
					t.Errorf("width %d: a line of %d: %q", width, n, line)
				}
				for _, r := range line {
					if ascii && r > 126 {
						t.Errorf("not ASCII: %q", line)
					}
				}
			}
			for _, want := range []string{"3934.7750", "11.842", "0.015", "upper", "10.18"} {
				if !strings.Contains(b.String(), want) {
					t.Errorf("width %d: %s is lost:\n%s", width, want, &b)
				}
			}
		}
	}
	var b bytes.Buffer
	if err := sample().WriteText(&b, table.TextOptions{Width: 60}); err != nil {
		t.Fatal(err)
	}
	const want = `object       ion    lambda_vac_A  order  logN_kind
                        Angstrom
──────────────────────────────────────────────────
Lantern 07   Ca II     3934.7750     87  value
#1 of two    Na I      5891.5833         lower
 Lantern λ   K I                     -3  upper

object               logN  logN_err  detected  note
             dex(1 / cm2)       dex
───────────────────────────────────────────────────────────
Lantern 07         11.842     0.015  true      5" slit, go…
#1 of two           12.61            true
 Lantern λ          10.18            false     a
`
	if b.String() != want {
		t.Errorf("got\n%s\nwant\n%s", &b, want)
	}
}
