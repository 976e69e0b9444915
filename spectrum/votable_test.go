package spectrum

import (
	"bytes"
	"encoding/base64"
	"encoding/binary"
	"math"
	"strings"
	"testing"

	"lacuna/internal/oops"
	"lacuna/spectrum/fits"
	"lacuna/spectrum/frame"
)

const votHead = `<?xml version="1.0"?>
<VOTABLE version="1.4" xmlns="http://www.ivoa.net/xml/VOTable/v1.3"><RESOURCE>
<PARAM name="f" utype="spec:Spectrum.CoordSys.SpectralFrame.RefPos" datatype="char" arraysize="*" value="HELIOCENTER"/>
<PARAM name="o" utype="spec:Spectrum.Target.Name" datatype="char" arraysize="*" value="Lantern 1"/>
<PARAM name="p" utype="spec:Spectrum.Target.Pos" datatype="double" arraysize="2" value="312.25 -44.5"/>
`

// votDocument wraps fields and data.
func votDocument(fields, data string) string {
	return votHead + "<TABLE name=\"t\">" + fields + "<DATA>" + data + "</DATA></TABLE></RESOURCE></VOTABLE>"
}

const votFields = `<FIELD name="x" datatype="double" unit="nm" ucd="em.wl;obs.atmos"/><FIELD name="b" datatype="boolean"/><FIELD name="text" datatype="char" arraysize="*"/>
<FIELD name="y" datatype="float" unit="adu" ucd="phot.flux.density;em.wl"/><FIELD name="q" datatype="short" ucd="meta.code.qual"><VALUES null="-1"/></FIELD>`

// votRows is the same three rows in binary: 500, 500.1, 500.2 nm; 1, missing, 3; 0, 0, null.
func votRows(flags bool) string {
	var b []byte
	for i, y := range []float32{1, float32(math.NaN()), 3} {
		if flags { // the third cell of quality is null by its bit, not its value
			b = append(b, []byte{0, 0, 0b00001000}[i])
		}
		b = binary.BigEndian.AppendUint64(b, math.Float64bits(500+0.1*float64(i)))
		b = append(b, 'T')
		b = binary.BigEndian.AppendUint32(b, uint32(i)) // text of i letters
		b = append(b, bytes.Repeat([]byte("z"), i)...)
		b = binary.BigEndian.AppendUint32(b, math.Float32bits(y))
		q := []int16{0, 0, -1}[i]
		if flags && i == 2 {
			q = 0
		}
		b = binary.BigEndian.AppendUint16(b, uint16(q))
	}
	text := base64.StdEncoding.EncodeToString(b)
	return `<STREAM encoding="base64">` + "\n" + text[:20] + "\n  " + text[20:] + "\n</STREAM>"
}

