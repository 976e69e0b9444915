package atomic

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/internal/oops"
)

// A prefix is what a line's name may begin with: a species, a carrier or, for
// atoms, the element alone ("Na D2").
type prefix struct {
	name    string
	element bool
	lines   []int

	squeezed, folded, lower string // of name
}

// index prepares Find. A species without a level stands for its ground level in
// an atom ("C I" is not "C I*"), for all its levels in a molecule.
func (t *Table) index() {
	at := map[string]int{}
	put := func(name string, element bool, line int) {
		key := fmt.Sprint(element, name)
		i, ok := at[key]
		if !ok {
			i = len(t.look)
			at[key] = i
			t.look = append(t.look, prefix{name: name, element: element, squeezed: squeeze(name), folded: fold(name), lower: strings.ToLower(name)})
		}
		t.look[i].lines = append(t.look[i].lines, line)
	}
	t.keys = map[string]int{}
	for i, l := range t.lines {
		t.keys[l.Name] = i
		mol := l.Molecule()
		if mol || l.Level == "" {
			put(l.Species, false, i)
		}
		if l.Level != "" {
			put(l.Carrier(), false, i)
		} else if e, _, ok := SplitSpecies(l.Species); ok && !mol {
			put(e, true, i)
		}
	}
}

var greek = strings.NewReplacer("α", "alpha", "β", "beta", "γ", "gamma", "δ", "delta", "ε", "epsilon",
	"λ", " ", "Å", "", "−", "-", "–", "-", "₂", "2", "₃", "3", "⁺", "+", "¹³", "13", "¹²", "12", "⁶", "6", "⁷", "7", "_", " ")

// clean makes one spelling of blanks and signs, and drops the mass number of the
// common isotope, which our species do not carry.
func clean(s string) string {
	s = strings.Join(strings.Fields(greek.Replace(s)), " ")
	for _, common := range []string{"12C", "7Li", "14N", "16O"} {
		if strings.HasPrefix(s, common) {
			return strings.TrimLeft(s, "0123456789")
		}
	}
	return s
}

func squeeze(s string) string { return strings.ReplaceAll(s, " ", "") }

func fold(s string) string { return strings.ToLower(squeeze(s)) }

// Find returns the line of a name: species and wavelength ("Na I 5889.95", "CH
// 4300"), or species and designation ("Ca II K", "CN R(0)", "H I Ly-alpha"). Case
// and blanks do not matter where the name stays plain without them.
//
// A wavelength is in air above 3000 Å and in vacuum below 2000 Å; between them
// both are understood. It may be rounded or cut to any number of digits. Where a
// molecule's lines from several levels fit, that from its lowest level is meant
// ("CN 3874" is R(0), not R(1) at 3873.99); "C I" is the ground level only.
//
// An unknown or ambiguous name is an oops.Input error with the candidates.
func (t *Table) Find(name string) (Line, error) {
	q := clean(name)
	if i, ok := t.keys[q]; ok {
		return t.lines[i], nil
	}
	if len(name) > 200 || q == "" {
		return Line{}, oops.Input("", "", "no name of a line", `write for example "Na I 5889.95" or "Ca II K"`)
	}
	read := t.readings(q)
	hits, best := t.matches(read)
	switch {
	case len(hits) == 1:
		return t.lines[hits[0]], nil
	case len(hits) > 1:
		var names []string
		for _, i := range hits {
			names = append(names, t.describe(i))
		}
		return Line{}, oops.Inputf("", "", "write one of: "+strings.Join(names, ", "), "%q fits several lines", name)
	}
	if l := t.byAlias(q); len(l) == 1 {
		return t.lines[l[0]], nil
	}
	if w := strings.Fields(q); best != nil && (len(w) < 2 || !validSpecies(w[0]+" "+w[1]) || best.exact == 3) {
		return Line{}, t.notThere(name, *best)
	}
	return Line{}, oops.Inputf("", "", t.suggest(q), "no line %q in the table", name)
}

// A reading is one way to take a name apart.
type reading struct {
	p      prefix
	rest   string
	number float64 // NaN: a designation
	digits int
	exact  int // 3: the prefix stands there as a word; 2: but for blanks; 1: but for case; 0: but for both
}

// word reports whether s begins with p and a blank, or is p.
func word(s, p string) bool {
	return strings.HasPrefix(s, p) && (len(s) == len(p) || s[len(p)] == ' ')
}

