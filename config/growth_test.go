package config

import (
	"fmt"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"lacuna/internal/oops"
)

const batch = `
[growth]
name = "g"
b_range = [0.5, 20]
[[sightline]]
name = "Lantern 1"
[[sightline.width]]
line = "Ca II K"
W_mA = 120.3
err_mA = 3.1
[[sightline.width]]
line = "Ca II H"
limit_mA = 6
[[sightline.width]]
line = "K I 7699"
W_mA = -0.4
err_mA = 0.5
[[sightline.share_b]]
species = ["CN N=0", "cn n=1"]
`

func loadGrowth(t testing.TB, text string) (*Growth, error) {
	t.Helper()
	m, err := parseTOML("batch.toml", []byte(text), "lacuna new")
	if err != nil {
		return nil, err
	}
	return parseGrowth("batch.toml", m)
}

func TestGrowth(t *testing.T) {
	g, err := loadGrowth(t, batch)
	if err != nil {
		t.Fatal(err)
	}
	x := g.Sightlines[0]
	var got []string
	for _, w := range x.Widths {
		v, e, limit, sigma := w.Angstrom()
		got = append(got, fmt.Sprintf("%s %.4f %.4f %v %g", w.Line, v, e, limit, sigma))
	}
	want := []string{"Ca II 3933.66 0.1203 0.0031 false 0", "Ca II 3968.47 0.0060 0.0000 true 3", "K I 7698.96 -0.0004 0.0005 false 0"}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("got %v, want %v", got, want)
	}
	if x.BRange != [2]float64{0.5, 20} || !reflect.DeepEqual(x.ShareB, [][]string{{"CN N=0", "CN N=1"}}) {
		t.Errorf("%+v", x)
	}
	for _, text := range []string{batch, string(StarterGrowth())} {
		g, err := loadGrowth(t, text)
		if err != nil {
			t.Fatal(err)
		}
		again, err := loadGrowth(t, string(g.Resolved()))
		if err != nil {
			t.Fatalf("%v\n%s", err, g.Resolved())
		}
		same(t, g, again, g.Resolved(), again.Resolved())
	}
}

func TestGrowthMistakes(t *testing.T) {
	const head = "[growth]\nname=\"g\"\n"
	const star = head + "[[sightline]]\nname=\"A\"\n"
	for _, tc := range []struct {
		name, text string
		want       []string
	}{
		{"empty", "", []string{"nothing in it"}},
		{"no growth", "[[sightline]]\nname=\"A\"\nwidth=[{line=\"Na D2\", limit_mA=3}]\n", []string{"growth: missing"}},
		{"a survey", "[survey]\nname=\"s\"\n" + star + "width=[{line=\"Na D2\", limit_mA=3}]\n", []string{`"survey": unknown table`}},
		{"none", head, []string{"sightline: none; add [[sightline]] with widths, or a table"}},
		{"no width", star, []string{"sightline 1 (A): no width"}},
		{"nothing measured", star + "width=[{line=\"Na D2\"}]\n", []string{"width 1: needs either a width or a limit"}},
		{"both", star + "width=[{line=\"Na D2\", W_mA=1, err_mA=1, limit_mA=3}]\n", []string{"width 1: needs either a width or a limit"}},
		{"no error", star + "width=[{line=\"Na D2\", W_mA=1}]\n", []string{"width 1: err_mA: missing"}},
		{"error 0", star + "width=[{line=\"Na D2\", W_mA=1, err_mA=0}]\n", []string{"err_mA: 0 mÅ is impossible; must lie in (0, 1e6]"}},
		{"limit with error", star + "width=[{line=\"Na D2\", limit_mA=1, err_mA=1}]\n", []string{"err_mA: a limit has no error"}},
		{"level of a width", star + "width=[{line=\"Na D2\", W_mA=1, err_mA=1, sigma=3}]\n", []string{"sigma: only a limit has a level"}},
		{"line", star + "width=[{line=\"Na D9\", limit_mA=1}]\n", []string{"sightline 1 (A): width 1: line: "}},
		{"key", star + "width=[{line=\"Na D2\", limit=1}]\n", []string{"limit: unknown key; did you mean line or limit_mA?"}},
		{"the same twice", star + "width=[{line=\"Na D2\", limit_mA=1}, {line=\"Na I 5889.95\", limit_mA=1}]\n", []string{"the same width of Na I 5889.95 is there twice"}},
		{"alone", star + "width=[{line=\"Na D2\", limit_mA=1}]\nshare_b=[{species=[\"CN N=0\"]}]\n", []string{"share_b 1: species: one species shares b with nobody"}},
		{"two groups", star + "width=[{line=\"Na D2\", limit_mA=1}]\nshare_b=[{species=[\"CN\",\"CH\"]},{species=[\"CH\",\"CH+\"]}]\n", []string{"share_b 2: species: CH already shares b with CN, CH"}},
		{"b", head + "b_range=[0, 3]\n[[sightline]]\nname=\"A\"\nwidth=[{line=\"Na D2\", limit_mA=1}]\n", []string{"growth: b_range: 0 km/s is impossible"}},
		{"no table", head + "table=\"none.csv\"\n", []string{"none.csv"}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			_, err := loadGrowth(t, tc.text)
			checkMistake(t, err, tc.want)
			if err != nil && strings.Contains(err.Error(), "\n") {
				t.Errorf("more than the one mistake:\n%v", err)
			}
		})
	}
}

