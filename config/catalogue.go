package config

import (
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"lacuna/internal/oops"
	"lacuna/internal/table"
)

// A row is one line of the catalogue as the keys of a sightline.
type row struct {
	where string
	m     map[string]any
}

// A catColumn says which key a catalogue column fills.
type catColumn struct {
	name  string // of the column
	group string // "", "spectrum", "hydrogen", "E_BV", "velocity", "file"
	key   KeyDoc
}

// catalogueColumns are the columns that a catalogue may have: keys of one value
// of a sightline, of its spectra (for every file of the row) and of its
// hydrogen, and a few that stand for parts of a value.
func catalogueColumns() []catColumn {
	var out []catColumn
	scalar := func(table, group string, leave ...string) {
		for _, k := range keysOf(table) {
			switch k.Type {
			case Text, Number, Integer, Switch:
				if !slices.Contains(leave, k.Name) {
					out = append(out, catColumn{k.Name, group, k})
				}
			}
		}
	}
	scalar("sightline", "", "override")
	for _, k := range keysOf("E_BV") {
		name := "E_BV_" + k.Name
		if k.Name == "value" {
			name = "E_BV"
		}
		out = append(out, catColumn{name, "E_BV", k})
	}
	for _, name := range []string{"velocity_min", "velocity_max"} {
		out = append(out, catColumn{name, "velocity", KeyDoc{Name: name, Type: Number}})
	}
	out = append(out, catColumn{"file", "file", KeyDoc{Name: "file", Type: Text}})
	scalar("sightline.spectrum", "spectrum", "file", "note", "continuum_file")
	scalar("sightline.hydrogen", "hydrogen", "source")
	for _, k := range keysOf("sightline.hydrogen") {
		if k.Name == "source" {
			out = append(out, catColumn{"hydrogen_source", "hydrogen", k})
		}
	}
	return out
}

// catalogue reads the catalogue table of a survey into sightline maps.
func (l *loader) catalogue(s *Survey) []row {
	if s.Catalogue == "" {
		if len(s.CatalogueIgnore) > 0 {
			l.bad("survey: catalogue_ignore", "leave it out, or add catalogue", "there is no catalogue")
		}
		return nil
	}
	t, err := table.Read(s.Path(s.Catalogue))
	if err != nil {
		l.add(err)
		return nil
	}
	return l.rows(s, t)
}

func (l *loader) rows(s *Survey, t *table.Table) []row {
	known := catalogueColumns()
	use := make([]*catColumn, len(t.Cols))
	var names []string
	for i := range known {
		names = append(names, known[i].name)
	}
	where := show(s.Catalogue)
	where = where[1 : len(where)-1]
	all := slices.Contains(s.CatalogueIgnore, "*")
	for _, c := range s.CatalogueIgnore {
		if c != "*" && !t.Has(c) {
			l.bad("survey: catalogue_ignore", "take it out of the list", "the catalogue has no column %s", show(c))
		}
	}
	for i, c := range t.Cols {
		if slices.Contains(s.CatalogueIgnore, c.Name) {
			continue
		}
		j := slices.Index(names, c.Name)
		near := oops.Nearest(c.Name, names, 1)
		switch {
		case j >= 0:
			use[i] = &known[j]
		case all && !slices.ContainsFunc(names, func(n string) bool { return slip(c.Name, n) && !t.Has(n) }):
		default:
			fix := "add it to catalogue_ignore in [survey] if it is not for this program"
			if len(near) > 0 {
				fix = "did you mean " + near[0] + "? else " + fix
			}
			l.bad(at(where, "column "+c.Name), fix, "unknown column")
		}
	}
	if !t.Has("name") {
		l.bad(at(where, "column name"), "add the names of the stars", "missing")
		return nil
	}
	if t.Rows() == 0 {
		l.bad(where, "add a row for each star", "no rows")
	}
	out := make([]row, 0, t.Rows())
	for i := range t.Rows() {
		out = append(out, l.row(where, t, i, use))
	}
	return out
}

// slip reports whether two names differ in one place only, by at most two
// letters: a slip of the pen.
func slip(a, b string) bool {
	for a != "" && b != "" && a[0] == b[0] {
		a, b = a[1:], b[1:]
	}
	for a != "" && b != "" && a[len(a)-1] == b[len(b)-1] {
		a, b = a[:len(a)-1], b[:len(b)-1]
	}
	return len(a) <= 2 && len(b) <= 2
}

// row makes a sightline's map of one row.
func (l *loader) row(catalogue string, t *table.Table, i int, use []*catColumn) row {
	r := row{where: catalogue + " " + t.Where(i), m: map[string]any{}}
	groups := map[string]map[string]any{"": r.m, "spectrum": {}, "hydrogen": {}, "E_BV": {}, "velocity": {}, "file": {}}
	if c, err := t.Col("name"); err == nil {
		if name, ok := t.String(c, i); ok {
			shown := show(name)
			r.where += " (" + shown[1:len(shown)-1] + ")"
		} else {
			l.bad(at(r.where, "name"), "give the star a name", "missing")
		}
	}
	for j, c := range use {
		if c == nil {
			continue
		}
		text, ok := t.String(&t.Cols[j], i)
		if !ok || text == "" {
			continue
		}
		x, err := cellValue(text, c.key.Type)
		if err != "" {
			l.bad(at(r.where, c.name), "leave the cell empty where it is not known", "%s %s", show(text), err)
			continue
		}
		groups[c.group][c.key.Name] = x
	}
	if f, ok := groups["file"]["file"].(string); ok {
		var list []any
		for _, name := range strings.Split(f, ";") {
			sp := map[string]any{"file": strings.TrimSpace(name)}
			for k, v := range groups["spectrum"] {
				sp[k] = v
			}
			list = append(list, sp)
		}
		r.m["spectrum"] = list
	}
	h := groups["hydrogen"]
	if _, only := h["source"]; len(h) > 1 || len(h) == 1 && !only {
		r.m["hydrogen"] = h
	}
	if e := groups["E_BV"]; e["value"] != nil {
		r.m["E_BV"] = e
	} else if e["err"] != nil {
		l.bad(at(r.where, "E_BV"), "give the value, or leave the error out", "E_BV_err without E_BV")
	}
	if v := groups["velocity"]; len(v) == 2 {
		r.m["velocity"] = []any{v["velocity_min"], v["velocity_max"]}
	} else if len(v) == 1 {
		l.bad(at(r.where, "velocity_min"), "give both ends", "only one of velocity_min and velocity_max")
	}
	return r
}

// cellValue is a cell as TOML would have given it.
func cellValue(text string, t Type) (any, string) {
	switch t {
	case Number, Integer:
		if n, err := strconv.ParseInt(text, 10, 64); err == nil {
			return n, ""
		}
		if x, err := strconv.ParseFloat(text, 64); err == nil && t == Number && !strings.ContainsAny(text, "xXpP_") {
			return x, ""
		}
		return nil, "is not " + article(t) + " " + string(t)
	case Switch:
		switch strings.ToLower(text) {
		case "true":
			return true, ""
		case "false":
			return false, ""
		}
		return nil, "is neither true nor false"
	}
	return text, ""
}

// Path is where a file named in the survey lies.
func (s *Survey) Path(name string) string { return join(s.Dir, name) }

func join(dir, name string) string {
	if filepath.IsAbs(name) {
		return name
	}
	return filepath.Join(dir, filepath.FromSlash(name))
}
