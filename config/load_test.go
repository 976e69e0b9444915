package config

import (
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
	"reflect"
	"regexp"
	"strings"
	"testing"

	"lacuna/internal/oops"
	"lacuna/spectrum/frame"
)

const small = `
[survey]
name = "Lantern survey"
scale = "asplund2021"
[defaults]
velocity = [-50, 45]
lines = ["Na I 5889.95", "Ca II K", "CH 4300"]
zero_level = {level = 0.0, err = 0.005}
[defaults.spectrum]
medium = "air"
resolving_power = 40000
[[sightline]]
name = "Lantern 1"
E_BV = {value = 0.3, err = 0.03, source = "invented"}
[[sightline.spectrum]]
file = "lantern1.fits"
frame = "topocentric"
correction = 13.888
resolving_power = 42310
mask = [[3930.1, 3930.3]]
[[sightline.line]]
name = "Na I 5889.95"
window = [-40, 40]
continuum = [[-250, -60], [60, 250]]
degree = 2
auto_window = false
[sightline.hydrogen]
logN_HI = 21.1
logN_HI_err = 0.05
logN_H2_max = 20.2
source = "Author 2001"
[[sightline.column]]
species = "Zn II"
logN = 13.1
kind = "upper"
source = "Author 2001"
[[sightline.adopt]]
species = "na i"
method = "growth curve"
reason = "the strong line is saturated"
`

func load(t testing.TB, text string) (*Survey, error) {
	t.Helper()
	m, err := parseTOML("lantern.toml", []byte(text), "lacuna new")
	if err != nil {
		return nil, err
	}
	return parse("lantern.toml", m)
}