// The same rows in every encoding: air nm of the heliocentre, pixel 2 without flux,
// pixel 3 without quality.
func TestVOTableEncodings(t *testing.T) {
	rows := `<TR><TD>500</TD><TD>T</TD><TD/><TD>1</TD><TD>0</TD></TR><TR><TD>500.1</TD><TD>true</TD><TD>z</TD><TD></TD><TD>0</TD></TR><TR><TD>500.2</TD><TD>1</TD><TD>zz</TD><TD>3.0</TD><TD>-1</TD></TR>`
	for name, doc := range map[string]string{
		"TABLEDATA": votDocument(votFields, "<TABLEDATA>"+rows+"</TABLEDATA>"),
		"comments":  votDocument("<DESCRIPTION>a <![CDATA[<b>]]></DESCRIPTION><!-- c -->"+votFields, "<TABLEDATA><!-- c -->"+rows+"</TABLEDATA>"),
		"BINARY":    votDocument(votFields, "<BINARY>"+votRows(false)+"</BINARY>"),
		"BINARY2":   votDocument(votFields, "<BINARY2>"+votRows(true)+"</BINARY2>"),
		"Latin-1":   strings.Replace(votDocument(votFields+"<DESCRIPTION>\xc5</DESCRIPTION>", "<TABLEDATA>"+rows+"</TABLEDATA>"), `version="1.0"`, `version="1.0" encoding="ISO-8859-1"`, 1),
		"no header": strings.TrimPrefix(votDocument(votFields, "<TABLEDATA>"+rows+"</TABLEDATA>"), `<?xml version="1.0"?>`),
	} {
		s, err := read(fits.FromBytes("a.vot", []byte(doc)), Options{})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		g := &s.Segments[0]
		if s.Layout != layoutVOTable || s.Object != "Lantern 1" || s.Coord == nil || *s.Coord != (Coord{312.25, -44.5}) || len(g.Wave) != 3 {
			t.Errorf("%s: %s of %s at %v, %d pixels", name, s.Layout, s.Object, s.Coord, len(g.Wave))
			continue
		}
		if !(math.Abs(g.Wave[1]-5001) < 1e-9) || g.Flux[2] != 3 || g.Mask[0].Bad() || !g.Mask[1].Bad() || !g.Mask[2].Bad() || g.Medium != frame.Air || g.Frame != frame.Heliocent || g.Unit != "adu" {
			t.Errorf("%s: %v %v %v, %s, %s, %s", name, g.Wave, g.Flux, g.Mask, g.Medium, g.Frame, g.Unit)
		}
	}
}

// A row of arrays is a segment; sizes fixed, free, and by dimensions. Orders are
// told apart by their column.
func TestVOTableArraysAndOrders(t *testing.T) {
	wave := `<FIELD name="wave" datatype="double" unit="Angstrom" arraysize="3"/>`
	for name, doc := range map[string]string{
		"fixed": votDocument(wave+`<FIELD name="flux" datatype="float" arraysize="3"/>`,
			"<TABLEDATA><TR><TD>4000 4001 4002</TD><TD>1 2 3</TD></TR><TR><TD>5000 5001 5002</TD><TD>4 NaN 6</TD></TR></TABLEDATA>"),
		"free": votDocument(`<FIELD name="wave" datatype="double" unit="Angstrom" arraysize="*"/><FIELD name="flux" datatype="float" arraysize="9*"/>`,
			"<TABLEDATA><TR><TD>4000 4001 4002</TD><TD>1 2 3</TD></TR><TR><TD> 5000 5001\n5002 </TD><TD>4 NaN 6</TD></TR></TABLEDATA>"),
		"dimensions": votDocument(strings.Replace(wave, `"3"`, `"1x3"`, 1)+`<FIELD name="flux" datatype="float" arraysize="3x*"/>`,
			"<TABLEDATA><TR><TD>4000 4001 4002</TD><TD>1 2 3</TD></TR><TR><TD>5000 5001 5002</TD><TD>4 NaN 6</TD></TR></TABLEDATA>"),
		"orders": votDocument(`<FIELD name="order" datatype="int"/><FIELD name="wave" datatype="double" unit="Angstrom"/><FIELD name="flux" datatype="float"/>`,
			"<TABLEDATA>"+strings.ReplaceAll(strings.ReplaceAll("7,4000,1 7,4001,2 7,4002,3 8,5000,4 8,5001, 8,5002,6 ", " ", "</TD></TR>"), ",", "</TD><TD>")+"</TABLEDATA>"),
	} {
		if name == "orders" {
			doc = strings.ReplaceAll(strings.ReplaceAll(doc, "<TABLEDATA>7", "<TABLEDATA><TR><TD>7"), "</TR>7", "</TR><TR><TD>7")
			doc = strings.ReplaceAll(doc, "</TR>8", "</TR><TR><TD>8")
		}
		s, err := read(fits.FromBytes("a.vot", []byte(doc)), Options{})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if len(s.Segments) != 2 || s.Segments[1].Wave[0] != 5000 || s.Segments[1].Flux[2] != 6 || !s.Segments[1].Mask[1].Bad() || name == "orders" && s.Segments[1].Order != 8 {
			t.Errorf("%s: %+v", name, s.Segments)
		}
		if one, err := read(fits.FromBytes("a.vot", []byte(doc)), Options{Row: 2}); err != nil || len(one.Segments) != 1 || one.Segments[0].Wave[0] != 5000 {
			t.Errorf("%s: row 2: %v", name, err)
		}
	}
}

