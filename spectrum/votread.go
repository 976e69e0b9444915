package spectrum

import (
	"encoding/xml"
	"errors"
	"io"
	"maps"
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
