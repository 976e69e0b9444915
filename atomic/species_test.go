package atomic

import (
	"math"
	"testing"
)

func TestSplitSpecies(t *testing.T) {
	for s, want := range map[string]struct {
		e  string
		n  int
		ok bool
	}{
		"Ca II": {"Ca", 2, true}, "Na I": {"Na", 1, true}, "C IV": {"C", 4, true}, "O VI": {"O", 6, true}, "C I*": {"C", 1, true},
		"6Li I": {"Li", 1, true}, "D I": {"D", 1, true}, " Fe  II ": {"Fe", 2, true},
		"CH": {}, "CH+": {}, "CN": {}, "C2": {}, "Qq I": {}, "Ca": {}, "Ca IIII": {}, "ca II": {}, "": {},
	} {
		e, n, ok := SplitSpecies(s)
		if e != want.e || n != want.n || ok != want.ok {
			t.Errorf("SplitSpecies(%q) = %q, %d, %v", s, e, n, ok)
		}
	}
}

// Masses: IUPAC 2021 standard atomic weights and nuclide masses added by hand.
func TestMasses(t *testing.T) {
	for s, want := range map[string]float64{"Na I": 22.98977, "Ca II": 40.078, "H I": 1.008, "D I": 2.014102, "6Li I": 6.015123, "CH": 13.019, "CH+": 13.019,
		"13CH+": 13.003355 + 1.008, "CN": 26.018, "13CN": 13.003355 + 14.007, "C2": 24.022, "C3": 36.033, "OH": 17.007, "NH": 15.015} {
		l := Line{Species: s}
		if got := l.Mass(); !(math.Abs(got-want) <= 2e-5) {
			t.Errorf("%s: %g u, want %g", s, got, want)
		}
		if _, _, atom := SplitSpecies(s); atom == l.Molecule() {
			t.Errorf("%s: molecule %v", s, l.Molecule())
		}
	}
	for _, s := range []string{"H2", "CO", "HD", "H3+", "C60+", "SH+", "13CO", "CH3"} {
		if !validSpecies(s) {
			t.Errorf("%q is refused", s)
		}
	}
	for _, s := range []string{"Na", "C0", "Xy2", "C I*", "na i", "CH++", "99Tc2", "Na 1"} {
		if validSpecies(s) {
			t.Errorf("%q is accepted", s)
		}
	}
	// two neighbours of the periodic table whose masses run against their order
	for _, p := range [][2]string{{"Ar", "K"}, {"Co", "Ni"}, {"Te", "I"}} {
		a, _ := Element(p[0])
		b, _ := Element(p[1])
		if a.Z+1 != b.Z || a.Mass <= b.Mass {
			t.Errorf("%v %v", a, b)
		}
	}
	z := map[int]int{}
	for s, e := range elements() {
		if s[0] >= 'A' && s != "D" {
			z[e.Z]++
		}
	}
	for i := 1; i <= 92; i++ {
		if z[i] != 1 {
			t.Errorf("element %d stands %d times", i, z[i])
		}
	}
	if _, ok := Element("6Li"); ok {
		t.Error("an isotope passes for an element")
	}
}

func TestCarrier(t *testing.T) {
	for name, want := range map[string]string{"Na I D2": "Na I", "C I* 1656.27": "C I*", "CN R(1)": "CN N=1", "CH 3886": "CH f", "CH 3890": "CH e",
		"CH 4300": "CH", "OH 3078": "OH f", "OH 3082": "OH e", "C2 8757": "C2 J=0", "CH+ 4232": "CH+", "Fe II* 2396": "Fe II*"} {
		if got := find(t, name).Carrier(); got != want {
			t.Errorf("%s: carrier %q, want %q", name, got, want)
		}
	}
}

// ../shared/reference/abundances.md §4.
func TestDominance(t *testing.T) {
	for s, want := range map[string]RuleKind{"N I": Direct, "O I": Direct, "Ar I": Direct, "Kr I": Direct, "C II": Direct, "C II*": Direct, "Mg II": Direct,
		"Ti II": Direct, "Fe II": Direct, "Zn II": Direct, "Pb II": Direct, "Cl I": Sum, "Cl II": Sum, "Ca II": Partly, "Sr II": Partly, "Ba II": Partly,
		"Li I": Trace, "Na I": Trace, "Mg I": Trace, "Al I": Trace, "Si I": Trace, "S I": Trace, "K I": Trace, "Ca I": Trace, "Mn I": Trace, "Fe I": Trace,
		"Ni I": Trace, "Rb I": Trace, "C I": Trace, "C I**": Trace, "CH": Never, "CH e": Never, "CH+": Never, "CN N=1": Never, "C2": Never, "SH+": Never,
		"Al III": Never, "C IV": Never, "U II": NoRule, "": NoRule} {
		r := Dominance(s)
		if r.Kind != want || r.Reason == "" {
			t.Errorf("Dominance(%q) = %+v, want %s", s, r, want)
		}
	}
	for _, s := range []string{"C II", "N I", "Al II", "Si II", "S II", "Fe II", "Mg II"} {
		if Dominance(s).Warning == "" {
			t.Errorf("%s: no word of H II gas", s)
		}
	}
	for _, l := range Default().Lines() { // every species that can be measured has a rule
		if Dominance(l.Species).Kind == NoRule {
			t.Errorf("%s has no rule", l.Species)
		}
	}
}

// Errors of f by grade: the classes of the NIST database.
func TestGrades(t *testing.T) {
	for name, rel := range map[string]float64{"Na I D2": 0.01, "K I 7699": 0.003, "Ca II K": 0.10, "CN R(0)": 0.03, "CH 4300": 0.05, "CH 3886": 0.10,
		"C2 8757": 0.20, "Ni II 1741": 0.10, "H I 1215.67": 0} {
		l := find(t, name)
		if !(math.Abs(l.FErr-rel*l.F) <= 1e-12) {
			t.Errorf("%s: %g of %g, want %g", name, l.FErr, l.F, rel)
		}
	}
	if l := find(t, "Ti II 1910.61"); l.FErr != 0.004 { // printed in the abstract of Wiese et al. 2001
		t.Errorf("Ti II 1910.61: %g", l.FErr)
	}
}

// Merging keeps strength and centre of gravity; the hyperfine lines of sodium
// collapse to their two lower levels.
func TestWithin(t *testing.T) {
	for _, l := range Default().Lines() {
		for _, dv := range []float64{0, 0.15, 100} {
			var s, c, s0, c0 float64
			for _, p := range l.Parts {
				s0, c0 = s0+p.Strength, c0+p.Strength*p.DV
			}
			m := l.Within(dv)
			for _, p := range m {
				s, c = s+p.Strength, c+p.Strength*p.DV
			}
			if len(l.Parts) == 0 {
				s0 = 1
			}
			if !(math.Abs(s-s0) < 1e-12) || !(math.Abs(c-c0) < 1e-12) {
				t.Errorf("%s within %g: %g at %g, was %g at %g", l.Name, dv, s, c, s0, c0)
			}
			if dv == 100 && len(m) != 1 {
				t.Errorf("%s: %d members within 100 km/s", l.Name, len(m))
			}
		}
	}
	d2 := find(t, "Na I D2").Within(0.15)
	if len(d2) != 2 || d2[0].Low != "1" || d2[1].Low != "2" || !(math.Abs(d2[0].DV+0.6296) < 5e-4) || !(math.Abs(d2[1].Strength-0.625) < 1e-6) {
		t.Errorf("Na I D2: %+v", d2) // merged_by_F_lower of ../shared/reference/hyperfine.csv
	}
}
