package table

import (
	"bytes"
	"fmt"
	"io"
	"math"
	"regexp"
	"strings"

	"go.yaml.in/yaml/v3"

	"lacuna/internal/oops"
)

var nan = math.NaN()

var ecsvFirst = regexp.MustCompile(`^# %ECSV (\d+\.\d+)\s*$`)

// ReadECSV reads ECSV 0.9 or 1.0: delimiter comma or blank, metadata as a plain
// map or as !!omap, one value a cell. All whole-number types become int64, all
// reals float64. An empty field is missing; in a number column "" is too.
// file is for messages.
func ReadECSV(r io.Reader, file string) (*Table, error) {
	raw, err := io.ReadAll(r)
	if err != nil {
		return nil, fmt.Errorf("reading %s: %w", file, err)
	}
	data, err := normalise(raw, file)
	if err != nil {
		return nil, err
	}
	head, body, lines := splitHeader(data)
	first, _, _ := strings.Cut(string(data), "\n")
	m := ecsvFirst.FindStringSubmatch(first)
	if m == nil {
		return nil, oops.Inputf(file, "line 1", "", "found %q, expected # %%ECSV 1.0", shorten(first, 40))
	}
	if m[1] != "1.0" && m[1] != "0.9" {
		return nil, oops.Input(file, "line 1", "ECSV version "+m[1]+" is not known here", "save the table as ECSV 1.0")
	}
	t := &Table{File: file}
	delim, err := t.readHeader(head)
	if err != nil {
		return nil, err
	}
	recs, err := scan(body, delim, file, lines+1)
	if err != nil {
		return nil, err
	}
	if len(recs) == 0 {
		return nil, oops.Input(file, fmt.Sprintf("line %d", lines+1), "the line of column names is missing", "")
	}
	names := recs[0]
	where := fmt.Sprintf("line %d", names.line)
	if len(names.fields) != len(t.Cols) {
		return nil, oops.Inputf(file, where, "the line of names and the header must agree", "%d names, the header lists %d columns", len(names.fields), len(t.Cols))
	}
	for i, f := range names.fields {
		if f.text != t.Cols[i].Name {
			return nil, oops.Inputf(file, fmt.Sprintf("%s, column %d", where, i+1), "the line of names and the header must agree", "found the name %q, the header lists %q", f.text, t.Cols[i].Name)
		}
	}
	if err := t.checkNames(names.line); err != nil {
		return nil, err
	}
	if err := t.fill(recs[1:]); err != nil {
		return nil, err
	}
	for i := range t.Cols {
		c := &t.Cols[i]
		for j := range c.Cells {
			cell := &c.Cells[j]
			if c.Type == Text || !cell.Set {
				continue
			}
			if cell.Text == "" {
				*cell = Missing
				continue
			}
			cell.Text = canonical(cell.Text, c.Type)
			if why := misfit(cell.Text, c.Type); why != "" {
				return nil, oops.Inputf(file, t.Where(j)+", column "+c.Name, "leave the field empty where nothing was measured", "%s, expected %s", why, c.Type)
			}
		}
	}
	return t, nil
}

// splitHeader returns the YAML of the comment lines at the top, with as many line
// breaks as the file has, the rest, and the number of header lines.
func splitHeader(data []byte) (head, body []byte, lines int) {
	for bytes.HasPrefix(data, []byte("#")) {
		line, rest, _ := bytes.Cut(data, []byte("\n"))
		data = rest
		lines++
		switch text := line[1:]; {
		case bytes.HasPrefix(text, []byte("#")): // a comment inside the header
		case lines == 1: // %ECSV 1.0
		case bytes.HasPrefix(text, []byte(" ")):
			head = append(head, text[1:]...)
		default:
			head = append(head, text...)
		}
		head = append(head, '\n')
	}
	return head, data, lines
}

