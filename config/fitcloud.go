package config

import (
	"slices"
	"strings"

	"lacuna/atomic"
)

// cloudParameters checks v, b, T and turbulence of a cloud, and fills in where those
// that are not given start.
func (l *loader) cloudParameters(x *Sightline, f *Fit, c *FitCloud, where string, lines []atomic.Line) {
	start := func(p **Parameter, key string, value float64, from string) {
		if *p == nil {
			q := StartAt(value)
			*p, c.by[key] = &q, from
		}
	}
	if f.Thermal {
		if c.B != nil {
			l.bad(at(where, "b"), "leave it out, or thermal", "with thermal, b follows from T and turbulence")
		}
		known := func(p *Parameter) bool { return p != nil && (p.Fixed || p.Prior != nil || p.To != "") }
		if !severalMasses(lines) && !known(c.T) && !known(c.Turbulence) {
			l.bad(where, "fix T or turbulence, or give one a prior, or add lines of a lighter or heavier species",
				"with species of one mass alone, temperature cannot be told from turbulence")
		}
		start(&c.T, "T", 100, "default")
		start(&c.Turbulence, "turbulence", 1, "default")
	} else {
		if c.T != nil || c.Turbulence != nil {
			l.bad(where, "add thermal = true to the fit, or give b in their place", "T and turbulence are given, yet b is not split into them")
		}
		b, from := x.BAtom, "b_atom"
		if !slices.ContainsFunc(lines, func(a atomic.Line) bool { return !a.Molecule() }) {
			b, from = x.BMolecule, "b_molecule"
		}
		start(&c.B, "b", b, from)
	}
	var clouds []string
	for _, o := range f.Clouds {
		if o.Name != c.Name {
			clouds = append(clouds, o.Name)
		}
	}
	for _, p := range []struct {
		key string
		par *Parameter
	}{{"v", &c.V}, {"b", c.B}, {"T", c.T}, {"turbulence", c.Turbulence}} {
		if p.par == nil || p.par.To == "" || slices.Contains(clouds, p.par.To) {
			continue
		}
		fix := "there is no other cloud"
		if len(clouds) > 0 {
			fix = "one of " + strings.Join(clouds, ", ")
		}
		l.bad(at(where, p.key), fix, "%s is not another cloud of this fit", show(p.par.To))
	}
}

func severalMasses(lines []atomic.Line) bool {
	for _, a := range lines[1:] {
		if a.Mass() != lines[0].Mass() {
			return true
		}
	}
	return false
}

// cloudSpecies checks the species of a cloud and returns them.
func (l *loader) cloudSpecies(f *Fit, c *FitCloud, where string, carriers []string) []string {
	spelled := func(key string, ps Parameters, among []string) Parameters {
		if ps == nil {
			return nil
		}
		out := Parameters{}
		for _, name := range sortedSpecies(ps) {
			s := l.among(at(where, key), name, among)
			if s == "" {
				continue
			}
			if _, twice := out[s]; twice {
				l.bad(at(where, key), "keep one of them", "%s is there twice", s)
			}
			out[s] = ps[name]
		}
		for _, s := range sortedSpecies(out) {
			p := out[s]
			if p.To == "" {
				continue
			}
			to := l.among(at(at(where, key), s), p.To, among)
			if to == s {
				l.bad(at(at(where, key), s), "name another species", "it follows itself")
			}
			p.To = to
			out[s] = p
		}
		return out
	}
	c.Columns = spelled("columns", c.Columns, carriers)
	held := carriers
	if c.Columns != nil {
		held = sortedSpecies(c.Columns)
		if len(held) == 0 {
			l.bad(at(where, "columns"), "name its species, or leave columns out for all of them", "the cloud holds nothing")
			return carriers
		}
	}
	c.SpeciesB, c.SpeciesV = spelled("species_b", c.SpeciesB, held), spelled("species_v", c.SpeciesV, held)
	if f.Thermal && c.SpeciesB != nil {
		l.bad(at(where, "species_b"), "leave it out, or thermal", "with thermal, b follows from T and turbulence")
	}
	for _, s := range sortedSpecies(c.SpeciesV) {
		if slices.Contains(f.Offset, s) {
			l.bad(at(where, "species_v"), "keep one of them", "%s has an offset in all clouds already", s)
		}
	}
	return held
}

func sortedSpecies(ps Parameters) []string {
	out := make([]string, 0, len(ps))
	for s := range ps {
		out = append(out, s)
	}
	slices.Sort(out)
	return out
}
