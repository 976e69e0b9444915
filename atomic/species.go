package atomic

import (
	"regexp"
	"strconv"
	"strings"
)

var roman = []string{"I", "II", "III", "IV", "V", "VI", "VII", "VIII", "IX", "X"}

var atomForm = regexp.MustCompile(`^(\d{0,3}[A-Z][a-z]?) ([IVX]+)\**$`)

// SplitSpecies takes an atomic species apart: "Ca II" is element "Ca", stage 2
// (1 is the neutral). The mass number of an isotope and the stars of an excited
// level are left out ("6Li I" is "Li", 1; "C I*" is "C", 1); deuterium keeps its
// own symbol D. ok is false for a molecule or an unknown element.
func SplitSpecies(species string) (element string, stage int, ok bool) {
	m := atomForm.FindStringSubmatch(strings.Join(strings.Fields(species), " "))
	if m == nil {
		return "", 0, false
	}
	element = strings.TrimLeft(m[1], "0123456789")
	if _, known := Element(element); !known {
		return "", 0, false
	}
	for i, r := range roman {
		if r == m[2] {
			return element, i + 1, true
		}
	}
	return "", 0, false
}

var (
	moleculeForm = regexp.MustCompile(`^((\d{1,3})?[A-Z][a-z]?\d{0,2})+[+-]?$`)
	moleculePart = regexp.MustCompile(`(\d{1,3})?([A-Z][a-z]?)(\d{0,2})`)
)

// formula returns the mass in u and the number of atoms of a molecule such as
// "CH+", "13CN" or "C2". A number before the first symbol is a mass number; one
// after a symbol counts atoms.
func formula(species string) (mass float64, atoms int, ok bool) {
	if !moleculeForm.MatchString(species) {
		return 0, 0, false
	}
	rest := strings.TrimRight(species, "+-")
	for i := 0; rest != ""; i++ {
		at := moleculePart.FindStringSubmatchIndex(rest)
		if at == nil || at[0] != 0 {
			return 0, 0, false
		}
		m := moleculePart.FindStringSubmatch(rest)
		if m[1] != "" && i > 0 {
			return 0, 0, false
		}
		e, known := lookElement(m[1] + m[2])
		if !known {
			return 0, 0, false
		}
		n := 1
		if m[3] != "" {
			n, _ = strconv.Atoi(m[3])
			if n == 0 {
				return 0, 0, false
			}
		}
		mass, atoms = mass+float64(n)*e.Mass, atoms+n
		rest = rest[at[1]:]
	}
	return mass, atoms, atoms > 1
}

// validSpecies reports whether s names an atom in a stage, or a molecule.
func validSpecies(s string) bool {
	if strings.HasSuffix(s, "*") {
		return false // excited levels stand in Level
	}
	if _, _, ok := SplitSpecies(s); ok {
		_, known := lookElement(strings.Fields(s)[0])
		return known
	}
	_, _, ok := formula(s)
	return ok
}

// Carrier is the population that the line counts: the species in one level,
// "CN N=1", "C I*", "CH e", or the species alone ("Na I") where only its total or
// its ground level is meant.
func (l Line) Carrier() string { return carrier(l.Species, l.Level) }

func carrier(species, level string) string {
	switch {
	case level == "":
		return species
	case level[0] == '*':
		return species + level
	}
	return species + " " + level
}

// Molecule reports whether the carrier is a molecule.
func (l Line) Molecule() bool {
	_, _, atom := SplitSpecies(l.Species)
	return !atom
}

// Mass is the mass of the carrier in u: the standard atomic mass of the element
// or of the isotope in the name, the sum of them for a molecule (electrons and
// binding neglected, below 1e-3 u).
func (l Line) Mass() float64 {
	if _, _, atom := SplitSpecies(l.Species); atom {
		e, _ := lookElement(strings.Fields(l.Species)[0])
		return e.Mass
	}
	m, _, _ := formula(l.Species)
	return m
}
