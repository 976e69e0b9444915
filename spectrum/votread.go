package spectrum

import (
	"encoding/base64"
	"encoding/binary"
	"encoding/xml"
	"errors"
	"io"
	"maps"
	"math"
	"strconv"
	"strings"
)

// A votReader walks through the XML.
type votReader struct {
	r      *reader
	d      *xml.Decoder
	params map[string]string // by utype in lower case, of the resource
	tables []votTable
}

// bytes of one value by datatype; bits count apart.
var votSize = map[string]int{"boolean": 1, "unsignedbyte": 1, "char": 1, "short": 2, "unicodechar": 2, "int": 4, "float": 4, "long": 8, "double": 8, "floatcomplex": 8, "doublecomplex": 16}

func (v *votReader) fail(fix, format string, a ...any) error {
	line, _ := v.d.InputPos()
	return v.r.fail(line, fix, format, a...)
}

func attribute(e xml.StartElement, name string) string {
	for _, a := range e.Attr {
		if strings.EqualFold(a.Name.Local, name) {
			return strings.TrimSpace(a.Value)
		}
	}
	return ""
}

// next returns the next element that begins, or nil at the end of the one around.
func (v *votReader) next() (*xml.StartElement, error) {
	for {
		t, err := v.d.Token()
		if err != nil {
			return nil, v.xmlError(err)
		}
		switch t := t.(type) {
		case xml.StartElement:
			return &t, nil
		case xml.EndElement:
			return nil, nil
		}
	}
}

func (v *votReader) skip() error {
	if err := v.d.Skip(); err != nil {
		return v.xmlError(err)
	}
	return nil
}

// document reads all tables.
func (v *votReader) document() error {
	root, err := v.next()
	if err != nil {
		return err
	}
	if root == nil || !strings.EqualFold(root.Name.Local, "VOTABLE") {
		name := ""
		if root != nil {
			name = root.Name.Local
		}
		return v.fail("give a VOTable, FITS or text", "an XML document of <%.40s>, not a VOTable", name)
	}
	if err := v.inside(0); err != nil {
		return err
	}
	for {
		if _, err := v.d.Token(); errors.Is(err, io.EOF) {
			return nil
		} else if err != nil {
			return v.xmlError(err)
		}
	}
}

// inside walks through RESOURCE and GROUP elements for tables and parameters.
func (v *votReader) inside(depth int) error {
	for {
		e, err := v.next()
		if err != nil || e == nil {
			return err
		}
		switch strings.ToUpper(e.Name.Local) {
		case "RESOURCE", "GROUP":
			if depth > 50 {
				return v.fail("fetch the file again", "elements inside each other without end")
			}
			if err := v.inside(depth + 1); err != nil {
				return err
			}
			continue
		case "PARAM":
			v.param(*e, v.params)
		case "INFO":
			if sameText(attribute(*e, "name"), "QUERY_STATUS") && sameText(attribute(*e, "value"), "ERROR") {
				return v.fail("repeat the query", "the service answered with an error, not with data")
			}
		case "TABLE":
			if len(v.tables) == 1000 {
				return v.fail("take the file apart", "more than 1000 tables")
			}
			if err := v.table(*e); err != nil {
				return err
			}
			continue
		}
		if err := v.skip(); err != nil {
			return err
		}
	}
}

func (v *votReader) param(e xml.StartElement, into map[string]string) {
	if u := strings.ToLower(attribute(e, "utype")); u != "" && len(into) < 10000 {
		into[u] = attribute(e, "value")
	}
}

// table reads one TABLE.
func (v *votReader) table(start xml.StartElement) error {
	t := votTable{name: attribute(start, "name"), params: maps.Clone(v.params), said: -1}
	if n := attribute(start, "nrows"); n != "" {
		var err error
		if t.said, err = strconv.Atoi(n); err != nil || t.said < 0 {
			return v.fail("correct the file", "nrows='%.40s' is no number of rows", n)
		}
	}
	if err := v.tableInside(&t, 0); err != nil {
		return err
	}
	if t.said >= 0 && t.fits == nil && t.said != t.rows {
		return v.fail("fetch the file again", "table %s promises %d rows and has %d", t.name, t.said, t.rows)
	}
	v.tables = append(v.tables, t)
	return nil
}

func (v *votReader) tableInside(t *votTable, depth int) error {
	for {
		e, err := v.next()
		if err != nil || e == nil {
			return err
		}
		switch strings.ToUpper(e.Name.Local) {
		case "FIELD":
			if len(t.fields) == 999 {
				return v.fail("cut out what you need", "more than 999 columns")
			}
			if err := v.field(*e, t); err != nil {
				return err
			}
			continue
		case "GROUP":
			if depth > 50 {
				return v.fail("fetch the file again", "elements inside each other without end")
			}
			if err := v.tableInside(t, depth+1); err != nil {
				return err
			}
			continue
		case "PARAM":
			v.param(*e, t.params)
		case "DATA":
			if err := v.data(t); err != nil {
				return err
			}
			continue
		}
		if err := v.skip(); err != nil {
			return err
		}
	}
}

