package abundance

import (
	"fmt"
	"slices"
	"strings"

	"lacuna/atomic"
	"lacuna/internal/oops"
	"lacuna/internal/table"
)

// A Sightline is what a table of columns holds of one star, and its depletions.
type Sightline struct {
	Name       string
	Columns    []Column
	Hydrogen   *Hydrogen // nil: none in the table
	Depletions []Depletion
}

// TableColumns are the columns that DepleteTable knows, with their meaning. In a
// table with other columns these are left alone.
var TableColumns = [][2]string{
	{"sightline", "name of the star (or: object)"},
	{"species", "ion or molecule, with its level where it has one: Fe II, C II*, CN N=1"},
	{"logN", "log10 of its column density, cm-2"},
	{"logN_err", "1σ error in dex (or logN_err_up and logN_err_lo); empty for limits"},
	{"logN_kind", "value (also where empty), upper, lower or marginal"},
	{"limit_sigma", "level of a limit in σ"},
	{"source", "where the column comes from"},
	{"logN_HI", "log10 of N(H I); logN_HI_err its error, or logN_HI_max an upper limit"},
	{"logN_H2", "log10 of N(H2); logN_H2_err, logN_H2_max likewise"},
	{"logN_H", "log10 of the total N(H I) + 2 N(H2), in place of both; logN_H_err, logN_H_max likewise"},
	{"hydrogen_source", "where hydrogen comes from; the table where empty"},
	{"hydrogen_from", "the species that N(H) was derived from, if any"},
}

// DepleteTable returns the depletions of every sightline of a table with one row a
// species (TableColumns), in the order in which the sightlines first stand. The
// hydrogen columns may stand on every row of a sightline or on one; a row without
// a species carries only them. In place of logN_HI_err (and its like) an error
// of two sides may stand, logN_HI_err_up and logN_HI_err_lo; in place of
// logN_HI_max, logN_HI_kind = upper.
//
// Nothing is guessed: a missing error, a limit with an error, a number that
// cannot be a logarithm, an unknown species, a species twice, and hydrogen
// columns that differ between rows are input errors that name the row.
func DepleteTable(t *table.Table, scale string) ([]Sightline, error) {
	if err := checkScale(scale); err != nil {
		return nil, err
	}
	r, err := newRows(t)
	if err != nil {
		return nil, err
	}
	var out []Sightline
	var at [][]int // rows of each
	for row := range t.Rows() {
		name, ok := r.text("sightline", row)
		if !ok {
			return nil, r.bad(row, r.nameCol, "no sightline", "name the star on every row")
		}
		i := slices.IndexFunc(out, func(s Sightline) bool { return s.Name == name })
		if i < 0 {
			i = len(out)
			out, at = append(out, Sightline{Name: name}), append(at, nil)
		}
		c, ok, err := r.column(row)
		if err != nil {
			return nil, err
		}
		if ok {
			if k := slices.IndexFunc(out[i].Columns, func(d Column) bool { return d.Species == c.Species }); k >= 0 {
				return nil, r.bad(row, "species", fmt.Sprintf("%s of %s stands in the table twice", c.Species, name), "keep one row a species")
			}
			out[i].Columns = append(out[i].Columns, c)
		}
		at[i] = append(at[i], row)
	}
	for i := range out {
		s := &out[i]
		h := Hydrogen{}
		if s.Hydrogen, err = r.hydrogen(s.Name, at[i]); err != nil {
			return nil, err
		}
		if s.Hydrogen != nil {
			h = *s.Hydrogen
		}
		if s.Depletions, err = Deplete(s.Columns, h, scale); err != nil {
			return nil, fmt.Errorf("%s: %s: %w", t.File, s.Name, err)
		}
	}
	return out, nil
}

// rows reads the cells of a table of columns.
type rows struct {
	t       *table.Table
	nameCol string
}

func newRows(t *table.Table) (*rows, error) {
	r := &rows{t: t, nameCol: "sightline"}
	if !t.Has("sightline") && t.Has("object") {
		r.nameCol = "object"
	}
	for _, need := range []string{r.nameCol, "species", "logN"} {
		if _, err := t.Col(need); err != nil {
			return nil, err
		}
	}
	for _, c := range t.Cols {
		unit := strings.ToLower(c.Unit)
		if strings.HasPrefix(c.Name, "logN") && c.Type != table.Text && unit != "" && !strings.Contains(unit, "dex") && !strings.Contains(unit, "log") {
			return nil, oops.Inputf(t.File, "column "+c.Name, "give log10 of the column in cm-2, unit dex(1 / cm2)", "its unit is %q, not a logarithm", c.Unit)
		}
	}
	if t.Rows() == 0 {
		return nil, oops.Input(t.File, "", "the table has no rows", "give one row a species")
	}
	return r, nil
}

func (r *rows) bad(row int, col, what, fix string) error {
	return oops.Input(r.t.File, r.t.Where(row)+", column "+col, what, fix)
}

