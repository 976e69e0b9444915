package table

import (
	"bufio"
	"bytes"
	"encoding/json"
	"io"
	"math"
	"strconv"
	"strings"
)

// WriteJSON writes one object: "meta" (an object in the order of Meta), "columns"
// (name, unit, datatype, description) and "rows" (one object a row, keys in
// column order). Missing cells, NaN and infinities are null. Numbers keep the
// digits of the table.
func (t *Table) WriteJSON(w io.Writer) error {
	if err := t.Check(); err != nil {
		return err
	}
	b := bufio.NewWriter(w)
	b.WriteString("{\n\"meta\": " + jsonValue(t.Meta) + ",\n\"columns\": [\n")
	for i := range t.Cols {
		c := &t.Cols[i]
		b.WriteString(`  {"name": ` + jsonString(c.Name))
		if c.Unit != "" {
			b.WriteString(`, "unit": ` + jsonString(c.Unit))
		}
		b.WriteString(`, "datatype": ` + jsonString(string(c.Type)))
		if c.Description != "" {
			b.WriteString(`, "description": ` + jsonString(c.Description))
		}
		b.WriteString("}" + comma(i, len(t.Cols)) + "\n")
	}
	b.WriteString("],\n\"rows\": [\n")
	for j := range t.Rows() {
		b.WriteString("  {")
		for i := range t.Cols {
			if i > 0 {
				b.WriteString(", ")
			}
			b.WriteString(jsonString(t.Cols[i].Name) + ": " + jsonCell(t.Cols[i].Cells[j], t.Cols[i].Type))
		}
		b.WriteString("}" + comma(j, t.Rows()) + "\n")
	}
	b.WriteString("]\n}\n")
	return b.Flush()
}

func comma(i, n int) string {
	if i < n-1 {
		return ","
	}
	return ""
}

func jsonCell(c Cell, t Type) string {
	if !c.Set {
		return "null"
	}
	switch t {
	case Text:
		return jsonString(c.Text)
	case Integer:
		n, _ := parseInt(c.Text)
		return strconv.FormatInt(n, 10)
	case Real:
		if json.Valid([]byte(c.Text)) { // keeps 11.840 as it is printed; "null" is no number here
			return c.Text
		}
		x, _ := parseFloat(c.Text)
		return jsonFloat(x)
	}
	return c.Text // true, false
}

func jsonFloat(x float64) string {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return "null"
	}
	return strconv.FormatFloat(x, 'g', -1, 64)
}

func jsonString(s string) string {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	if err := e.Encode(s); err != nil {
		panic("table: jsonString: " + err.Error()) // text cannot fail
	}
	return strings.TrimSuffix(b.String(), "\n")
}

func jsonValue(v any) string {
	list := func(n int, item func(int) string) string { return yamlList(n, item) } // [a, b] in both
	switch v := v.(type) {
	case nil:
		return "null"
	case float64:
		return jsonFloat(v)
	case string:
		return jsonString(v)
	case []string:
		return list(len(v), func(i int) string { return jsonString(v[i]) })
	case []float64:
		return list(len(v), func(i int) string { return jsonFloat(v[i]) })
	case []any:
		return list(len(v), func(i int) string { return jsonValue(v[i]) })
	case []KV:
		parts := make([]string, len(v))
		for i, kv := range v {
			parts[i] = jsonString(kv.Key) + ": " + jsonValue(kv.Value)
		}
		return "{" + strings.Join(parts, ", ") + "}"
	}
	return yamlValue(v) // bool and whole numbers are alike
}
