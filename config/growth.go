package config

import (
	"bytes"
	"fmt"
	"path/filepath"
	"slices"
	"strings"

	"lacuna/internal/oops"
)

// A Growth is a batch for the curve of growth: measured widths of many sightlines.
type Growth struct {
	File       string     `json:"-"`
	Dir        string     `json:"-"`
	Name       string     `json:"name" toml:"name"`
	FSet       string     `json:"f_set" toml:"f_set"`
	LineTable  string     `json:"line_table,omitempty" toml:"line_table"`
	BRange     [2]float64 `json:"b_range" toml:"b_range"` // km/s
	LimitSigma float64    `json:"limit_sigma" toml:"limit_sigma"`
	Table      string     `json:"table,omitempty" toml:"table"`
	Sightlines []GrowthSightline
	Notes      []string `json:"-"` // what the reader of results must know of the loading

	by origins
}

// A GrowthSightline is one star's widths.
type GrowthSightline struct {
	Name   string        `json:"name" toml:"name"`
	Note   string        `json:"note,omitempty" toml:"note"`
	BRange [2]float64    `json:"b_range" toml:"b_range"` // km/s
	Widths []GrowthWidth `json:"widths"`
	ShareB [][]string    `json:"share_b,omitempty"` // species or levels with one b each group

	by origins
}

// A GrowthWidth is one measured width, in mÅ as written: W ± Err, or an upper
// limit at Sigma.
type GrowthWidth struct {
	Line  string   `json:"line" toml:"line"` // canonical name
	WmA   *float64 `json:"W_mA,omitempty" toml:"W_mA"`
	Err   float64  `json:"err_mA,omitempty" toml:"err_mA"`     // 1σ, with WmA
	Limit float64  `json:"limit_mA,omitempty" toml:"limit_mA"` // without WmA
	Sigma float64  `json:"sigma,omitempty" toml:"sigma"`       // of Limit
	Note  string   `json:"note,omitempty" toml:"note"`

	by origins
}

// Angstrom returns the width and its 1σ error, or the limit and its level, in Å.
func (w GrowthWidth) Angstrom() (width, err float64, limit bool, sigma float64) {
	if w.WmA == nil {
		return w.Limit * 1e-3, 0, true, w.Sigma
	}
	return *w.WmA * 1e-3, w.Err * 1e-3, false, 0
}

// LoadGrowth reads a growth-curve batch. Every mistake in it is reported.
func LoadGrowth(path string) (*Growth, error) {
	m, err := readTOML(path, "lacuna new")
	if err != nil {
		return nil, err
	}
	return parseGrowth(path, m)
}

func parseGrowth(path string, m map[string]any) (*Growth, error) {
	if m["survey"] != nil && m["growth"] == nil {
		return nil, oops.Input(path, "", "a survey, not a batch for the curve of growth", "lacuna run takes it")
	}
	l := &loader{file: path}
	l.topKeys(m, "growth", "sightline")
	g := &Growth{File: path, Dir: filepath.Dir(path), by: origins{}}
	l.defaults("growth", g, g.by)
	if t := l.table("", "growth", m); t != nil {
		l.required("growth", "growth", t)
		l.fill("growth", "growth", t, g, g.by, "")
	} else if m["growth"] == nil && !l.told("growth") {
		l.bad("growth", `add [growth] with name = "…"`, "missing")
	}
	l.tab = l.lineTable("growth", g.Dir, &g.FSet, g.LineTable)
	places := l.growthTable(g)
	fromTable := len(g.Sightlines)
	for i, t := range l.tables("", "sightline", m) {
		places = l.growthSightline(g, i, t, fromTable, places)
	}
	if len(g.Sightlines) == 0 && len(l.errs) == 0 {
		l.bad("sightline", "add [[sightline]] with widths, or a table", "none")
	}
	var names []string
	for i := range g.Sightlines {
		x := &g.Sightlines[i]
		names = append(names, x.Name)
		if len(x.Widths) == 0 {
			l.bad(places[i], "add [[sightline.width]]", "no width")
		}
		l.checkWidths(g, places[i], x)
	}
	l.checkNames(places, names)
	if err := l.err(); err != nil {
		return nil, err
	}
	return g, nil
}

