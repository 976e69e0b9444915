package spectrum

import (
	"encoding/xml"
	"math"
	"strconv"
	"strings"
)

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