// A FITS stream inside, and a second table that is the spectrum.
func TestVOTableOthers(t *testing.T) {
	b := vectorTable(t, nil, fits.Vector{Name: "WAVE", Unit: "Angstrom", Type: 'D', Rows: [][]float64{{5000, 5001, 5002}}}, fits.Vector{Name: "FLUX", Type: 'D', Rows: [][]float64{{1, 2, 3}}})
	doc := votDocument("", `<FITS extnum="1"><STREAM encoding="base64">`+base64.StdEncoding.EncodeToString(b)+"</STREAM></FITS>")
	if s, err := read(fits.FromBytes("a.vot", []byte(doc)), Options{}); err != nil || s.Segments[0].Flux[2] != 3 || !strings.Contains(s.Layout, layoutVOTable) {
		t.Errorf("FITS inside: %v", err)
	}
	first := `<TABLE name="list"><FIELD name="id" datatype="int"/><DATA><TABLEDATA><TR><TD>1</TD></TR></TABLEDATA></DATA></TABLE>`
	doc = strings.Replace(votDocument(votFields, "<BINARY>"+votRows(false)+"</BINARY>"), "<TABLE", first+"<TABLE", 1)
	for _, hdu := range []string{"", "1", "T"} {
		if s, err := read(fits.FromBytes("a.vot", []byte(doc)), Options{HDU: hdu}); err != nil || len(s.Segments[0].Wave) != 3 {
			t.Errorf("table %q: %v", hdu, err)
		}
	}
	if _, err := read(fits.FromBytes("a.vot", []byte(doc)), Options{HDU: "0"}); !oops.IsInput(err) || !strings.Contains(err.Error(), "list: 1 rows, columns id") {
		t.Errorf("table 0: %v", err)
	}
	// A frequency axis is in vacuum: 6e14 Hz is c/6e14 = 4996.540967 Å.
	doc = votDocument(`<FIELD name="nu" datatype="double" unit="Hz" ucd="em.freq"/><FIELD name="flux" datatype="float"/>`,
		"<TABLEDATA><TR><TD>6.0e14</TD><TD>1</TD></TR><TR><TD>6.1e14</TD><TD>2</TD></TR></TABLEDATA>")
	s, err := read(fits.FromBytes("a.vot", []byte(doc)), Options{})
	if err != nil || !(math.Abs(s.Segments[0].Wave[1]-2.99792458e18/6e14) < 1e-6) || s.Segments[0].Medium != frame.Vacuum {
		t.Errorf("frequency: %v, %+v", err, s)
	}
}

