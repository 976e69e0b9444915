package atomic

import (
	"fmt"
	"io"
	"os"
	"slices"
	"strings"

	"lacuna/internal/oops"
)

// Within sameLine km/s a user's row is the tabulated line itself; within
// nearLine the user must say whether it is.
const (
	sameLine = 0.5
	nearLine = 5.0
)

// WithFile returns the table with the lines of a user's CSV file, which has the
// columns of Columns: species, f, f_src and lambda_vac_A or lambda_air_A are
// needed, the others may be left out.
//
// A row replaces the tabulated line of its species and level that lies within
// 0.5 km/s, and adds a line where none lies within 5 km/s. Between the two the
// column replaces decides: the name of the line to replace ("CH 3143.15"), or
// none to stand beside it. What the row leaves empty (damping, weights, energy,
// terms, aliases, structure) it takes over from the line that it replaces.
//
// Such lines have Status User and File set. Faults are oops.Input errors with the
// file, the line and the column.
func (t *Table) WithFile(path string) (*Table, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, oops.Input(path, "", "cannot be opened: "+err.Error(), "give the path of a CSV file of lines")
	}
	defer f.Close()
	return t.withReader(path, f)
}

func (t *Table) withReader(path string, r io.Reader) (*Table, error) {
	tab, err := openRecords(path, r)
	if err != nil {
		return nil, err
	}
	own, err := readLines(tab, true, t.spellSpecies)
	if err != nil {
		return nil, err
	}
	lines := slices.Clone(t.lines)
	by := map[int]int{} // table line → file line that took its place
	for k, l := range own {
		row := tab.rows[k]
		i, err := t.replaced(row, l)
		if err != nil {
			return nil, err
		}
		if i < 0 {
			for j, o := range own[:k] {
				if o.Species == l.Species && o.Level == l.Level && apart(o.Wave, l.Wave) <= sameLine {
					return nil, row.bad("species", fmt.Sprintf("the same line as in line %d", tab.rows[j].line), "keep one of them")
				}
			}
			lines = append(lines, l)
			continue
		}
		if first, twice := by[i]; twice {
			return nil, row.bad("species", fmt.Sprintf("replaces %s, as line %d does", t.lines[i].Name, first), `keep one of them, or write "none" in a column replaces to add it beside the other`)
		}
		by[i] = row.line
		lines[i] = inherit(l, t.lines[i], row)
	}
	return newTable(lines, t.set), nil
}

// spellSpecies is spell for species without a level.
func (t *Table) spellSpecies(s string) (string, bool) {
	name, ok := t.spell(s)
	if !ok || !slices.Contains(t.Species(), name) {
		return "", false
	}
	return name, true
}

// replaced returns the index of the tabulated line that the row stands for, −1
// for none.
func (t *Table) replaced(row record, l Line) (int, error) {
	if r := row.get("replaces"); strings.EqualFold(r, "none") {
		return -1, nil
	} else if r != "" {
		old, err := t.Find(r)
		if err != nil {
			return 0, row.bad("replaces", err.Error(), "")
		}
		if old.Species != l.Species || old.Level != l.Level {
			return 0, row.bad("replaces", fmt.Sprintf("%s is a line of %s, the row is one of %s", old.Name, old.Carrier(), l.Carrier()), "name a line of the same species and level")
		}
		return t.keys[old.Name], nil
	}
	best := -1
	for i, o := range t.lines {
		if o.Species == l.Species && o.Level == l.Level && (best < 0 || apart(l.Wave, o.Wave) < apart(l.Wave, t.lines[best].Wave)) {
			best = i
		}
	}
	if best < 0 || apart(l.Wave, t.lines[best].Wave) > nearLine {
		return -1, nil
	}
	if d := apart(l.Wave, t.lines[best].Wave); d > sameLine {
		return 0, row.bad("replaces", fmt.Sprintf("%s stands %.1f km/s away: is it the same line?", t.lines[best].Name, d),
			fmt.Sprintf("write %q in a column replaces to put the row in its place, or none to add it beside it", t.lines[best].Name))
	}
	return best, nil
}

// inherit fills what a user's row leaves empty from the line that it replaces.
func inherit(l, old Line, row record) Line {
	l.Name = old.Name
	for _, c := range []struct {
		to   *float64
		from float64
		cell string
	}{{&l.Gamma, old.Gamma, "gamma_s-1"}, {&l.GLow, old.GLow, "g_low"}, {&l.GUp, old.GUp, "g_up"}, {&l.ELow, old.ELow, "e_low_cm-1"}} {
		if row.get(c.cell) == "" {
			*c.to = c.from
		}
	}
	for _, c := range []struct{ to, from *string }{{&l.Lower, &old.Lower}, {&l.Upper, &old.Upper}, {&l.Missing, &old.Missing}} {
		if *c.to == "" {
			*c.to = *c.from
		}
	}
	if row.get("structure") == "" {
		l.Parts = old.Parts
	} else if row.get("missing") == "" {
		l.Missing = ""
	}
	if len(l.Alias) == 0 {
		l.Alias = old.Alias
	}
	return l
}