func withWidths(t testing.TB, text, csv string) (*Growth, error) {
	t.Helper()
	dir := t.TempDir()
	for name, b := range map[string]string{"g.toml": text, "w.csv": csv} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(b), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return LoadGrowth(filepath.Join(dir, "g.toml"))
}

const tableTOML = "[growth]\nname=\"g\"\ntable=\"w.csv\"\nlimit_sigma=2\n[[sightline]]\nname=\"A\"\nb_range=[1, 2]\nwidth=[{line=\"Na D1\", W_mA=50, err_mA=2}]\n"

func TestGrowthTable(t *testing.T) {
	g, err := withWidths(t, tableTOML, `sightline,line,order,W_mA,W_err_mA,W_kind
B,Ca II K,86,120.3,3.1,value
A,Na D2,,80,2,value
B,Ca II K,87,121.0,4.0,marginal
B,Ca II H,,6.5,,upper
`)
	if err != nil {
		t.Fatal(err)
	}
	var got []string
	for _, x := range g.Sightlines {
		s := fmt.Sprint(x.Name, x.BRange)
		for _, w := range x.Widths {
			v, e, limit, sigma := w.Angstrom()
			s += fmt.Sprintf("; %s %.4f %.4f %v %g", w.Line, v, e, limit, sigma)
		}
		got = append(got, s)
	}
	want := []string{
		"B[0.3 30]; Ca II 3933.66 0.1203 0.0031 false 0; Ca II 3933.66 0.1210 0.0040 false 0; Ca II 3968.47 0.0065 0.0000 true 2",
		"A[1 2]; Na I 5889.95 0.0800 0.0020 false 0; Na I 5895.92 0.0500 0.0020 false 0",
	}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("got\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(want, "\n"))
	}
	if len(g.Notes) != 1 || !strings.Contains(g.Notes[0], "two widths of Ca II 3933.66") {
		t.Errorf("notes %v", g.Notes)
	}
}

func TestGrowthTableMistakes(t *testing.T) {
	for _, tc := range []struct {
		name, csv string
		want      []string
	}{
		{"no column", "sightline,line,W_mA\nA,Na D2,8\n", []string{`no column "W_err_mA"`}},
		{"a slip", "sightline,line,W_mA,W_err_mA,W_knd\nB,Na D2,8,,upper\n", []string{"column W_knd: is this W_kind?"}},
		{"kind", "sightline,line,W_mA,W_err_mA,W_kind\nB,Na D2,8,,<\n", []string{"w.csv line 2: W_kind: \"<\" is not known"}},
		{"no error", "sightline,line,W_mA,W_err_mA,W_kind\nB,Na D2,8,,value\n", []string{"w.csv line 2: W_err_mA: missing"}},
		{"no width", "sightline,line,W_mA,W_err_mA\nB,Na D2,,1\n", []string{"w.csv line 2: W_mA: missing"}},
		{"a word", "sightline,line,W_mA,W_err_mA\nB,Na D2,wide,1\n", []string{"line 2, column W_mA", `"wide"`}},
		{"nan", "sightline,line,W_mA,W_err_mA\nB,Na D2,nan,1\n", []string{"W_mA: NaN is not a number to work with"}},
		{"line", "sightline,line,W_mA,W_err_mA\nB,Na D9,8,1\n", []string{"w.csv line 2: line: "}},
		{"no name", "sightline,line,W_mA,W_err_mA\n,Na D2,8,1\n", []string{"w.csv line 2: a row without a name"}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			_, err := withWidths(t, tableTOML, tc.csv)
			checkMistake(t, err, tc.want)
		})
	}
}

func FuzzLoadGrowth(f *testing.F) {
	f.Add(batch)
	f.Add(string(StarterGrowth()))
	f.Fuzz(func(t *testing.T, text string) {
		if strings.Contains(text, "table") {
			return // files of this machine
		}
		g, err := loadGrowth(t, text)
		if err != nil {
			if !oops.IsInput(err) {
				t.Fatal(err)
			}
			return
		}
		again, err := loadGrowth(t, string(g.Resolved()))
		if err != nil {
			t.Fatalf("%v\n%s", err, g.Resolved())
		}
		same(t, g, again, g.Resolved(), again.Resolved())
	})
}