// field reads a FIELD and its VALUES.
func (v *votReader) field(e xml.StartElement, t *votTable) error {
	f := votField{name: attribute(e, "name"), id: attribute(e, "ID"), ucd: attribute(e, "ucd"), utype: attribute(e, "utype"), unit: attribute(e, "unit"),
		kind: strings.ToLower(attribute(e, "datatype")), size: 1}
	if f.name == "" {
		f.name = f.id
	}
	if votSize[f.kind] == 0 && f.kind != "bit" {
		return v.fail("correct the file", "column %s: datatype '%.40s' is not known", f.name, f.kind)
	}
	if a := attribute(e, "arraysize"); a != "" && a != "1" {
		f.array = true
		for dims := strings.Split(a, "x"); len(dims) > 0; dims = dims[1:] {
			if len(dims) == 1 && strings.HasSuffix(dims[0], "*") {
				f.size = -1
				break
			}
			n, err := strconv.Atoi(dims[0])
			if err != nil || n < 1 || n > 1<<30/f.size {
				return v.fail("correct the file", "column %s: arraysize '%.40s' is not a size", f.name, a)
			}
			f.size *= n
		}
	}
	for {
		in, err := v.next()
		if err != nil {
			return err
		}
		if in == nil {
			break
		}
		if null := attribute(*in, "null"); strings.EqualFold(in.Name.Local, "VALUES") && null != "" {
			if n, err := strconv.ParseInt(null, 0, 64); err == nil {
				f.null = &n
			}
		}
		if err := v.skip(); err != nil {
			return err
		}
	}
	t.fields = append(t.fields, f)
	return nil
}

// data reads the rows.
func (v *votReader) data(t *votTable) error {
	for {
		e, err := v.next()
		if err != nil || e == nil {
			return err
		}
		switch kind := strings.ToUpper(e.Name.Local); kind {
		case "TABLEDATA":
			err = v.tableData(t)
		case "BINARY", "BINARY2":
			var b []byte
			if b, err = v.stream(); err == nil {
				err = v.binary(t, b, kind == "BINARY2")
			}
		case "FITS":
			t.fits, err = v.stream()
		default:
			err = v.skip()
		}
		if err != nil {
			return err
		}
	}
}

// text reads the characters up to the end of an element; elements in it are errors.
func (v *votReader) text() (string, error) {
	var b strings.Builder
	for {
		t, err := v.d.Token()
		if err != nil {
			return "", v.xmlError(err)
		}
		switch t := t.(type) {
		case xml.CharData:
			b.Write(t)
		case xml.EndElement:
			return b.String(), nil
		case xml.StartElement:
			return "", v.fail("correct the file", "<%.40s> where a value should stand", t.Name.Local)
		}
	}
}

// tableData reads rows of TD elements.
func (v *votReader) tableData(t *votTable) error {
	for {
		e, err := v.next()
		if err != nil || e == nil {
			return err
		}
		if !strings.EqualFold(e.Name.Local, "TR") {
			return v.fail("correct the file", "<%.40s> where a row should stand", e.Name.Local)
		}
		for k := 0; ; k++ {
			td, err := v.next()
			if err != nil {
				return err
			}
			if td == nil {
				if k != len(t.fields) {
					return v.fail("correct the file", "row %d has %d cells for %d columns", t.rows+1, k, len(t.fields))
				}
				break
			}
			if k >= len(t.fields) || !strings.EqualFold(td.Name.Local, "TD") {
				return v.fail("correct the file", "row %d has more than its %d cells, or <%.40s> in it", t.rows+1, len(t.fields), td.Name.Local)
			}
			text, err := v.text()
			if err != nil {
				return err
			}
			if err := v.cell(&t.fields[k], text, t.rows+1); err != nil {
				return err
			}
		}
		t.rows++
	}
}

// cell reads the text of one cell of numbers.
func (v *votReader) cell(f *votField, text string, row int) error {
	if f.kind == "char" || f.kind == "unicodechar" || strings.HasSuffix(f.kind, "complex") {
		return nil
	}
	if !f.array {
		x, err := v.number(f, strings.TrimSpace(text), row)
		f.values = append(f.values, x)
		return err
	}
	words := strings.Fields(text)
	if f.size > 0 && len(words) != f.size {
		if len(words) > 0 {
			return v.fail("correct the file", "row %d: column %s has %d values, %d are promised", row, f.name, len(words), f.size)
		}
		for range f.size {
			f.values = append(f.values, math.NaN())
		}
		return nil
	}
	for _, w := range words {
		x, err := v.number(f, w, row)
		if err != nil {
			return err
		}
		f.values = append(f.values, x)
	}
	if f.size < 0 {
		f.ends = append(f.ends, len(f.values))
	}
	return nil
}