func mustLoad(t testing.TB, text string) *Survey {
	t.Helper()
	s, err := load(t, text)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func TestLayers(t *testing.T) {
	s := mustLoad(t, small)
	x := s.Sightlines[0]
	if s.Frame != frame.Heliocent || s.Scale != "asplund2021" || s.FSet != "default" || s.Seed != 1 {
		t.Errorf("survey %+v", s)
	}
	if x.Detection != 3 || x.LimitSigma != 3 || x.BRange != [2]float64{0.3, 30} || x.ZeroLevel != (ZeroLevel{0, 0.005}) {
		t.Errorf("sightline %+v", x)
	}
	sp := x.Spectra[0]
	if sp.Medium != frame.Air || sp.Frame != frame.Topocentric || *sp.Correction != 13.888 || sp.R != 42310 || sp.RErr != 0.05 || sp.HDU != nil || sp.Normalised != nil {
		t.Errorf("spectrum %+v", sp)
	}
	var got []string
	for _, l := range x.Lines {
		got = append(got, fmt.Sprintf("%s [%g, %g] b %g degree %d required %v", l.Name, l.Window[0], l.Window[1], l.B, l.Degree, l.Required))
	}
	want := []string{
		"Na I 5889.95 [-40, 40] b 2 degree 2 required true",
		"Ca II 3933.66 [-50, 45] b 2 degree -1 required false",
		"CH 4300.31 [-50, 45] b 1 degree -1 required false",
	}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("lines\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(want, "\n"))
	}
	if h := x.Hydrogen; *h.HI != 21.1 || h.H2 != nil || *h.H2Max != 20.2 || h.H != nil {
		t.Errorf("hydrogen %+v", h)
	}
	if c := x.Columns[0]; c.Sigma != 3 || c.Kind != "upper" || c.Species != "Zn II" {
		t.Errorf("column %+v", c)
	}
	if a := x.Adopt[0]; a.Species != "Na I" || a.LogN != nil {
		t.Errorf("adopt %+v", a)
	}
}

func TestLinesMerge(t *testing.T) {
	s := mustLoad(t, `
[survey]
name = "s"
[defaults]
velocity = [-50, 45]
lines = ["Ca II K", "Ca II H", "K I 7698.96"]
auto_window = true
[[defaults.line]]
name = "Ca II 3933.66"
degree = 1
b = 1.5
[[defaults.line]]
name = "CH+ 4232"
[[sightline]]
name = "Lantern 1"
[[sightline.spectrum]]
file = "a.fits"
[[sightline.line]]
name = "Ca II K"
order = 86
b = 3
[[sightline.line]]
name = "Ca II K"
order = 87
auto_window = false
[[sightline.line]]
name = "Ca II H"
use = false
[[sightline]]
name = "Lantern 2"
lines = ["Na D2"]
[[sightline.spectrum]]
file = "b.fits"
`)
	show := func(x Sightline) string {
		var out []string
		for _, l := range x.Lines {
			order := "-"
			if l.Order != nil {
				order = fmt.Sprint(*l.Order)
			}
			out = append(out, fmt.Sprintf("%s/%s/%d/%g/%v/%v", l.Name, order, l.Degree, l.B, l.AutoWindow, l.Required))
		}
		return strings.Join(out, " ")
	}
	if got, want := show(s.Sightlines[0]), "Ca II 3933.66/86/1/3/true/true Ca II 3933.66/87/1/1.5/false/true K I 7698.96/-/-1/2/true/false CH+ 4232.55/-/-1/1/true/false"; got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
	if got := s.Sightlines[0].Skipped; !reflect.DeepEqual(got, []string{"Ca II 3968.47"}) {
		t.Errorf("skipped %v", got)
	}
	if got, want := show(s.Sightlines[1]), "Na I 5889.95/-/-1/2/true/true Ca II 3933.66/-/1/1.5/true/false CH+ 4232.55/-/-1/1/true/false"; got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
}

var mark = regexp.MustCompile(`  # [a-zA-Z_ ]*`)

// same fails unless two surveys say the same: Go values (but for where each came
// from) and text (but for the marks).
func same(t *testing.T, a, b any, ra, rb []byte) {
	t.Helper()
	ja, err := json.Marshal(a)
	if err != nil {
		t.Fatal(err)
	}
	jb, err := json.Marshal(b)
	if err != nil {
		t.Fatal(err)
	}
	if string(ja) != string(jb) {
		t.Errorf("values differ:\n%s\n%s", ja, jb)
	}
	if x, y := mark.ReplaceAllString(string(ra), ""), mark.ReplaceAllString(string(rb), ""); x != y {
		t.Errorf("texts differ:\n%s\n%s", x, y)
	}
}

func TestResolvedLoadsToTheSame(t *testing.T) {
	for _, text := range []string{small, string(Starter())} {
		s := mustLoad(t, text)
		again, err := load(t, string(s.Resolved()))
		if err != nil {
			t.Fatalf("%v\n%s", err, s.Resolved())
		}
		same(t, s, again, s.Resolved(), again.Resolved())
		if d := again.Defaults(); len(d) != 0 {
			t.Errorf("the resolved form leaves defaults: %v", d)
		}
	}
}

func TestResolvedMarksDefaults(t *testing.T) {
	r := "\n" + string(mustLoad(t, small).Resolved())
	for _, want := range []string{
		"\nframe = \"heliocentric\"  # default\n", "\nscale = \"asplund2021\"\n", "\nvelocity = [-50.0, 45.0]  # defaults\n",
		"\nb = 2.0  # b_atom\n", "\nb = 1.0  # b_molecule\n", "\nwindow = [-50.0, 45.0]  # velocity\n", "\nwindow = [-40.0, 40.0]\n",
		"\nmedium = \"air\"  # defaults\n", "\nsigma = 3.0  # limit_sigma\n", "\nauto_window = false\n",
	} {
		if !strings.Contains(r, want) {
			t.Errorf("no line %q in\n%s", strings.TrimSpace(want), r)
		}
	}
	var got string
	for _, d := range mustLoad(t, small).Defaults() {
		if d.Table == "sightline.line" && d.Key == "b" {
			got += fmt.Sprintf("%s by %s ×%d, ", d.Value, d.By, d.Count)
		}
	}
	if want := "2.0 by b_atom ×2, 1.0 by b_molecule ×1, "; got != want {
		t.Errorf("got %s, want %s", got, want)
	}
}

func TestCheckFilesListsAllMissing(t *testing.T) {
	dir := t.TempDir()
	for _, f := range []string{"a.fits", "cont.txt"} {
		if err := os.WriteFile(filepath.Join(dir, f), []byte("x"), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	path := filepath.Join(dir, "s.toml")
	text := `survey.name = "s"
defaults.velocity = [-50, 45]
defaults.lines = ["Na D2"]
[[sightline]]
name = "Lantern 1"
spectrum = [{file = "a.fits", continuum_file = "cont.txt", continuum_err = 0.01}, {file = "none.fits"}]
[[sightline]]
name = "Lantern 2"
spectrum = [{file = "a.fits", continuum_file = "none.txt", continuum_err = 0.01}, {file = "."}]
`
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	s, err := Load(path)
	if err != nil {
		t.Fatal(err)
	}
	err = s.CheckFiles()
	if !oops.IsInput(err) {
		t.Fatalf("got %v", err)
	}
	for _, want := range []string{
		`sightline 1 (Lantern 1): spectrum 2: file: "none.fits": no such file; `,
		`sightline 2 (Lantern 2): spectrum 1: continuum_file: "none.txt": no such file; `,
		`sightline 2 (Lantern 2): spectrum 2: file: ".": is a folder; `,
	} {
		if !strings.Contains(err.Error(), want) {
			t.Errorf("no %q in\n%v", want, err)
		}
	}
	if n := strings.Count(err.Error(), "\n"); n != 2 {
		t.Errorf("%d lines, want 3:\n%v", n+1, err)
	}
}

func FuzzLoad(f *testing.F) {
	f.Add(small)
	f.Add(string(Starter()))
	for _, tc := range mistakes {
		f.Add(tc.text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		if strings.Contains(text, "catalogue") || strings.Contains(text, "line_table") {
			return // files of this machine
		}
		s, err := load(t, text)
		if err != nil {
			if !oops.IsInput(err) {
				t.Fatalf("not the user's mistake: %v", err)
			}
			return
		}
		again, err := load(t, string(s.Resolved()))
		if err != nil {
			t.Fatalf("%v\n%s", err, s.Resolved())
		}
		same(t, s, again, s.Resolved(), again.Resolved())
	})
}

func BenchmarkLoad(b *testing.B) {
	text := small
	for i := range 100 {
		text += fmt.Sprintf("[[sightline]]\nname = \"Star %d\"\n[[sightline.spectrum]]\nfile = \"s%d.fits\"\n", i, i)
	}
	for b.Loop() {
		mustLoad(b, text)
	}
}