// text returns a cell's text, false where the column or the cell is missing.
func (r *rows) text(name string, row int) (string, bool) {
	if name == "sightline" {
		name = r.nameCol
	}
	if !r.t.Has(name) {
		return "", false
	}
	c, _ := r.t.Col(name)
	s, ok := r.t.String(c, row)
	s = strings.TrimSpace(s)
	return s, ok && s != ""
}

// num returns a number that must lie in lo ≤ x ≤ hi.
func (r *rows) num(name string, row int, lo, hi float64, fix string) (float64, bool, error) {
	if !r.t.Has(name) {
		return 0, false, nil
	}
	c, _ := r.t.Col(name)
	if s, _ := r.text(name, row); s == "" {
		return 0, false, nil
	}
	x, ok, err := r.t.Float(c, row)
	if err != nil || !ok {
		return 0, false, err
	}
	if !(x >= lo && x <= hi) {
		return 0, false, r.bad(row, name, fmt.Sprintf("found %s, expected %g to %g", c.Cells[row].Text, lo, hi), fix)
	}
	return x, true, nil
}

const fixErr = "give the 1σ error in dex, above 0"

// errors returns the two sides of an error, 0 where there is none.
func (r *rows) errors(name string, row int) (up, lo float64, err error) {
	const least, most = 1e-6, 5
	one, okOne, err := r.num(name+"_err", row, least, most, fixErr)
	if err != nil {
		return 0, 0, err
	}
	up, okUp, err := r.num(name+"_err_up", row, least, most, fixErr)
	if err != nil {
		return 0, 0, err
	}
	lo, okLo, err := r.num(name+"_err_lo", row, least, most, fixErr)
	switch {
	case err != nil:
		return 0, 0, err
	case okOne && (okUp || okLo):
		return 0, 0, r.bad(row, name+"_err", "an error of one side beside one of two", "keep one of them")
	case okUp != okLo:
		return 0, 0, r.bad(row, name+"_err_up", "an error of two sides with one side missing", "give both")
	case okOne:
		return one, one, nil
	}
	return up, lo, nil
}

// column reads the species and its column of one row; ok is false on a row that
// has neither.
func (r *rows) column(row int) (c Column, ok bool, err error) {
	species, named := r.text("species", row)
	x, okX, err := r.num("logN", row, 5, 25, "give log10 of the column in cm-2")
	if err != nil {
		return c, false, err
	}
	switch {
	case !named && !okX:
		return c, false, nil
	case !named:
		return c, false, r.bad(row, "species", "a column of no species", "name the ion or molecule")
	case !okX:
		return c, false, r.bad(row, "logN", "no column of "+species, "give it, or leave the row out")
	}
	if c.Species, err = r.species(row, species); err != nil {
		return c, false, err
	}
	up, lo, err := r.errors("logN", row)
	if err != nil {
		return c, false, err
	}
	kind, _ := r.text("logN_kind", row)
	kind = strings.ToLower(kind)
	conf := 0.
	if kind == "upper" || kind == "lower" {
		if conf, _, err = r.num("limit_sigma", row, 1, 10, "give the level of the limit in σ"); err != nil {
			return c, false, err
		}
		if up != 0 {
			return c, false, r.bad(row, "logN_err", "a limit with an error", "leave the error empty, or make it a value")
		}
	} else if up == 0 {
		return c, false, r.bad(row, "logN_err", "a value without an error", `give the 1σ error in dex, or logN_kind upper or lower`)
	}
	source, _ := r.text("source", row)
	if source == "" {
		source = r.t.File + ", " + r.t.Where(row)
	}
	n, err := Stated(x, up, lo, kind, conf, source)
	if err != nil {
		return c, false, r.bad(row, "logN_kind", err.Error(), "")
	}
	c.LogN, c.Method, c.Element = n, MethodGiven, elementOf(c.Species)
	return c, true, nil
}

// species checks a name and writes it in the usual way.
func (r *rows) species(row int, s string) (string, error) {
	base, level := splitCarrier(s)
	if el, _, atom := atomic.SplitSpecies(base); atom && (level == "" || level[0] == '*') {
		if el == "H" {
			return "", r.bad(row, "species", "hydrogen is no row of its own", "put it in logN_HI, logN_H2 or logN_H")
		}
		return joinCarrier(base, level), nil
	}
	fix := `write element and stage, such as "Fe II"`
	joined := ""
	for i := 1; i < len(base); i++ { // FeII is no molecule of iodine
		if _, _, atom := atomic.SplitSpecies(base[:i] + " " + base[i:]); atom {
			joined = base[:i] + " " + base[i:]
		}
	}
	if k := atomic.Dominance(base).Kind; k == atomic.Never && joined == "" {
		return joinCarrier(base, level), nil
	}
	var names []string
	for _, l := range atomic.Default().Lines() {
		if !slices.Contains(names, l.Species) {
			names = append(names, l.Species)
		}
	}
	if joined != "" {
		fix = "did you mean " + joined + "?"
	} else if near := oops.Nearest(s, names, 3); len(near) > 0 {
		fix = "did you mean " + strings.Join(near, " or ") + "?"
	}
	return "", r.bad(row, "species", fmt.Sprintf("%q is not a known ion or molecule", s), fix)
}
