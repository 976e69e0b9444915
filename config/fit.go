package config

import (
	"fmt"
	"slices"
	"strings"

	"lacuna/atomic"
	"lacuna/internal/oops"
)

// A Fit asks for clouds that explain several lines of a sightline together.
type Fit struct {
	Name            string     `json:"name" toml:"name"`
	Lines           []string   `json:"lines" toml:"lines"`             // canonical names, among the sightline's
	Window          [2]float64 `json:"window" toml:"window"`           // km/s, for all lines; {0, 0}: each line's own
	Degree          int        `json:"degree" toml:"degree"`           // of the continuum in the fit; −1: as for the line's width
	Auto            bool       `json:"auto" toml:"auto"`               // the number of clouds is found
	Most            int        `json:"most" toml:"most"`               // clouds at most, with Auto
	ShareB          bool       `json:"share_b" toml:"share_b"`         // the species of a cloud have one b
	ShareV          bool       `json:"share_v" toml:"share_v"`         // and one v
	Offset          []string   `json:"offset,omitempty" toml:"offset"` // species with a velocity offset, the same in all clouds
	Thermal         bool       `json:"thermal" toml:"thermal"`         // b² = 2kT/m + turbulence²
	VelocityZeroErr float64    `json:"velocity_zero_err" toml:"velocity_zero_err"`
	Telluric        string     `json:"telluric" toml:"telluric"` // mask, keep
	Note            string     `json:"note,omitempty" toml:"note"`
	Clouds          []FitCloud `json:"clouds,omitempty"` // none with Auto
	Inherited       bool       `json:"-"`                // of [defaults]: a warning where it cannot be done

	by origins
}

// MostClouds is how many clouds one fit may have.
const MostClouds = 40

// A FitCloud is where one cloud starts, and what is known of it.
type FitCloud struct {
	Name       string     `json:"name" toml:"name"`
	V          Parameter  `json:"v" toml:"v"`                             // km/s
	B          *Parameter `json:"b,omitempty" toml:"b"`                   // km/s; nil with Fit.Thermal
	T          *Parameter `json:"T,omitempty" toml:"T"`                   // K, with Fit.Thermal
	Turbulence *Parameter `json:"turbulence,omitempty" toml:"turbulence"` // km/s, with Fit.Thermal
	Columns    Parameters `json:"columns,omitempty" toml:"columns"`       // log N of its species; nil: all, starts from the data
	SpeciesB   Parameters `json:"species_b,omitempty" toml:"species_b"`   // of species with a b of their own
	SpeciesV   Parameters `json:"species_v,omitempty" toml:"species_v"`   // and a v of their own
	by         origins
}

// fits makes the fits of a sightline, once its lines are known: its own, or those of
// [defaults] as far as it has their lines.
func (l *loader) fits(x *Sightline, def common) {
	for _, r := range x.rawFits {
		l.fit(x, r.where, r.m, true)
	}
	if x.rawFits == nil {
		for i, m := range def.fits {
			l.fit(x, nth("defaults: fit", i), m, false)
		}
	}
	x.rawFits = nil
}

func (l *loader) fit(x *Sightline, where string, m map[string]any, own bool) {
	f := Fit{Inherited: !own, by: origins{}}
	origin := "defaults"
	if own {
		origin = ""
	}
	l.defaults("sightline.fit", &f, f.by)
	good := l.read(where, "sightline.fit", m, &f, f.by, origin)
	clouds := l.tables(where, "cloud", m)
	for i, t := range clouds {
		c := FitCloud{by: origins{}}
		place := nth(at(where, "cloud"), i)
		good = l.read(place, "sightline.fit.cloud", t, &c, c.by, origin) && good
		if c.Name == "" {
			c.Name, c.by["name"] = fmt.Sprintf("cloud %d", i+1), "default"
		}
		f.Clouds = append(f.Clouds, c)
	}
	if !good {
		return
	}
	n := len(l.errs)
	lines := l.fitLines(x, &f, at(where, "lines"), own)
	if len(lines) == 0 {
		return // said, or not of this sightline
	}
	carriers := carriersOf(lines)
	if f.Name == "" {
		f.Name, f.by["name"] = strings.Join(carriers, " + "), "the species"
	}
	if slices.ContainsFunc(x.Fits, func(o Fit) bool { return o.Name == f.Name }) {
		l.bad(where, "give each its own name", "two fits are called %s", show(f.Name))
	}
	l.checkFit(x, &f, where, lines, carriers)
	if len(l.errs) == n {
		x.Fits = append(x.Fits, f)
	}
}

