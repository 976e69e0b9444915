package table

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// A Type is the type of a column's cells, in the words of ECSV.
type Type string

// The types.
const (
	Real    Type = "float64"
	Integer Type = "int64"
	Text    Type = "string"
	Logical Type = "bool"
)

// A KV is one entry of the table's metadata. Value is a string, bool, int,
// int64, float64, nil, []string, []float64, []any, or []KV (a map in order).
type KV struct {
	Key   string
	Value any
}

// A Cell is one value as it is printed. The zero Cell is missing.
type Cell struct {
	Text string
	Set  bool
}

// A Column is one column with its cells.
type Column struct {
	Name, Unit  string
	Type        Type
	Format      string // C style ("%.3f"), for readers that print; "" none
	Description string
	UCD         string // unified content descriptor, "" none; kept by the formats that have a place for it
	Cells       []Cell
}

// A Table is columns of equal length, and what holds for all rows.
type Table struct {
	Meta []KV
	Cols []Column

	File  string // where it was read, for messages
	Lines []int  // line of each row in File; nil for tables made here
}

// New returns a table without rows.
func New(cols ...Column) *Table { return &Table{Cols: cols} }

// AddRow appends one row, a cell for each column.
func (t *Table) AddRow(cells ...Cell) {
	if len(cells) != len(t.Cols) {
		panic(fmt.Sprintf("table: AddRow: %d cells for %d columns", len(cells), len(t.Cols)))
	}
	for i, c := range cells {
		t.Cols[i].Cells = append(t.Cols[i].Cells, c)
	}
}

// Rows returns the number of rows.
func (t *Table) Rows() int {
	if len(t.Cols) == 0 {
		return 0
	}
	return len(t.Cols[0].Cells)
}

// Missing is the cell of what was not measured or does not apply.
var Missing Cell

// Str is a cell of text; "" is text too (Missing is not).
func Str(s string) Cell { return Cell{s, true} }

// StrOr is a cell of text, missing where s is empty.
func StrOr(s string) Cell { return Cell{s, s != ""} }

// Int is a cell of a whole number.
func Int(n int) Cell { return Cell{strconv.Itoa(n), true} }

// Bool is a cell of truth.
func Bool(b bool) Cell { return Cell{strconv.FormatBool(b), true} }

// Num is a cell of a number already printed (by Round and its kin), missing
// where s is empty.
func Num(s string) Cell { return Cell{s, s != ""} }

// Fixed is a cell of a number with so many decimals, missing where x is NaN.
func Fixed(x float64, decimals int) Cell {
	if math.IsNaN(x) {
		return Missing
	}
	return Cell{FormatFixed(x, decimals), true}
}

// Exact is a cell of a number with every digit that tells it from its
// neighbours, missing where x is NaN. It is for values that are read again, not
// for measurements in print.
func Exact(x float64) Cell {
	if math.IsNaN(x) {
		return Missing
	}
	return Cell{strconv.FormatFloat(x, 'g', -1, 64), true}
}

// Check returns what is wrong with a table that is about to be written: no or
// doubled names, unequal lengths, cells that are not of their column's type,
// text that a table cannot hold, metadata of an unknown type.
func (t *Table) Check() error {
	if len(t.Cols) == 0 {
		return fmt.Errorf("table: no columns")
	}
	seen := make(map[string]bool, len(t.Cols))
	for i := range t.Cols {
		c := &t.Cols[i]
		if c.Name == "" || c.Name != strings.TrimSpace(c.Name) {
			return fmt.Errorf("table: column %d: %q is not a name", i+1, c.Name)
		}
		if seen[c.Name] {
			return fmt.Errorf("table: two columns are named %q", c.Name)
		}
		seen[c.Name] = true
		switch c.Type {
		case Real, Integer, Text, Logical:
		default:
			return fmt.Errorf("table: column %s: unknown type %q", c.Name, c.Type)
		}
		for _, s := range []string{c.Name, c.Unit, c.Format, c.Description} {
			if why := badText(s, false); why != "" {
				return fmt.Errorf("table: column %q: %s", c.Name, why)
			}
		}
		if len(c.Cells) != len(t.Cols[0].Cells) {
			return fmt.Errorf("table: column %s has %d rows, %s has %d", c.Name, len(c.Cells), t.Cols[0].Name, len(t.Cols[0].Cells))
		}
		for j, cell := range c.Cells {
			if !cell.Set {
				continue
			}
			if why := misfit(cell.Text, c.Type); why != "" {
				return fmt.Errorf("table: column %s, row %d: %s", c.Name, j+1, why)
			}
		}
	}
	return checkMeta(t.Meta, "meta")
}

// misfit says why a cell's text is not of a type, or "".
func misfit(s string, t Type) string {
	switch t {
	case Real:
		if _, ok := parseFloat(s); !ok {
			return fmt.Sprintf("%q is not a number", s)
		}
	case Integer:
		if _, ok := parseInt(s); !ok {
			return fmt.Sprintf("%q is not a whole number of 64 bits", s)
		}
	case Logical:
		if s != "true" && s != "false" {
			return fmt.Sprintf("%q is neither true nor false", s)
		}
	case Text:
		return badText(s, true)
	}
	return ""
}

// badText says why text cannot stand in a table, or "". Readers of these formats
// split lines at any of the characters refused here, or drop them.
func badText(s string, breaks bool) string {
	if !utf8.ValidString(s) {
		return fmt.Sprintf("%q is not UTF-8", s)
	}
	for _, r := range s {
		if breaks && (r == '\n' || r == '\t') {
			continue
		}
		if unicode.IsControl(r) || r == '\uFEFF' || r == '\u2028' || r == '\u2029' {
			return fmt.Sprintf("the character U+%04X cannot stand in a table", r)
		}
	}
	return ""
}

// parseFloat reads a decimal number, nan or inf as they stand in tables: no hex,
// no underscores, D exponents allowed; false also on overflow.
func parseFloat(s string) (float64, bool) {
	switch strings.ToLower(s) {
	case "nan":
		return math.NaN(), true
	case "inf", "+inf":
		return math.Inf(1), true
	case "-inf":
		return math.Inf(-1), true
	}
	b := []byte(s)
	for i, c := range b {
		switch {
		case c >= '0' && c <= '9', c == '.', c == '+', c == '-', c == 'e', c == 'E':
		case c == 'd' || c == 'D':
			b[i] = 'e'
		default:
			return 0, false
		}
	}
	x, err := strconv.ParseFloat(string(b), 64)
	return x, err == nil
}

func parseInt(s string) (int64, bool) {
	n, err := strconv.ParseInt(s, 10, 64)
	return n, err == nil
}
