package config

import (
	"slices"
	"strings"

	"lacuna/atomic"
	"lacuna/internal/oops"
	"lacuna/spectrum/frame"
)

// lineTable finds the table of transitions and checks the solar scale. nil: the
// table could not be had, and why is already said.
func (l *loader) lineTable(where, dir string, fSet *string, own string) *atomic.Table {
	t, err := atomic.Default().WithSet(*fSet)
	if err != nil {
		l.wrap(at(where, "f_set"), err)
		return nil
	}
	*fSet = t.Set()
	if own == "" {
		return t
	}
	if err := regular(join(dir, own)); err != nil {
		l.bad(at(where, "line_table"), "paths start at the folder of this file", "%s: %v", show(own), err)
		return nil
	}
	if t, err = t.WithFile(join(dir, own)); err != nil {
		l.add(err)
		return nil
	}
	return t
}

type found struct {
	line atomic.Line
	err  error
}

// find looks a transition up, once for each name.
func (l *loader) find(where, name string) (atomic.Line, bool) {
	f, ok := l.look[name]
	if !ok {
		if l.look == nil {
			l.look = map[string]found{}
		}
		f.line, f.err = l.tab.Find(name)
		l.look[name] = f
	}
	if f.err != nil {
		l.wrap(where, f.err)
	}
	return f.line, f.err == nil
}

func (l *loader) checkScale(scale string) {
	if scale == "" {
		return
	}
	if _, err := atomic.SolarRows(scale, "Fe"); err != nil {
		l.wrap("survey: scale", err)
	}
}

func scaleKeys() []string {
	var out []string
	for _, s := range atomic.SolarScales() {
		out = append(out, s.Key)
	}
	return out
}

// species returns a species or one level of it as the program spells it: one of
// the line table, any ion, or a molecule by its formula.
func (l *loader) species(where, name string) string {
	if name == "" || l.tab == nil {
		return name // missing, or no table: said elsewhere
	}
	name = strings.Join(strings.Fields(name), " ")
	var known []string
	for _, a := range l.tab.Of(name) {
		for _, s := range []string{a.Species, a.Carrier()} {
			if plain(s) == plain(name) {
				return s
			}
		}
	}
	for _, a := range l.tab.Lines() {
		for _, s := range []string{a.Species, a.Carrier()} {
			if !slices.Contains(known, s) {
				known = append(known, s)
			}
		}
	}
	near := oops.Nearest(name, known, 2)
	if _, _, ok := atomic.SplitSpecies(name); ok {
		return name
	}
	// A molecule without lines in the table, such as CO or H2, may have a level.
	formula, _, _ := strings.Cut(name, " ")
	if (atomic.Line{Species: formula}).Mass() > 0 {
		return name
	}
	fix := `write it like "Ca II", "C II*", "CH" or "CN N=1"`
	if len(near) > 0 {
		fix = "did you mean " + strings.Join(near, " or ") + "? " + fix
	}
	l.bad(where, fix, "%s is not a species", show(name))
	return name
}

// plain is a species without blanks and capitals.
func plain(s string) string { return strings.ToLower(strings.ReplaceAll(s, " ", "")) }

// Formula is the air formula of the survey.
func (s *Survey) Formula() frame.Formula {
	f, err := frame.ParseFormula(s.AirFormula)
	if err != nil {
		panic("config: air formula " + s.AirFormula) // the schema allows none that is unknown
	}
	return f
}
