package atomic

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/internal/oops"
)

// describe gives a line's name with a designation that tells it from others.
func (t *Table) describe(i int) string {
	l := t.lines[i]
	switch {
	case len(l.Alias) == 0:
		return l.Name
	case l.Molecule() && len(l.Alias) > 1:
		return fmt.Sprintf("%s (%s)", l.Name, l.Alias[1]) // the band and the branch
	}
	return fmt.Sprintf("%s (%s)", l.Name, l.Alias[0])
}

// notThere explains a name whose species is known but whose line is not.
func (t *Table) notThere(name string, r reading) error {
	lines := slices.Clone(r.p.lines)
	what := fmt.Sprintf("%q is no line of %s", name, r.p.name)
	switch {
	case r.rest == "":
		what = fmt.Sprintf("%q does not say which line", name)
	case !math.IsNaN(r.number):
		what = fmt.Sprintf("%s has no line at %.*f Å", r.p.name, r.digits, r.number)
		for _, i := range lines {
			if l := t.lines[i]; l.Wave > airNames && math.Abs(l.Wave-r.number) <= max(0.02, math.Pow(10, -float64(min(r.digits, 6)))) {
				return oops.Input("", "", what, fmt.Sprintf("that is the vacuum wavelength of %s: lines above 3000 Å are called by their air wavelength", l.Name))
			}
		}
		slices.SortStableFunc(lines, func(a, b int) int {
			da, db := math.Abs(t.lines[a].called()[0]-r.number), math.Abs(t.lines[b].called()[0]-r.number)
			switch {
			case da < db:
				return -1
			case da > db:
				return 1
			}
			return 0
		})
	}
	const most = 12
	more := ""
	if len(lines) > most {
		more = fmt.Sprintf(" and %d more", len(lines)-most)
		lines = lines[:most]
	}
	slices.Sort(lines)
	var names []string
	for _, i := range lines {
		names = append(names, t.describe(i))
	}
	return oops.Input("", "", what, "its lines are "+strings.Join(names, ", ")+more)
}

// suggest names what an unknown name may have meant.
func (t *Table) suggest(q string) string {
	var names []string
	for _, l := range t.lines {
		names = append(names, l.Name)
	}
	for _, l := range t.lines {
		for _, a := range l.Alias {
			names = append(names, l.Species+" "+a)
		}
	}
	if like := t.bare(q); len(like) > 0 && len(like) <= 8 {
		return "did you mean " + strings.Join(like, " or ") + "? Begin with the species"
	}
	near := oops.Nearest(q, names, 4)
	if len(near) == 0 {
		near = oops.Nearest(strings.TrimRight(q, "0123456789. "), t.Species(), 3)
	}
	if len(near) == 0 {
		return "the species are " + strings.Join(t.Species(), ", ")
	}
	return "the nearest names are " + strings.Join(near, ", ")
}

// bare lists the lines that a designation ("D2") or a wavelength without a species
// may mean.
func (t *Table) bare(q string) []string {
	wave, err := parseNumber(q)
	if err != nil {
		wave = math.Inf(1)
	}
	var out []string
	for i, l := range t.lines {
		like := math.Abs(l.Wave-wave) < 1 || math.Abs(l.WaveAir-wave) < 1
		for _, a := range l.Alias {
			like = like || fold(greek.Replace(a)) == fold(q)
		}
		if like {
			out = append(out, t.describe(i))
		}
	}
	return out
}