func (t *Table) readings(q string) []reading {
	var out []reading
	sq, fq, lq := squeeze(q), fold(q), strings.ToLower(q)
	for _, p := range t.look {
		if !strings.HasPrefix(fq, p.folded) {
			continue
		}
		r := reading{p: p, rest: strings.TrimSuffix(fq[len(p.folded):], "angstrom"), number: math.NaN()}
		switch {
		case word(q, p.name):
			r.exact = 3
		case strings.HasPrefix(sq, p.squeezed):
			r.exact = 2
		case word(lq, p.lower):
			r.exact = 1
		}
		if n := strings.TrimSuffix(r.rest, "a"); strings.Trim(n, "0123456789.") == "" {
			if x, err := parseNumber(n); err == nil {
				r.number = x
				if _, frac, ok := strings.Cut(n, "."); ok {
					r.digits = len(frac)
				}
			}
		}
		out = append(out, r)
	}
	return out
}

// matches returns the lines of the best reading that has any, and the reading to
// explain a failure with.
func (t *Table) matches(read []reading) (hits []int, best *reading) {
	top := -1
	for k := range read {
		r := &read[k]
		h := t.in(*r)
		switch {
		case len(h) == 0 && len(hits) == 0:
			if r.plain() && (best == nil || len(r.p.name) > len(best.p.name)) {
				best = r
			}
		case len(h) == 0:
		case r.exact > top:
			hits, top = h, r.exact
		case r.exact == top:
			for _, i := range h {
				if !slices.Contains(hits, i) {
					hits = append(hits, i)
				}
			}
		}
	}
	slices.Sort(hits)
	return hits, best
}

// plain: a blank or a wavelength follows the prefix, so that it is likely to be
// meant and its lines explain what went wrong.
func (r reading) plain() bool {
	return r.rest == "" || !math.IsNaN(r.number) && !r.p.element || r.exact == 3 || r.exact == 1
}

func (t *Table) in(r reading) []int {
	if r.rest == "" {
		if len(r.p.lines) == 1 && !r.p.element {
			return r.p.lines
		}
		return nil
	}
	if !math.IsNaN(r.number) {
		return t.near(r)
	}
	var out []int
	for _, i := range r.p.lines {
		for _, a := range t.lines[i].Alias {
			if fold(greek.Replace(a)) == r.rest && !slices.Contains(out, i) {
				out = append(out, i)
			}
		}
	}
	return out
}

// near: the lines whose wavelength, rounded or cut to the digits given, is the
// number; with two digits or more, failing that, those within 0.02 Å, since rest
// wavelengths in papers differ by that.
func (t *Table) near(r reading) []int {
	step := math.Pow(10, -float64(min(r.digits, 6)))
	var round, cut, close []int
	for _, i := range r.p.lines {
		for _, w := range t.lines[i].called() {
			d := w - r.number
			switch {
			case math.Abs(d) <= step/2+1e-9:
				round = append(round, i)
			case d > 0 && d < step+1e-9:
				cut = append(cut, i)
			case r.digits >= 2 && math.Abs(d) <= 0.02:
				close = append(close, i)
			}
		}
	}
	ground := func(i int) bool { return t.lines[i].ELow > 0 }
	if all := append(slices.Clone(round), cut...); slices.ContainsFunc(all, func(i int) bool { return !ground(i) }) {
		round, cut = slices.DeleteFunc(round, ground), slices.DeleteFunc(cut, ground)
	}
	for _, h := range [][]int{round, cut, close} {
		if len(h) > 0 {
			slices.Sort(h)
			return slices.Compact(h)
		}
	}
	return nil
}

// called: the wavelengths that a line goes by.
func (l Line) called() []float64 {
	switch {
	case l.Wave <= airFrom:
		return []float64{l.Wave}
	case l.Wave <= airNames:
		return []float64{l.Wave, l.WaveAir}
	}
	return []float64{l.WaveAir}
}

func (t *Table) byAlias(q string) []int {
	var out []int
	if len(squeeze(q)) < 3 {
		return nil
	}
	for i, l := range t.lines {
		for _, a := range l.Alias {
			if fold(greek.Replace(a)) == fold(q) && l.Species != "D I" && !slices.Contains(out, i) {
				out = append(out, i)
			}
		}
	}
	return out
}
