package atomic

import (
	"fmt"
	"math"
	"slices"
	"sort"
	"strings"
	"sync"
)

// A Table is a list of transitions under one choice of f-values. It does not
// change once made and may be used from several goroutines.
type Table struct {
	lines []Line // ascending vacuum wavelength
	set   string
	look  []prefix // what a name may begin with
	keys  map[string]int
}

var base = sync.OnceValue(func() *Table {
	lines := must(readLines(embedded("lines.csv", Columns), false, nil))
	return newTable(lines, "default")
})

// Default returns the project's own table with its default f-values.
func Default() *Table { return base() }

// newTable sorts the lines, names those that have no name yet, and builds what
// Find looks in.
func newTable(lines []Line, set string) *Table {
	sort.SliceStable(lines, func(i, j int) bool { return lines[i].Wave < lines[j].Wave })
	taken := map[string]bool{}
	for _, l := range lines {
		if l.Name != "" {
			taken[l.Name] = true
		}
	}
	for i := range lines {
		l := &lines[i]
		for digits := 2; l.Name == ""; digits++ {
			if n := nameOf(*l, digits); !taken[n] || digits > 6 {
				l.Name = n
				taken[n] = true
			}
		}
	}
	t := &Table{lines: lines, set: set}
	t.index()
	return t
}

// airNames is the vacuum wavelength (Å) above which lines are called by their air
// wavelength. Spectra from the ground begin there; those from space are in vacuum
// and so are the names in use for their lines ("Mg II 2796", "Zn II 2026.14").
const airNames = 3000

func nameOf(l Line, digits int) string {
	w := l.Wave
	if w > airNames {
		w = l.WaveAir
	}
	s := l.Species
	if strings.HasPrefix(l.Level, "*") {
		s += l.Level
	}
	return fmt.Sprintf("%s %.*f", s, digits, w)
}

// Lines returns all lines, ascending in wavelength.
func (t *Table) Lines() []Line { return slices.Clone(t.lines) }

// Between returns the lines with lo ≤ Wave ≤ hi, vacuum Å, ascending.
func (t *Table) Between(lo, hi float64) []Line {
	if !(lo <= hi) {
		return nil
	}
	i := sort.Search(len(t.lines), func(i int) bool { return t.lines[i].Wave >= lo })
	j := sort.Search(len(t.lines), func(i int) bool { return t.lines[i].Wave > hi })
	return slices.Clone(t.lines[i:j])
}

// Of returns the lines of a species with all its levels ("CN", "C I"), or of one
// carrier alone ("CN N=1", "C I*", "CH e"), ascending in wavelength; none if it
// has no lines. Case and blanks do not matter.
func (t *Table) Of(species string) []Line {
	name, ok := t.spell(species)
	if !ok {
		return nil
	}
	var out []Line
	for _, l := range t.lines {
		if l.Species == name || l.Carrier() == name {
			out = append(out, l)
		}
	}
	return out
}

// Species returns the species of the table in the order of the alphabet.
func (t *Table) Species() []string {
	var out []string
	for _, l := range t.lines {
		out = append(out, l.Species)
	}
	slices.Sort(out)
	return slices.Compact(out)
}

// spell finds the species or carrier that is meant: as written, else without
// regard to blanks, else without regard to case, when only one is left.
func (t *Table) spell(s string) (string, bool) {
	s = clean(s)
	for _, same := range []func(a, b string) bool{
		func(a, b string) bool { return a == b },
		func(a, b string) bool { return squeeze(a) == squeeze(b) },
		func(a, b string) bool { return strings.EqualFold(a, b) },
		func(a, b string) bool { return strings.EqualFold(squeeze(a), squeeze(b)) },
	} {
		found, n := "", 0
		for _, p := range t.look {
			if p.name != "" && !p.element && same(p.name, s) {
				found, n = p.name, n+1
			}
		}
		if n == 1 {
			return found, true
		}
	}
	return "", false
}

// velocity between two wavelengths, km/s.
func apart(w, rest float64) float64 { return math.Abs(w-rest) / rest * C }