// fitLines looks up the lines of a fit among those that the sightline measures.
func (l *loader) fitLines(x *Sightline, f *Fit, where string, own bool) []atomic.Line {
	if len(f.Lines) == 0 {
		l.bad(where, `name the transitions that are fitted together: ["Na I 5889.95", "Na I 5895.92"]`, "none")
		return nil
	}
	var have []string
	for _, ln := range x.Lines {
		if !slices.Contains(have, ln.Name) {
			have = append(have, ln.Name)
		}
	}
	var lines []atomic.Line
	var names []string
	for i, name := range f.Lines {
		a, ok := l.find(nth(where, i), name)
		switch {
		case !ok:
		case slices.Contains(names, a.Name):
			l.bad(nth(where, i), "keep one of them", "%s is there twice", a.Name)
		case slices.Contains(have, a.Name):
			lines, names = append(lines, a), append(names, a.Name)
		case own:
			fix := "add it to lines: what is fitted is also measured"
			if slices.Contains(x.Skipped, a.Name) {
				fix = "use = false leaves it out: leave it out here too"
			} else if near := oops.Nearest(a.Name, have, 2); len(near) > 0 {
				fix += "; or did you mean " + strings.Join(near, " or ") + "?"
			}
			l.bad(nth(where, i), fix, "%s is not among the lines of the sightline", a.Name)
		}
	}
	f.Lines = names
	return lines
}

func carriersOf(lines []atomic.Line) []string {
	var out []string
	for _, a := range lines {
		if !slices.Contains(out, a.Carrier()) {
			out = append(out, a.Carrier())
		}
	}
	return out
}

// checkFit compares the keys of a fit with each other and with its lines.
func (l *loader) checkFit(x *Sightline, f *Fit, where string, lines []atomic.Line, carriers []string) {
	switch {
	case f.Auto && len(f.Clouds) > 0:
		l.bad(where, "keep auto = true or the clouds", "auto finds the clouds, yet %d are given", len(f.Clouds))
	case len(f.Clouds) > MostClouds:
		l.bad(where, "fit fewer, or lines of another range apart", "%d clouds, %d at most", len(f.Clouds), MostClouds)
	case !f.Auto && len(f.Clouds) == 0:
		l.bad(where, "add [[sightline.fit.cloud]] with v = …, or auto = true", "no cloud to start from")
	}
	if f.Thermal && !f.ShareB {
		l.bad(at(where, "share_b"), "leave it out, or thermal", "with thermal the b of each species follows from temperature and turbulence")
	}
	if len(f.Offset) > 0 && !f.ShareV {
		l.bad(at(where, "share_v"), "leave it out, or offset", "an offset is between species that share their velocities")
	}
	for i, s := range f.Offset {
		if s = l.among(nth(at(where, "offset"), i), s, carriers); s == "" {
			continue
		}
		if slices.Contains(f.Offset[:i], s) {
			l.bad(nth(at(where, "offset"), i), "keep one of them", "%s is there twice", s)
		}
		f.Offset[i] = s
	}
	if len(f.Offset) > 0 && len(f.Offset) >= len(carriers) {
		l.bad(at(where, "offset"), "leave out the species that the others are offset from", "every species has an offset")
	}
	lo, hi := f.Window[0], f.Window[1]
	if f.Window == [2]float64{} {
		lo, hi = windowsOf(x, f.Lines)
	}
	var held []string
	for i := range f.Clouds {
		c := &f.Clouds[i]
		place := nth(at(where, "cloud"), i)
		for _, o := range f.Clouds[:i] {
			if o.Name == c.Name {
				l.bad(place, "give each its own name", "two clouds are called %s", show(c.Name))
			}
		}
		if v := c.V.Start; v != nil && lo < hi && !(*v >= lo && *v <= hi) { // a window that is missing is told elsewhere
			l.bad(at(place, "v"), "start inside, or widen the window", "%g km/s lies outside the window [%g, %g] of every line", *v, lo, hi)
		}
		l.cloudParameters(x, f, c, place, lines)
		for _, s := range l.cloudSpecies(f, c, place, carriers) {
			if !slices.Contains(held, s) {
				held = append(held, s)
			}
		}
	}
	for _, s := range carriers {
		if len(f.Clouds) > 0 && !slices.Contains(held, s) {
			l.bad(where, "put it into columns of a cloud, or take its lines out", "no cloud holds %s", s)
		}
	}
}

// windowsOf is the range of the windows of the named lines.
func windowsOf(x *Sightline, names []string) (lo, hi float64) {
	first := true
	for _, ln := range x.Lines {
		if !slices.Contains(names, ln.Name) {
			continue
		}
		if first {
			lo, hi, first = ln.Window[0], ln.Window[1], false
		}
		lo, hi = min(lo, ln.Window[0]), max(hi, ln.Window[1])
	}
	return lo, hi
}

// among returns a species as the program spells it, if it is one of the fit's.
func (l *loader) among(where, name string, carriers []string) string {
	for _, c := range carriers {
		if plain(c) == plain(name) {
			return c
		}
	}
	l.bad(where, "one of "+strings.Join(carriers, ", "), "no line of the fit is one of %s", show(name))
	return ""
}