// readHeader fills columns and metadata from the YAML header.
func (t *Table) readHeader(head []byte) (delim byte, err error) {
	bad := func(n *yaml.Node, fix, format string, a ...any) error {
		where := "header"
		if n != nil && n.Line > 0 {
			where = fmt.Sprintf("line %d", n.Line)
		}
		return oops.Inputf(t.File, where, fix, format, a...)
	}
	var doc yaml.Node
	if err := yaml.Unmarshal(head, &doc); err != nil {
		return 0, bad(nil, "check the lines that begin with #", "the YAML header cannot be read: %s", strings.TrimPrefix(err.Error(), "yaml: "))
	}
	if len(doc.Content) != 1 || doc.Content[0].Kind != yaml.MappingNode {
		return 0, bad(nil, "", "the YAML header is not a mapping with the key datatype")
	}
	delim = ' '
	root := doc.Content[0]
	var list *yaml.Node
	for i := 0; i+1 < len(root.Content); i += 2 {
		key, val := root.Content[i], root.Content[i+1]
		switch key.Value {
		case "datatype", "columns":
			if list != nil {
				return 0, bad(key, "keep one", "the columns are listed twice")
			}
			list = val
		case "delimiter":
			if val.Value != "," && val.Value != " " {
				return 0, bad(val, "use ',' or ' '", "%q is not a delimiter of ECSV", val.Value)
			}
			delim = val.Value[0]
		case "meta":
			budget := 100000
			if t.Meta, err = metaOf(val, &budget); err != nil {
				return 0, bad(val, "", "meta: %v", err)
			}
		}
	}
	if list == nil || list.Kind != yaml.SequenceNode || len(list.Content) == 0 {
		return 0, bad(root, "", "the header has no list of columns under datatype")
	}
	for i, n := range list.Content {
		if n.Kind != yaml.MappingNode {
			return 0, bad(n, "", "column %d is not a mapping {name: …, datatype: …}", i+1)
		}
		c, why := columnOf(n)
		if why != "" {
			return 0, bad(n, "", "column %d: %s", i+1, why)
		}
		t.Cols = append(t.Cols, c)
	}
	return delim, nil
}

// columnOf reads one column of the header.
func columnOf(n *yaml.Node) (c Column, bad string) {
	for i := 0; i+1 < len(n.Content); i += 2 {
		key, val := n.Content[i].Value, n.Content[i+1]
		scalar := val.Kind == yaml.ScalarNode
		switch key {
		case "name", "unit", "datatype", "type", "format", "description":
			if !scalar {
				return c, key + " is not text"
			}
			if why := badText(val.Value, key == "description"); why != "" {
				return c, key + ": " + why
			}
		}
		switch key {
		case "name":
			c.Name = strings.TrimSpace(val.Value)
		case "unit":
			c.Unit = val.Value
		case "format":
			if val.Tag != "!!null" {
				c.Format = val.Value
			}
		case "description":
			c.Description = strings.Join(strings.Fields(val.Value), " ")
		case "subtype":
			return c, fmt.Sprintf("it holds arrays or objects (subtype %s); one value a cell is read here", val.Value)
		case "meta":
			for j := 0; j+1 < len(val.Content); j += 2 {
				if v := val.Content[j+1]; val.Kind == yaml.MappingNode && val.Content[j].Value == "ucd" && v.Kind == yaml.ScalarNode && badText(v.Value, false) == "" {
					c.UCD = v.Value
				}
			}
		case "datatype", "type":
			switch val.Value {
			case "int8", "int16", "int32", "int64", "uint8", "uint16", "uint32", "uint64":
				c.Type = Integer
			case "float16", "float32", "float64", "float128":
				c.Type = Real
			case "string":
				c.Type = Text
			case "bool":
				c.Type = Logical
			default:
				return c, fmt.Sprintf("datatype %q cannot be read here (bool, int, float and string types can)", val.Value)
			}
		}
	}
	if c.Name == "" {
		return c, "it has no name"
	}
	if c.Type == "" {
		return c, c.Name + " has no datatype"
	}
	return c, ""
}

func shorten(s string, n int) string {
	if r := []rune(s); len(r) > n {
		return string(r[:n-1]) + "…"
	}
	return s
}