// number reads one value; empty ones and the null value are NaN.
func (v *votReader) number(f *votField, word string, row int) (float64, error) {
	x, ok := cell(word)
	switch {
	case f.kind == "boolean":
		switch strings.ToLower(word) {
		case "t", "true", "1":
			return 1, nil
		case "f", "false", "0":
			return 0, nil
		}
		return math.NaN(), nil
	case !ok && f.kind != "float" && f.kind != "double" && strings.HasPrefix(strings.ToLower(word), "0x"):
		n, err := strconv.ParseInt(word[2:], 16, 64)
		x, ok = float64(n), err == nil
	}
	if !ok {
		return 0, v.fail("write a number, or nothing where it is missing", "row %d: column %s: '%.40s' is not a number", row, f.name, word)
	}
	if f.null != nil && x == float64(*f.null) {
		return math.NaN(), nil
	}
	return x, nil
}

// stream reads the bytes of a STREAM: base64 inside the document.
func (v *votReader) stream() ([]byte, error) {
	var out []byte
	found := false
	for {
		e, err := v.next()
		if err != nil {
			return nil, err
		}
		if e == nil {
			if !found {
				return nil, v.fail("fetch the file again", "binary data without a STREAM")
			}
			return out, nil
		}
		if !strings.EqualFold(e.Name.Local, "STREAM") {
			if err := v.skip(); err != nil {
				return nil, err
			}
			continue
		}
		if href := attribute(*e, "href"); href != "" {
			return nil, v.fail("fetch them and the table into one file", "the data lie elsewhere: %.200s", href)
		}
		if enc := attribute(*e, "encoding"); !strings.EqualFold(enc, "base64") {
			return nil, v.fail("save it with TABLEDATA or base64", "a STREAM with encoding '%.40s' is not read", enc)
		}
		text, err := v.text()
		if err != nil {
			return nil, err
		}
		// The decoder passes over line breaks, not over blanks.
		b, err := base64.StdEncoding.DecodeString(strings.Join(strings.Fields(text), ""))
		if err != nil {
			return nil, v.fail("fetch the file again", "the base64 data are damaged: %v", err)
		}
		out, found = append(out, b...), true
	}
}

// binary reads rows of big-endian values. In BINARY2 each row begins with bits
// that mark its null cells.
func (v *votReader) binary(t *votTable, b []byte, flags bool) error {
	short := func(f *votField) error {
		return v.fail("fetch the file again", "the binary data end in row %d, column %s", t.rows+1, f.name)
	}
	if len(t.fields) == 0 {
		return v.fail("fetch the file again", "binary data without columns")
	}
	for len(b) > 0 {
		var nulls []byte
		if flags {
			n := (len(t.fields) + 7) / 8
			if len(b) < n {
				return short(&t.fields[0])
			}
			nulls, b = b[:n], b[n:]
		}
		width := len(b)
		for k := range t.fields {
			f := &t.fields[k]
			n := f.size
			if n < 0 {
				if len(b) < 4 {
					return short(f)
				}
				n, b = int(binary.BigEndian.Uint32(b)), b[4:]
			}
			size := n * votSize[f.kind]
			if f.kind == "bit" {
				size = (n + 7) / 8
			}
			if n < 0 || size < 0 || n > 8*len(b) || size > len(b) {
				return short(f)
			}
			null := nulls != nil && nulls[k/8]>>(7-k%8)&1 == 1
			f.decode(b[:size], n, null)
			b = b[size:]
		}
		if width == len(b) && !flags {
			return v.fail("fetch the file again", "rows without bytes")
		}
		t.rows++
	}
	return nil
}

// decode appends the n values of a cell; text and complex numbers are passed over.
func (f *votField) decode(b []byte, n int, null bool) {
	size := votSize[f.kind]
	for i := range n {
		x := math.NaN()
		var p []byte
		if f.kind != "bit" {
			p = b[i*size:]
		}
		whole := func(k int64) {
			if x = float64(k); f.null != nil && k == *f.null {
				x = math.NaN()
			}
		}
		switch f.kind {
		case "boolean":
			switch p[0] {
			case 'T', 't', '1':
				x = 1
			case 'F', 'f', '0':
				x = 0
			}
		case "bit":
			x = float64(b[i/8] >> (7 - i%8) & 1)
		case "unsignedbyte":
			whole(int64(p[0]))
		case "short":
			whole(int64(int16(binary.BigEndian.Uint16(p))))
		case "int":
			whole(int64(int32(binary.BigEndian.Uint32(p))))
		case "long":
			whole(int64(binary.BigEndian.Uint64(p)))
		case "float":
			x = float64(math.Float32frombits(binary.BigEndian.Uint32(p)))
		case "double":
			x = math.Float64frombits(binary.BigEndian.Uint64(p))
		default:
			return
		}
		if null {
			x = math.NaN()
		}
		f.values = append(f.values, x)
	}
	if f.size < 0 {
		f.ends = append(f.ends, len(f.values))
	}
}
