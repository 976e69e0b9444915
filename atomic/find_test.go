package atomic

import (
	"fmt"
	"strings"
	"testing"

	"lacuna/internal/oops"
)

func TestFind(t *testing.T) {
	for name, want := range map[string]string{
		"Na I 5889.95": "Na I 5889.95", "Na I 5890": "Na I 5889.95", "NaI 5890": "Na I 5889.95", "na i 5889.951": "Na I 5889.95",
		"NaI D2": "Na I 5889.95", "Na I D1": "Na I 5895.92", "Na D2": "Na I 5889.95", "Na I 3302": "Na I 3302.37", "Na I 3303": "Na I 3302.98",
		"Ca II K": "Ca II 3933.66", "caiih": "Ca II 3968.47", "Ca II 3933.66 Å": "Ca II 3933.66", "Ca I 4227": "Ca I 4226.73",
		"K I 7699": "K I 7698.96", "K I 7665": "K I 7664.90", "K 7699": "K I 7698.96",
		"CH 4300": "CH 4300.31", "CH 4300.313": "CH 4300.31", "CH e 3890": "CH 3890.22", "CH B-X R2(1)": "CH 3878.77",
		"CH+ 4232": "CH+ 4232.55", "CH⁺ 3957.70": "CH+ 3957.69", "CH+ (0,0) R(0)": "CH+ 4232.55", "13CH+ 4232": "13CH+ 4232.28", "¹³CH+ 3958.12": "13CH+ 3958.12",
		"CN R(0)": "CN 3874.60", "CN 3874": "CN 3874.60", "CN 3874.608": "CN 3874.60", "CN R(1)": "CN 3873.99", "CN 3873.99": "CN 3873.99",
		"CN N=1 P(1)": "CN 3875.76", "CN A-X (2,0) R1(0)": "CN 7906.60", "12CN R(0)": "CN 3874.60", "13CN": "13CN 3874.77",
		"C2 (2,0) Q(2)": "C2 8761.19", "C2 8757": "C2 8757.69",
		"Zn II 2026.14": "Zn II 2026.14", "Zn II 2025.48": "Zn II 2026.14", "Fe II 2344": "Fe II 2344.21", "Fe II 2374": "Fe II 2374.46",
		"Mg II k": "Mg II 2796.35", "Mg I 2852": "Mg I 2852.96", "Mn II 2576": "Mn II 2576.88", "Ti II 3383.77": "Ti II 3383.76",
		"C I 1657": "C I 1656.93", "C I* 1656.27": "C I* 1656.27", "CI** 1657": "C I** 1657.01", "SiII 1190": "Si II 1190.42", "S III 1190": "S III 1190.20",
		"H I 1215.67": "H I 1215.67", "Ly-alpha": "H I 1215.67", "Lyα": "H I 1215.67", "D I Lyman alpha": "D I 1215.34",
		"Li I D2": "Li I 6707.76", "7Li I 6707.76": "Li I 6707.76", "6Li I D1": "6Li I 6708.07", "O I 1355.6": "O I 1355.60",
	} {
		l, err := Default().Find(name)
		if err != nil || l.Name != want {
			t.Errorf("Find(%q) = %q, %v; want %q", name, l.Name, err, want)
		}
	}
}

// Every line is found by its own name, and by its species with each designation
// that it does not share.
func TestFindOwnNames(t *testing.T) {
	lines := Default().Lines()
	shared := map[string]int{}
	for _, l := range lines {
		for _, a := range l.Alias {
			shared[l.Carrier()+" "+a]++
		}
	}
	for _, l := range lines {
		for _, n := range []string{l.Name, strings.ToLower(l.Name), fmt.Sprintf("%s %.2f", carrier(l.Species, l.Level), l.called()[0])} {
			if got, err := Default().Find(n); err != nil || got.Name != l.Name {
				t.Errorf("Find(%q) = %q, %v; want %q", n, got.Name, err, l.Name)
			}
		}
		for _, a := range l.Alias {
			got, err := Default().Find(l.Carrier() + " " + a)
			if n := shared[l.Carrier()+" "+a]; n == 1 && (err != nil || got.Name != l.Name) || n > 1 && err == nil {
				t.Errorf("Find(%q) = %q, %v (%d lines)", l.Carrier()+" "+a, got.Name, err, n)
			}
		}
	}
}

