package config

import (
	"errors"
	"maps"
	"slices"

	"lacuna/atomic"
	"lacuna/internal/oops"
)

// common is what all sightlines share: the built-in defaults and [defaults].
type common struct {
	sightline Sightline
	spectrum  Spectrum
	lines     []map[string]any
	fits      []map[string]any
}

func (c common) newSightline() Sightline {
	x := c.sightline
	x.by = maps.Clone(x.by)
	return x
}

func (c common) newSpectrum() Spectrum {
	x := c.spectrum
	x.by = maps.Clone(x.by)
	return x
}

// common checks [defaults] once, so that its mistakes show under its own name.
func (l *loader) common(m map[string]any) common {
	for _, name := range sortedKeys(m) {
		for _, k := range keysOf("sightline") {
			if k.Name == name && !k.Common {
				l.bad("defaults: "+name, "move it to the [[sightline]]", "cannot be the same for all sightlines")
			}
		}
	}
	c := common{sightline: Sightline{by: origins{}}, spectrum: Spectrum{by: origins{}}, lines: l.tables("defaults", "line", m), fits: l.tables("defaults", "fit", m)}
	l.defaults("sightline", &c.sightline, c.sightline.by)
	l.fill("defaults", "sightline", m, &c.sightline, c.sightline.by, "defaults")
	spectrum := l.table("defaults", "spectrum", m)
	for _, k := range []string{"file", "continuum_file"} { // line_spread may be one for all
		if _, ok := spectrum[k]; ok {
			l.bad("defaults: spectrum: "+k, "move it to the [[sightline.spectrum]]", "cannot be the same for all spectra")
		}
	}
	l.defaults("sightline.spectrum", &c.spectrum, c.spectrum.by)
	l.fill("defaults: spectrum", "sightline.spectrum", spectrum, &c.spectrum, c.spectrum.by, "defaults")
	for i, t := range c.lines {
		where := nth("defaults: line", i)
		l.required(where, "sightline.line", t)
		l.fill(where, "sightline.line", t, &Line{}, nil, "")
	}
	return c
}

// A rawLine is a transition or a fit as written, before its names are looked up.
type rawLine struct {
	where string
	m     map[string]any
}

// layer puts what m says over what s already holds. origin is "" for the
// survey's own text, "catalogue" for a row of it.
func (l *loader) layer(s *Sightline, def common, where string, m map[string]any, origin string) {
	l.fill(where, "sightline", m, s, s.by, origin)
	if list := l.tables(where, "spectrum", m); list != nil {
		s.Spectra = nil
		for i, t := range list {
			place := nth(at(where, "spectrum"), i)
			sp := def.newSpectrum()
			if l.read(place, "sightline.spectrum", t, &sp, sp.by, origin) {
				l.checkSpectrum(place, &sp)
			}
			s.Spectra = append(s.Spectra, sp)
		}
	}
	for i, t := range l.tables(where, "line", m) {
		place := nth(at(where, "line"), i)
		if _, ok := t["name"].(string); !ok { // the others are read where their name is known
			l.read(place, "sightline.line", t, &Line{}, nil, "")
			continue
		}
		s.raw = append(s.raw, rawLine{place, t})
	}
	if list := l.tables(where, "fit", m); list != nil {
		s.rawFits = []rawLine{}
		for i, t := range list {
			s.rawFits = append(s.rawFits, rawLine{nth(at(where, "fit"), i), t})
		}
	}
	if _, ok := m["lines"]; ok {
		s.linesAt = at(where, "lines")
	}
	if t := l.table(where, "hydrogen", m); t != nil {
		h := &Hydrogen{by: origins{}}
		if l.read(at(where, "hydrogen"), "sightline.hydrogen", t, h, h.by, origin) {
			l.checkHydrogen(at(where, "hydrogen"), h)
		}
		s.Hydrogen = h
	}
	for i, t := range l.tables(where, "column", m) {
		place := nth(at(where, "column"), i)
		c := Column{by: origins{}}
		l.defaults("sightline.column", &c, c.by)
		if l.read(place, "sightline.column", t, &c, c.by, origin) {
			l.checkColumn(place, &c, s)
		}
		s.Columns = append(s.Columns, c)
	}
	for i, t := range l.tables(where, "adopt", m) {
		place := nth(at(where, "adopt"), i)
		a := Adopt{by: origins{}}
		if l.read(place, "sightline.adopt", t, &a, a.by, origin) {
			l.checkAdopt(place, &a, s)
		}
		s.Adopt = append(s.Adopt, a)
	}
}