func (l *loader) growthSightline(g *Growth, i int, m map[string]any, fromTable int, places []string) []string {
	name, _ := m["name"].(string)
	where := place(i, name)
	l.required(where, "growth.sightline", m)
	at0 := slices.IndexFunc(g.Sightlines[:fromTable], func(x GrowthSightline) bool { return name != "" && x.Name == name })
	if at0 < 0 {
		g.Sightlines = append(g.Sightlines, GrowthSightline{BRange: g.BRange, by: origins{"b_range": "growth"}})
		places = append(places, where)
		at0 = len(g.Sightlines) - 1
	}
	x := &g.Sightlines[at0]
	l.fill(where, "growth.sightline", m, x, x.by, "")
	for j, t := range l.tables(where, "width", m) {
		p := nth(at(where, "width"), j)
		w := GrowthWidth{by: origins{}}
		if l.read(p, "growth.sightline.width", t, &w, w.by, "") {
			l.growthWidth(p, g, &w)
		}
		x.Widths = append(x.Widths, w)
	}
	for j, t := range l.tables(where, "share_b", m) {
		p := nth(at(where, "share_b"), j)
		var s struct {
			Species []string `toml:"species"`
		}
		if l.read(p, "growth.sightline.share_b", t, &s, nil, "") {
			l.shareB(at(p, "species"), x, s.Species)
		}
	}
	return places
}

func (l *loader) shareB(where string, x *GrowthSightline, species []string) {
	if len(species) == 1 {
		l.bad(where, "name two or more", "one species shares b with nobody")
	}
	for i, s := range species {
		s = l.species(where, s)
		species[i] = s
		if slices.Contains(species[:i], s) {
			l.bad(where, "keep one of them", "%s is there twice", s)
		}
		for _, other := range x.ShareB {
			if slices.Contains(other, s) {
				l.bad(where, "join the two groups", "%s already shares b with %s", s, strings.Join(other, ", "))
			}
		}
	}
	if len(species) > 0 {
		x.ShareB = append(x.ShareB, species)
	}
}

func (l *loader) growthWidth(where string, g *Growth, w *GrowthWidth) {
	if w.Line != "" && l.tab != nil {
		if a, err := l.tab.Find(w.Line); err != nil {
			l.wrap(at(where, "line"), err)
		} else {
			w.Line = a.Name
		}
	}
	switch {
	case (w.WmA == nil) == (w.Limit == 0):
		l.bad(where, "give W_mA and err_mA, or limit_mA", "needs either a width or a limit")
	case w.WmA != nil && w.Err == 0:
		l.bad(at(where, "err_mA"), "add the 1σ error", "missing")
	case w.WmA == nil && w.Err != 0:
		l.bad(at(where, "err_mA"), "give W_mA with it, also where nothing was detected, or leave it out", "a limit has no error")
	case w.WmA != nil && w.Sigma != 0:
		l.bad(at(where, "sigma"), "leave it out", "only a limit has a level")
	case w.WmA == nil && w.Sigma == 0:
		w.Sigma, w.by["sigma"] = g.LimitSigma, "limit_sigma"
	}
}

// checkWidths refuses a width given twice and notes lines measured twice.
func (l *loader) checkWidths(g *Growth, where string, x *GrowthSightline) {
	for j, w := range x.Widths {
		for _, o := range x.Widths[:j] {
			if o.Line != w.Line {
				continue
			}
			w1, e1, u1, _ := o.Angstrom()
			if w2, e2, u2, _ := w.Angstrom(); w1 == w2 && e1 == e2 && u1 == u2 {
				l.bad(where, "keep one of them", "the same width of %s is there twice", w.Line)
				continue
			}
			g.Notes = append(g.Notes, fmt.Sprintf("%s: two widths of %s count as independent", x.Name, w.Line))
		}
	}
}

// Path is where a file named in the batch lies.
func (g *Growth) Path(name string) string { return join(g.Dir, name) }

// Resolved is the batch as TOML with everything in it; see Survey.Resolved.
func (g *Growth) Resolved() []byte {
	var b bytes.Buffer
	fmt.Fprintln(&b, resolvedHead)
	section(&b, "[growth]", "growth", g, g.by)
	for i := range g.Sightlines {
		x := &g.Sightlines[i]
		b.WriteByte('\n')
		section(&b, "[[sightline]]", "growth.sightline", x, x.by)
		for j := range x.Widths {
			section(&b, "[[sightline.width]]", "growth.sightline.width", &x.Widths[j], x.Widths[j].by)
		}
		for _, s := range x.ShareB {
			list := make([]string, len(s))
			for k := range s {
				list[k] = quote(s[k])
			}
			fmt.Fprintf(&b, "[[sightline.share_b]]\nspecies = [%s]\n", strings.Join(list, ", "))
		}
	}
	return b.Bytes()
}