func TestFindRefuses(t *testing.T) {
	for name, hint := range map[string]string{
		"":              "Na I 5889.95",
		"Na I":          "Na I 5895.92 (D1)",
		"Na I 6000":     "Na I 3302.37",
		"Na I D3":       "Na I 5889.95 (D2)",
		"Ca II 3934.78": "vacuum wavelength of Ca II 3933.66",
		"C2 R(0)":       "C2 10143.72",
		"CH+ R(0)":      "CH+ 4232.55",
		"Li I 6708":     "Li I",
		"Nq I 5889.95":  "Na I",
		"He I 3889":     "nearest",
		"siii1190":      "S III 1190.20",
		"5890":          "",
		"CN R(9)":       "CN 3874.60",
		"Xy":            "",
		"\x00\xff Å λ":  "",
		"H I Ly-omega":  "Ly-alpha",
		"C2 8751":       "C2 875",
	} {
		l, err := Default().Find(name)
		if err == nil {
			t.Errorf("Find(%q) = %q", name, l.Name)
			continue
		}
		if !oops.IsInput(err) || !strings.Contains(err.Error(), hint) {
			t.Errorf("Find(%q): %v; want a hint of %q", name, err, hint)
		}
	}
}

func TestOfAndBetween(t *testing.T) {
	tab := Default()
	for species, want := range map[string]int{"Na I": 4, "nai": 4, "C I": 20, "C I*": 8, "C I**": 7, "CN N=1": 5, "CH e": 3, "ch": 10, "CH+": 5, "Qq I": 0, "": 0} {
		if got := len(tab.Of(species)); got != want {
			t.Errorf("Of(%q): %d lines, want %d", species, got, want)
		}
	}
	all := tab.Lines()
	for _, w := range [][2]float64{{0, 1e9}, {5891, 5898}, {5891.5833, 5891.5833}, {7000, 6000}, {1, 2}} {
		n := 0
		for _, l := range all {
			if l.Wave >= w[0] && l.Wave <= w[1] {
				n++
			}
		}
		if got := tab.Between(w[0], w[1]); len(got) != n {
			t.Errorf("Between(%g, %g): %d, want %d", w[0], w[1], len(got), n)
		}
	}
	all[0].Name = "spoilt"
	if Default().Lines()[0].Name == "spoilt" {
		t.Error("the table can be changed from outside")
	}
}

func FuzzFind(f *testing.F) {
	for _, s := range []string{"Na I 5890", "CN R(0)", "siii1190", "C I** 1657.01", "Lyα", "13CH+", "1e9", "CH 4300.00000000000000000000001"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		l, err := Default().Find(s)
		if (err == nil) == (l.Name == "") || err != nil && !oops.IsInput(err) {
			t.Fatalf("%q: %q, %v", s, l.Name, err)
		}
	})
}

func ExampleTable_Find() {
	l, err := Default().Find("CN R(1)")
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("%s counts %s: f = %.4f ± %.4f, %s\n", l.Name, l.Carrier(), l.F, l.FErr, l.FSource)
	_, err = Default().Find("Na I 6000")
	fmt.Println(err)
	// Output:
	// CN 3873.99 counts CN N=1: f = 0.0228 ± 0.0007, CN-f00
	// Na I has no line at 6000 Å; its lines are Na I 3302.37, Na I 3302.98, Na I 5889.95 (D2), Na I 5895.92 (D1)
}

func BenchmarkFind(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		if _, err := Default().Find("NaI 5890"); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkBetween(b *testing.B) {
	for b.Loop() {
		Default().Between(3870, 3900)
	}
}