// finish makes the lines of a sightline from the list, [[defaults.line]] and
// [[sightline.line]], and fills in what they take from the sightline.
func (l *loader) finish(s *Survey, x *Sightline, def common, where string) {
	type entry struct {
		line  atomic.Line
		where string
		m     map[string]any // its own keys; nil: only named
		own   bool           // named by the sightline itself
	}
	var own, shared, list []entry
	for i, t := range def.lines {
		if name, ok := t["name"].(string); ok {
			if a, ok := l.find(nth("defaults: line", i)+": name", name); ok {
				if slices.ContainsFunc(shared, func(e entry) bool { return e.line.Name == a.Name }) {
					l.bad(nth("defaults: line", i), "keep one of them", "%s is there twice", a.Name)
				}
				shared = append(shared, entry{a, nth("defaults: line", i), t, false})
			}
		}
	}
	for _, r := range x.raw {
		if a, ok := l.find(at(r.where, "name"), r.m["name"].(string)); ok {
			own = append(own, entry{a, r.where, r.m, true})
		} else {
			l.fill(r.where, "sightline.line", r.m, &Line{}, nil, "")
		}
	}
	at0 := x.linesAt
	if at0 == "" {
		at0 = "defaults: lines"
	}
	for i, name := range x.Named {
		if a, ok := l.find(nth(at0, i), name); ok {
			if slices.ContainsFunc(list, func(e entry) bool { return e.line.Name == a.Name }) {
				l.bad(nth(at0, i), "keep one of them", "%s is there twice", a.Name)
				continue
			}
			list = append(list, entry{a, nth(at0, i), nil, x.linesAt != ""})
		}
	}
	// The order of the results: the list, then what only [[defaults.line]] and
	// then what only [[sightline.line]] name.
	var all []entry
	take := func(e entry) {
		if slices.ContainsFunc(all, func(o entry) bool { return o.line.Name == e.line.Name }) {
			return
		}
		n := len(all)
		for _, o := range own {
			if o.line.Name == e.line.Name {
				all = append(all, o)
			}
		}
		if len(all) == n {
			all = append(all, e)
		}
	}
	for _, group := range [][]entry{list, shared, own} {
		for _, e := range group {
			take(e)
		}
	}
	for _, e := range all {
		ln := Line{by: origins{}}
		l.defaults("sightline.line", &ln, ln.by)
		set := map[string]bool{}
		for _, d := range shared {
			if d.line.Name == e.line.Name {
				(&loader{}).fill("", "sightline.line", d.m, &ln, ln.by, "defaults")
				for k := range d.m {
					set[k] = true
				}
			}
		}
		good := true
		if e.own && e.m != nil {
			good = l.read(e.where, "sightline.line", e.m, &ln, ln.by, "")
			for k := range e.m {
				set[k] = true
			}
		}
		ln.Name = e.line.Name
		if !ln.Use {
			x.Skipped = append(x.Skipped, ln.Name)
			continue
		}
		inherit(x, &ln, set, e.own, e.line.Molecule())
		if good {
			l.checkLine(e.where, x, &ln)
		}
		x.Lines = append(x.Lines, ln)
	}
	l.checkSightline(s, x, where, len(own) > 0 || x.linesAt != "")
	l.fits(x, def)
	x.raw, x.Named, x.linesAt = nil, nil, ""
}

// inherit fills what a line takes from its sightline.
func inherit(x *Sightline, ln *Line, set map[string]bool, own, molecule bool) {
	from := func(key, source string) bool {
		if set[key] {
			return false
		}
		ln.by[key] = source
		return true
	}
	if from("required", "default") {
		ln.Required = own
	}
	if from("window", "velocity") {
		ln.Window = x.Velocity
	}
	if from("auto_window", "the sightline") {
		ln.AutoWindow = x.AutoWindow
	}
	if from("limit_width", "the sightline") {
		ln.LimitWidth = x.LimitWidth
	}
	if !set["b"] {
		if molecule {
			ln.B, ln.by["b"] = x.BMolecule, "b_molecule"
		} else {
			ln.B, ln.by["b"] = x.BAtom, "b_atom"
		}
	}
}

// wrap reports a mistake found by a lower package, with file and place.
func (l *loader) wrap(where string, err error) {
	var m *oops.Mistake
	if !errors.As(err, &m) {
		l.add(err)
		return
	}
	if m.Where != "" {
		where = at(where, m.Where)
	}
	l.add(oops.Input(l.file, where, m.What, m.Fix))
}

// sightlines makes every sightline, catalogue rows first, and returns their
// places for messages.
func (l *loader) sightlines(s *Survey, def common, rows []row, own []map[string]any) []string {
	var places, names []string
	byName := map[string]int{}
	for _, r := range rows {
		x := def.newSightline()
		l.layer(&x, def, r.where, r.m, "catalogue")
		if _, ok := byName[x.Name]; !ok {
			byName[x.Name] = len(s.Sightlines)
		}
		s.Sightlines = append(s.Sightlines, x)
		places = append(places, r.where)
		names = append(names, x.Name)
	}
	for i, m := range own {
		name, _ := m["name"].(string)
		where := place(i, name)
		l.required(where, "sightline", m)
		if m["override"] == true {
			j, ok := byName[name]
			if !ok {
				l.bad(at(where, "override"), "check the name, or leave override out", "no row of the catalogue has this name")
				continue
			}
			l.layer(&s.Sightlines[j], def, where, m, "")
			places[j] = where
			continue
		}
		x := def.newSightline()
		l.layer(&x, def, where, m, "")
		s.Sightlines = append(s.Sightlines, x)
		places = append(places, where)
		names = append(names, x.Name)
	}
	l.checkNames(places, names)
	return places
}
