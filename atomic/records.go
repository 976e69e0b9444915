package atomic

import (
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"

	"lacuna/internal/oops"
)

// maxTable is the largest table that is read, in bytes: a line list has less.
const maxTable = 16 << 20

// records is a CSV table under a strict reader: # lines are comments, the first
// other line names the columns, every row has them all.
type records struct {
	file string
	col  map[string]int
	rows []record
}

type record struct {
	of   *records
	cell []string
	line int
}

// readRecords refuses a table with a column that is not in known, without one of
// need, with a column twice or with a row of the wrong length.
func readRecords(file string, r io.Reader, known, need []string) (*records, error) {
	text, err := io.ReadAll(io.LimitReader(r, maxTable+1))
	if err != nil {
		return nil, oops.Input(file, "", "cannot be read: "+err.Error(), "give a readable CSV file")
	}
	if len(text) > maxTable {
		return nil, oops.Inputf(file, "", "give the lines that are needed", "larger than %d MB", maxTable>>20)
	}
	s := strings.TrimPrefix(string(text), "\ufeff")
	if !utf8.ValidString(s) {
		return nil, oops.Input(file, "", "not UTF-8 text", "save it as UTF-8")
	}
	c := csv.NewReader(strings.NewReader(s))
	c.Comment = '#'
	t := &records{file: file, col: map[string]int{}}
	for {
		cell, err := c.Read()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, csvMistake(file, err)
		}
		line, _ := c.FieldPos(0)
		for i := range cell {
			cell[i] = strings.TrimSpace(cell[i])
		}
		if len(t.col) > 0 {
			t.rows = append(t.rows, record{t, cell, line})
			continue
		}
		for i, name := range cell {
			where := fmt.Sprintf("line %d, column %d", line, i+1)
			if _, twice := t.col[name]; twice {
				return nil, oops.Inputf(file, where, "keep one of them", "the column %q stands twice", name)
			}
			if !contains(known, name) {
				return nil, oops.Inputf(file, where, "the columns are "+strings.Join(known, ", ")+nearestHint(name, known), "unknown column %q", name)
			}
			t.col[name] = i
		}
	}
	if len(t.col) == 0 {
		return nil, oops.Input(file, "", "no header line", "begin with the names of the columns: "+strings.Join(known, ","))
	}
	for _, name := range need {
		if _, ok := t.col[name]; !ok {
			return nil, oops.Inputf(file, "header", "add it", "the column %q is missing", name)
		}
	}
	return t, nil
}

func csvMistake(file string, err error) error {
	var p *csv.ParseError
	if !errors.As(err, &p) {
		return oops.Input(file, "", "cannot be read: "+err.Error(), "give a readable CSV file")
	}
	if errors.Is(p.Err, csv.ErrFieldCount) {
		return oops.Input(file, fmt.Sprintf("line %d", p.Line), "not as many cells as the header has columns",
			"leave a cell empty rather than out; put a cell that holds a comma in double quotes")
	}
	return oops.Input(file, fmt.Sprintf("line %d, character %d", p.Line, p.Column), p.Err.Error(),
		`put a cell that holds a comma or a quote in double quotes and double the quotes inside it`)
}

func nearestHint(word string, among []string) string {
	if n := oops.Nearest(word, among, 1); len(n) > 0 {
		return fmt.Sprintf("; did you mean %q?", n[0])
	}
	return ""
}

func contains(list []string, s string) bool {
	for _, x := range list {
		if x == s {
			return true
		}
	}
	return false
}

func (r record) get(name string) string {
	if i, ok := r.of.col[name]; ok {
		return r.cell[i]
	}
	return ""
}

func (r record) where(name string) string { return fmt.Sprintf("line %d, %s", r.line, name) }

func (r record) bad(name, what, fix string) error {
	return oops.Input(r.of.file, r.where(name), what, fix)
}

// num reads a decimal number in lo ≤ x ≤ hi; an empty cell is NaN.
func (r record) num(name string, lo, hi float64) (float64, error) {
	s := r.get(name)
	if s == "" {
		return math.NaN(), nil
	}
	x, err := parseNumber(s)
	if err != nil {
		return 0, r.bad(name, fmt.Sprintf("%q is not a number", s), "write a decimal number such as 0.0342 or 1.5e7")
	}
	if !(x >= lo && x <= hi) {
		return 0, r.bad(name, fmt.Sprintf("%s is out of range", s), fmt.Sprintf("it must lie from %g to %g", lo, hi))
	}
	return x, nil
}

// parseNumber reads decimal numbers only: no hexadecimal, no Inf, no NaN.
func parseNumber(s string) (float64, error) {
	if s == "" || strings.Trim(s, "0123456789+-.eE") != "" {
		return 0, strconv.ErrSyntax
	}
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		return 0, err
	}
	return x, nil
}
