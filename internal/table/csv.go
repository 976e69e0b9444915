package table

import (
	"bufio"
	"fmt"
	"io"
	"regexp"
	"strings"

	"lacuna/internal/oops"
)

// WriteCSV writes the table as RFC 4180 text with LF line ends: one line of
// names, then the rows. Missing is an empty field, empty text is "". Units,
// types and metadata are not written.
func (t *Table) WriteCSV(w io.Writer) error {
	if err := t.Check(); err != nil {
		return err
	}
	b := bufio.NewWriter(w)
	t.writeRows(b, func(c Cell, _ Type) string { return quote(c) })
	return b.Flush()
}

// writeRows writes the line of names and the rows, separated by commas.
func (t *Table) writeRows(b *bufio.Writer, show func(Cell, Type) string) {
	for i := range t.Cols {
		if i > 0 {
			b.WriteByte(',')
		}
		b.WriteString(quote(Str(t.Cols[i].Name)))
	}
	b.WriteByte('\n')
	for j := range t.Rows() {
		for i := range t.Cols {
			if i > 0 {
				b.WriteByte(',')
			}
			s := show(t.Cols[i].Cells[j], t.Cols[i].Type)
			if s == "" && len(t.Cols) == 1 {
				s = `""` // a blank line would not count as a row
			}
			b.WriteString(s)
		}
		b.WriteByte('\n')
	}
}

// A unit in a name: "Wavelength (nm)", "logN [dex(1 / cm2)]".
var (
	unitRound  = regexp.MustCompile(`^([^()\[\]]*[^()\[\]\s])\s*\(([^()]+)\)$`)
	unitSquare = regexp.MustCompile(`^([^()\[\]]*[^()\[\]\s])\s*\[([^\[\]]+)\]$`)
)

// ReadCSV reads RFC 4180 text: any line ends, a byte order mark, lines that begin
// with #, a line of names that may carry units in brackets, then rows of as many
// fields. A column whose every cell is a whole number, a number, or true and
// false gets that type, all others are text; an empty field is missing. In a
// table of one column an empty field of a number column is written "".
// file is for messages.
func ReadCSV(r io.Reader, file string) (*Table, error) {
	raw, err := io.ReadAll(r)
	if err != nil {
		return nil, fmt.Errorf("reading %s: %w", file, err)
	}
	data, err := normalise(raw, file)
	if err != nil {
		return nil, err
	}
	recs, err := scan(data, ',', file, 1)
	if err != nil {
		return nil, err
	}
	if len(recs) == 0 {
		return nil, oops.Input(file, "", "no table here: every line is blank or a comment", "the first line must name the columns")
	}
	t := &Table{File: file}
	for _, f := range recs[0].fields {
		c := Column{Name: strings.TrimSpace(f.text)}
		for _, re := range []*regexp.Regexp{unitRound, unitSquare} {
			if m := re.FindStringSubmatch(c.Name); m != nil && strings.TrimSpace(m[2]) != "" {
				c.Name, c.Unit = strings.TrimSpace(m[1]), strings.TrimSpace(m[2])
				break
			}
		}
		t.Cols = append(t.Cols, c)
	}
	if err := t.checkNames(recs[0].line); err != nil {
		return nil, err
	}
	if err := t.fill(recs[1:]); err != nil {
		return nil, err
	}
	for i := range t.Cols {
		t.Cols[i].infer()
	}
	return t, nil
}

// checkNames refuses names that are empty, doubled or not one line of text.
func (t *Table) checkNames(line int) error {
	seen := make(map[string]int, len(t.Cols))
	for i, c := range t.Cols {
		where := fmt.Sprintf("line %d, column %d", line, i+1)
		if c.Name == "" {
			return oops.Input(t.File, where, "the column has no name", "name every column in the first line")
		}
		if why := badText(c.Name, false); why != "" {
			return oops.Input(t.File, where, why, "use plain names")
		}
		if first, twice := seen[c.Name]; twice {
			return oops.Inputf(t.File, where, "give each column a name of its own", "the name %q already stands in column %d", c.Name, first)
		}
		seen[c.Name] = i + 1
	}
	return nil
}

// fill takes records as rows of cells; types are not looked at.
func (t *Table) fill(recs []record) error {
	for i := range t.Cols {
		t.Cols[i].Cells = make([]Cell, len(recs))
	}
	t.Lines = make([]int, len(recs))
	for j, rec := range recs {
		t.Lines[j] = rec.line
		if len(rec.fields) != len(t.Cols) {
			return oops.Inputf(t.File, fmt.Sprintf("line %d", rec.line), "leave a field empty where nothing was measured, and quote fields that hold the delimiter",
				"%d fields, expected %d (%s)", len(rec.fields), len(t.Cols), t.nameList())
		}
		for i, f := range rec.fields {
			t.Cols[i].Cells[j] = Cell{f.text, f.text != "" || f.quoted}
		}
	}
	return nil
}

func (t *Table) nameList() string {
	var names []string
	for i, c := range t.Cols {
		if i == 6 {
			names = append(names, "…")
			break
		}
		names = append(names, c.Name)
	}
	return strings.Join(names, ", ")
}

// infer gives a column of a file without types the narrowest one that all its
// cells have.
func (c *Column) infer() {
	some := false
	whole, number, truth := true, true, true
	for _, cell := range c.Cells {
		if cell.Text == "" {
			continue // missing, or empty text: "" in a number column is missing too
		}
		some = true
		if whole {
			_, whole = parseInt(cell.Text)
		}
		if number {
			_, number = parseFloat(cell.Text)
		}
		if truth {
			w := strings.ToLower(cell.Text)
			truth = w == "true" || w == "false"
		}
	}
	switch {
	case !some || !number && !truth:
		c.Type = Text
		return
	case whole:
		c.Type = Integer
	case number:
		c.Type = Real
	default:
		c.Type = Logical
	}
	for j := range c.Cells {
		if c.Cells[j].Text == "" {
			c.Cells[j] = Missing
		} else {
			c.Cells[j].Text = canonical(c.Cells[j].Text, c.Type)
		}
	}
}

// canonical writes what readers in other programs may not know in the usual way:
// D exponents as e, True as true.
func canonical(s string, t Type) string {
	switch t {
	case Real:
		s = strings.ToLower(s)
		if s != "nan" && !strings.HasSuffix(s, "inf") {
			s = strings.Replace(s, "d", "e", 1)
		}
	case Logical:
		s = strings.ToLower(s)
	}
	return s
}