func TestVOTableRefused(t *testing.T) {
	row := "<TR><TD>500</TD><TD>T</TD><TD/><TD>1</TD><TD>0</TD></TR>"
	good := votDocument(votFields, "<TABLEDATA>"+row+row+"</TABLEDATA>")
	for name, tc := range map[string]struct{ doc, want string }{
		"cut":             {good[:len(good)-30], "line"},
		"other XML":       {`<?xml version="1.0"?><kml/>`, "<kml>"},
		"damaged":         {strings.Replace(good, "</TD>", "</TX>", 1), "XML is damaged"},
		"number":          {strings.Replace(good, ">500<", ">5OO<", 1), "'5OO' is not a number"},
		"cells":           {strings.Replace(good, "<TD>T</TD>", "", 1), "4 cells for 5 columns"},
		"more cells":      {strings.Replace(good, "<TD>T</TD>", "<TD>T</TD><TD>T</TD>", 1), "more than its 5"},
		"rows promised":   {strings.Replace(good, `name="t"`, `name="t" nrows="3"`, 1), "promises 3 rows and has 2"},
		"datatype":        {strings.Replace(good, `datatype="float"`, `datatype="half"`, 1), "half"},
		"arraysize":       {strings.Replace(good, `"text" datatype="char" arraysize="*"`, `"text" datatype="char" arraysize="-3"`, 1), "arraysize"},
		"wide":            {strings.Replace(good, `"text" datatype="char" arraysize="*"`, `"text" datatype="char" arraysize="99999x99999"`, 1), "arraysize"},
		"elsewhere":       {votDocument(votFields, `<BINARY><STREAM href="ftp://x/y.bin"/></BINARY>`), "ftp://x/y.bin"},
		"encoding":        {votDocument(votFields, `<BINARY><STREAM encoding="gzip">AA</STREAM></BINARY>`), "gzip"},
		"base64":          {votDocument(votFields, `<BINARY><STREAM encoding="base64">*</STREAM></BINARY>`), "base64"},
		"binary cut":      {votDocument(votFields, `<BINARY><STREAM encoding="base64">AAAA</STREAM></BINARY>`), "row 1"},
		"huge array":      {votDocument(votFields, `<BINARY><STREAM encoding="base64">`+base64.StdEncoding.EncodeToString(append(make([]byte, 9), 0x7f, 0xff, 0xff, 0xff))+`</STREAM></BINARY>`), "column text"},
		"no stream":       {votDocument(votFields, `<BINARY/>`), "STREAM"},
		"no rows":         {votDocument(votFields, "<TABLEDATA></TABLEDATA>"), "no rows"},
		"no columns":      {votDocument(`<FIELD name="a" datatype="int"/>`, "<TABLEDATA></TABLEDATA>"), "no table with a wavelength"},
		"service error":   {`<VOTABLE><RESOURCE><INFO name="QUERY_STATUS" value="ERROR">no</INFO></RESOURCE></VOTABLE>`, "answered with an error"},
		"charset":         {strings.Replace(good, `version="1.0"`, `version="1.0" encoding="EBCDIC"`, 1), "EBCDIC"},
		"text as numbers": {votDocument(strings.Replace(votFields, `name="x" datatype="double"`, `name="x" datatype="char"`, 1), "<TABLEDATA>"+row+row+"</TABLEDATA>"), "does not hold numbers"},
		"unit":            {strings.Replace(good, `"nm"`, `"acre"`, 1), "acre"},
		"deep":            {"<VOTABLE>" + strings.Repeat("<RESOURCE>", 200), "without end"},
	} {
		if _, err := read(fits.FromBytes("a.vot", []byte(tc.doc)), Options{}); !oops.IsInput(err) || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("%s: %v; want %q", name, err, tc.want)
		}
	}
}

func FuzzVOTable(f *testing.F) {
	f.Add(votDocument(votFields, "<TABLEDATA><TR><TD>500</TD><TD>T</TD><TD/><TD>1</TD><TD>0</TD></TR><TR><TD>501</TD><TD>T</TD><TD/><TD>1</TD><TD>0</TD></TR></TABLEDATA>"))
	f.Add(votDocument(votFields, "<BINARY>"+votRows(false)+"</BINARY>"))
	f.Add(votDocument(votFields, "<BINARY2>"+votRows(true)+"</BINARY2>"))
	f.Add(votDocument(`<FIELD name="wave" datatype="double" unit="nm" arraysize="2"/><FIELD name="flux" datatype="float" arraysize="*"/>`, "<TABLEDATA><TR><TD>500 501</TD><TD>1 2</TD></TR></TABLEDATA>"))
	f.Add(votDocument("", `<FITS><STREAM encoding="base64">U0lNUExF</STREAM></FITS>`))
	f.Fuzz(func(t *testing.T, doc string) {
		if text := strings.TrimSpace(doc); strings.HasPrefix(strings.ToLower(text), "<?xml") || strings.HasPrefix(strings.ToLower(text), "<votable") {
			fuzzRead(t, []byte(doc), Options{})
		}
	})
}
