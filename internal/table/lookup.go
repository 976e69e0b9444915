package table

import (
	"fmt"
	"strings"

	"lacuna/internal/oops"
)

// Where names a row for a message: its line in the file, or its number.
func (t *Table) Where(row int) string {
	if row < len(t.Lines) {
		return fmt.Sprintf("line %d", t.Lines[row])
	}
	return fmt.Sprintf("row %d", row+1)
}

// Has reports whether there is a column of that name.
func (t *Table) Has(name string) bool { return t.index(name) >= 0 }

// Col returns the column of that name, or an error with the nearest names.
func (t *Table) Col(name string) (*Column, error) {
	if i := t.index(name); i >= 0 {
		return &t.Cols[i], nil
	}
	names := make([]string, len(t.Cols))
	for i, c := range t.Cols {
		names[i] = c.Name
	}
	fix := "the columns are " + strings.Join(names, ", ")
	if near := oops.Nearest(name, names, 2); len(near) > 0 {
		fix = "did you mean " + strings.Join(near, " or ") + "?"
	}
	return nil, oops.Inputf(t.File, "", fix, "no column %q", name)
}

func (t *Table) index(name string) int {
	for i := range t.Cols {
		if t.Cols[i].Name == name {
			return i
		}
	}
	return -1
}

// Float returns the number in a cell, false where it is missing, and an error
// where the text is no number.
func (t *Table) Float(c *Column, row int) (x float64, ok bool, err error) {
	cell := c.Cells[row]
	if !cell.Set || cell.Text == "" && c.Type != Text {
		return 0, false, nil
	}
	x, isNumber := parseFloat(cell.Text)
	if isNumber {
		return x, true, nil
	}
	fix := "leave the field empty where nothing was measured"
	if _, comma := parseFloat(strings.Replace(cell.Text, ",", ".", 1)); comma {
		fix = "write a decimal point, not a comma"
	}
	return 0, false, oops.Inputf(t.File, t.Where(row)+", column "+c.Name, fix, "found %q, expected a number", cell.Text)
}

// Floats returns a column as numbers, with NaN where a cell is missing.
func (t *Table) Floats(name string) ([]float64, error) {
	c, err := t.Col(name)
	if err != nil {
		return nil, err
	}
	out := make([]float64, len(c.Cells))
	for i := range out {
		x, ok, err := t.Float(c, i)
		if err != nil {
			return nil, err
		}
		if !ok {
			x = nan
		}
		out[i] = x
	}
	return out, nil
}

// String returns the text of a cell, false where it is missing.
func (t *Table) String(c *Column, row int) (string, bool) {
	return c.Cells[row].Text, c.Cells[row].Set
}
