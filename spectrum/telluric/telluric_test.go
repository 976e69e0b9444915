package telluric

import (
	"fmt"
	"math"
	"testing"

	"lacuna/atomic"
	"lacuna/spectrum/frame"
)

func TestTables(t *testing.T) {
	seen := map[string]bool{}
	water := 0
	for _, l := range Lines() {
		if _, ok := Cite(l.Source); !ok || l.Strength.Rank() == 0 {
			t.Errorf("%s: source %q, class %q", l.Name, l.Source, l.Strength)
		}
		if seen[l.Name] {
			t.Errorf("%s stands twice", l.Name)
		}
		seen[l.Name] = true
		if !(l.WaveErr > 0 && l.WaveErr <= 0.03) || !(math.Abs(frame.ToAir(l.Wave, frame.Ciddor1996)-l.WaveAir) < 1e-6) {
			t.Errorf("%s: %+v", l.Name, l)
		}
		if l.Molecule == "H2O" {
			water++
		}
	}
	if water < 500 {
		t.Errorf("%d water lines", water)
	}
	used := map[string]bool{"UVES-stars": true}
	for _, l := range Lines() {
		used[l.Source] = true
	}
	for _, r := range Ranges() {
		used[r.Source] = true
		if !(r.Lo < r.Hi) || !(r.Lo > r.LoAir) {
			t.Errorf("%v", r)
		}
	}
	for k := range sources() {
		if !used[k] {
			t.Errorf("source %q is not used", k)
		}
	}
	// every line lies in a range of its molecule, of its class at least
	for _, l := range Lines() {
		ok := false
		for _, r := range Covering(l.Wave, l.Wave) {
			ok = ok || r.Molecule == l.Molecule && r.Strength.Rank() >= l.Strength.Rank()
		}
		if !ok {
			t.Errorf("%s (%s) lies in no range", l.Name, l.Strength)
		}
	}
}

// The places where a survey of interstellar lines must be warned: design notes of
// the field (Na I D: water; K I 7665: O₂; DIB 6284: γ band; CN A-X and Rb I: water).
func TestWarnings(t *testing.T) {
	for name, molecule := range map[string]string{"Na I D2": "H2O", "Na I D1": "H2O", "K I 7665": "O2", "CN A-X (1,0) R1(0)": "H2O", "CN A-X (2,0) R1(0)": "H2O", "Rb I 7948": "H2O", "Ti II 3384": "O3"} {
		l, err := atomic.Default().Find(name)
		if err != nil {
			t.Fatal(err)
		}
		found := false
		for _, r := range Covering(l.Wave, l.Wave) {
			found = found || r.Molecule == molecule
		}
		if !found {
			t.Errorf("%s: no word of %s", name, molecule)
		}
	}
	for _, name := range []string{"Ca II K", "CH 4300", "CH+ 4232", "CN R(0)"} {
		l, _ := atomic.Default().Find(name)
		if n, c := Near(l.Wave-3, l.Wave+3), Covering(l.Wave, l.Wave); len(n)+len(c) != 0 {
			t.Errorf("%s: %v %v", name, n, c)
		}
	}
	if Near(6000, 5000) != nil || len(Near(math.NaN(), 1)) != 0 {
		t.Error("an empty interval has lines")
	}
}

func ExampleNear() {
	for _, l := range Near(5892.5, 5894.5) { // around Na I D2, vacuum, as the observer sees it
		fmt.Printf("%s ± %.2f %s\n", l.Name, l.WaveErr, l.Strength)
	}
	// Output:
	// H2O 5891.64 ± 0.01 weak
	// H2O 5892.39 ± 0.01 weak
}
