package config

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"lacuna/internal/oops"
)

const ok = `
[survey]
name = "s"
[defaults]
velocity = [-50, 45]
lines = ["Na I 5889.95"]
[[sightline]]
name = "Lantern 1"
[[sightline.spectrum]]
file = "a.fits"
`

var (
	scaled = strings.Replace(ok, "[survey]", "[survey]\nscale = \"asplund2021\"", 1)
	column = "[[sightline.column]]\nspecies = \"Zn II\"\nlogN = 13\nlogN_err = 0.1\nsource = \"a\"\n"
)

// mistakes are texts with what the error must say: place, what, fix.
var mistakes = []struct {
	name, text string
	want       []string
}{
	{"empty", "", []string{"lantern.toml: nothing in it; 'lacuna new'"}},
	{"comments only", "# nothing\n", []string{"nothing in it"}},
	{"not TOML", "[survey]\nname = \n", []string{"line 2", "not TOML", "mend this line"}},
	{"binary", "\x1f\x8b\x08", []string{"not UTF-8"}},
	{"FITS", "SIMPLE  =                    T / file", []string{"line 1", "not TOML"}},
	{"twice", "[survey]\nname=\"a\"\nname=\"b\"\n", []string{"line 3", "not TOML"}},
	{"unknown at top", ok + "[surveys]\n", []string{`"surveys": unknown table or key at the top; did you mean survey?`}},
	{"no survey", "[[sightline]]\nname = \"a\"\n" + column, []string{"survey: missing; add [survey]"}},
	{"no sightline", "[survey]\nname = \"a\"\n", []string{"sightline: none; add [[sightline]]"}},
	{"unknown key", ok + "[[sightline.line]]\nname = \"Na D1\"\nwindwo = [-1, 1]\n", []string{"sightline 1 (Lantern 1): line 1: windwo: unknown key; did you mean window"}},
	{"key of elsewhere", scaled + "[sightline.hydrogen]\nresolving_power = 3\nlogN_HI=21\nlogN_HI_err=0.1\nsource=\"a\"\n", []string{"resolving_power", "belongs to [sightline.spectrum]"}},
	{"text for number", ok + "resolving_power = \"high\"\n", []string{"sightline 1 (Lantern 1): spectrum 1: resolving_power", `"high" is a text, wanted a number`}},
	{"number for text", ok + "medium = 1\n", []string{"medium", "1 is an integer, wanted a text; put it in quotes"}},
	{"date", ok + "note = 2001-01-01\n", []string{"note", "a date or time"}},
	{"real for integer", ok + "row = 1.5\n", []string{"row: 1.5 is a number, wanted an integer"}},
	{"text for switch", ok + "normalised = \"yes\"\n", []string{"normalised", "wanted one of true or false"}},
	{"NaN", ok + "resolving_power = nan\n", []string{"NaN is not a number to work with; give a finite number"}},
	{"infinite", ok + "correction = -inf\n", []string{"-Inf is not a number to work with"}},
	{"impossible", ok + "resolving_power = -5\n", []string{"resolving_power: -5 is impossible; must lie in [100, 1e7]"}},
	{"negative b", ok + "[[sightline.line]]\nname = \"Na D1\"\nb = -3\n", []string{"line 1: b: -3 km/s is impossible; must lie in (0, 1000] km/s"}},
	{"unknown word", ok + "medium = \"vacum\"\n", []string{`medium: "vacum" is not known; did you mean "vacuum"? one of air, vacuum`}},
	{"pair turned", ok + "[[sightline.line]]\nname = \"Na D1\"\nwindow = [40, -40]\n", []string{"window: 40 is not below -40; write the smaller one first"}},
	{"pair of three", ok + "[[sightline.line]]\nname = \"Na D1\"\nwindow = [1, 2, 3]\n", []string{"window: [1 2 3] is a list, wanted a pair of numbers; write window = [low, high]"}},
	{"pair for pairs", ok + "mask = [1, 2]\n", []string{"mask 1: 1 is an integer, wanted a pair of numbers"}},
	{"one bracket", "[survey]\nname=\"s\"\n[sightline]\nname=\"a\"\n", []string{"sightline: ", "is not a list of tables; write [[sightline]] with two brackets"}},
	{"two brackets", ok + "[[sightline.hydrogen]]\nsource=\"a\"\n", []string{"hydrogen: it is not one table; write [hydrogen] with one bracket"}},
	{"inline table", ok + "columns = {wave = \"W\", flx = \"F\"}\n", []string{"columns: flx: unknown key; did you mean flux?"}},
	{"half an inline table", ok + "zero_level = {level = 0.01}\n", []string{"zero_level: err: missing; add err = a number"}},
	{"control character", ok + "note = \"a\\u0007b\"\n", []string{"note", "holds the control character U+0007"}},
	{"turned text", ok + "note = \"a\\u202eb\"\n", []string{"control character U+202E"}},
	{"empty name", "[survey]\nname=\"s\"\n[[sightline]]\nname=\"\"\n" + column, []string{`sightline 1: name: "" is empty`}},
	{"no name", "[survey]\nname=\"s\"\n[[sightline]]\n" + column, []string{`sightline 1: name: missing; add name = "…"`}},
	{"name twice", ok + "[[sightline]]\nname=\"lantern 1\"\n[[sightline.spectrum]]\nfile=\"a\"\n", []string{"sightline 2 (lantern 1): the same name as sightline 1 (Lantern 1)"}},
	{"no file", ok + "[[sightline]]\nname=\"b\"\n[[sightline.spectrum]]\nmedium=\"air\"\n", []string{"sightline 2 (b): spectrum 1: file: missing"}},
	{"nothing to do", ok + "[[sightline]]\nname=\"b\"\n", []string{"sightline 2 (b): has neither a spectrum nor a column"}},
	{"no lines", "[survey]\nname=\"s\"\n[[sightline]]\nname=\"b\"\n[[sightline.spectrum]]\nfile=\"a\"\n", []string{"sightline 1 (b): lines: has spectra but no line to measure"}},
	{"no window", "[survey]\nname=\"s\"\n[defaults]\nlines=[\"Na D2\"]\n[[sightline]]\nname=\"b\"\n[[sightline.spectrum]]\nfile=\"a\"\n", []string{"window: Na I 5889.95 has no velocity range"}},
	{"unknown line", ok + "[[sightline.line]]\nname = \"Na I 5899\"\n", []string{"sightline 1 (Lantern 1): line 1: name: ", "no line at 5899", "5889.95"}},
	{"unknown line in defaults", strings.Replace(ok, "Na I 5889.95", "Ca II Q", 1), []string{"defaults: lines 1: ", "Ca II 3933.66"}},
	{"line twice", strings.Replace(ok, `["Na I 5889.95"]`, `["Na D2", "Na I 5889.95"]`, 1), []string{"defaults: lines 2: Na I 5889.95 is there twice"}},
	{"line twice by alias", ok + "[[sightline.line]]\nname = \"Na D2\"\n[[sightline.line]]\nname = \"Na I 5889.95\"\n", []string{"line 2: Na I 5889.95 is there twice; keep one of them, or give each its order or file"}},
	{"line in a strange file", ok + "[[sightline.line]]\nname = \"Na D2\"\nfile=\"b.fits\"\n", []string{`file: "b.fits" is no spectrum of this sightline; one of a.fits`}},
	{"continuum in the window", ok + "[[sightline.line]]\nname = \"Na D2\"\ncontinuum=[[-200, -40],[50, 100]]\n", []string{"continuum 1: [-200, -40] reaches into the window [-50, 45]"}},
	{"continuum windows overlap", ok + "[[sightline.line]]\nname = \"Na D2\"\ncontinuum=[[-200, -60],[50, 100],[90,120]]\n", []string{"continuum 3: [90, 120] overlaps [50, 100]"}},
	{"one-sided continuum", ok + "[[sightline.line]]\nname = \"Na D2\"\ncontinuum=[[-200, -60]]\n", []string{"one side of the window only", "degree = 0"}},
	{"degree", ok + "[[sightline.line]]\nname = \"Na D2\"\ndegree=6\n", []string{"degree: 6 is impossible; must lie in [-1, 5]"}},
	{"normalised without error", ok + "normalised = true\n", []string{"continuum_err: missing"}},
	{"continuum without error", ok + "continuum_column = \"C\"\n", []string{"continuum_err: missing"}},
	{"two continua", ok + "continuum_column = \"C\"\ncontinuum_file = \"c\"\ncontinuum_err=0.1\n", []string{"continuum_column and continuum_file are both given"}},
	{"spectrum twice", ok + "[[sightline.spectrum]]\nfile = \"a.fits\"\n", []string{`spectrum 2: "a.fits" is there twice`}},
	{"file for all", strings.Replace(ok, "[defaults]", "[defaults.spectrum]\nfile=\"a\"\n[defaults]", 1), []string{"defaults: spectrum: file: cannot be the same for all spectra"}},
	{"name for all", strings.Replace(ok, "[defaults]", "[defaults]\nname=\"a\"", 1), []string{"defaults: name: cannot be the same for all sightlines"}},
	{"mistake in defaults", strings.Replace(ok, "[defaults]", "[defaults]\ndetection=0", 1), []string{"defaults: detection: 0 σ is impossible"}},
	{"no scale", ok + "[sightline.hydrogen]\nlogN_HI=21\nlogN_HI_err=0.1\nsource=\"a\"\n", []string{"survey: scale: missing", "asplund2021"}},
	{"unknown scale", strings.Replace(ok, "name = \"s\"", "name = \"s\"\nscale=\"asplund2022\"", 1), []string{"survey: scale: ", "asplund2022", "asplund2021"}},
	{"unknown f set", strings.Replace(ok, "name = \"s\"", "name = \"s\"\nf_set=\"morton\"", 1), []string{"survey: f_set: ", "morton"}},
	{"no line table", strings.Replace(ok, "name = \"s\"", "name = \"s\"\nline_table=\"none.csv\"", 1), []string{`survey: line_table: "none.csv": no such file`}},
	{"no catalogue", strings.Replace(ok, "name = \"s\"", "name = \"s\"\ncatalogue=\"none.csv\"", 1), []string{"none.csv", "no such file"}},
	{"override of nothing", ok + "[[sightline]]\nname=\"b\"\noverride=true\n", []string{"sightline 2 (b): override: no row of the catalogue has this name"}},
	{"hydrogen without source", scaled + "[sightline.hydrogen]\nlogN_HI=21\nlogN_HI_err=0.1\n", []string{"hydrogen: source: missing"}},
	{"hydrogen without error", scaled + "[sightline.hydrogen]\nlogN_HI=21\nsource=\"a\"\n", []string{"hydrogen: logN_HI_err: missing"}},
	{"hydrogen error alone", scaled + "[sightline.hydrogen]\nlogN_HI=21\nlogN_HI_err=0.1\nlogN_H2_err=0.1\nsource=\"a\"\n", []string{"hydrogen: logN_H2: missing, but logN_H2_err is given"}},
	{"value and limit", scaled + "[sightline.hydrogen]\nlogN_HI=21\nlogN_HI_err=0.1\nlogN_HI_max=21\nsource=\"a\"\n", []string{"logN_HI and logN_HI_max are both given"}},
	{"total and parts", scaled + "[sightline.hydrogen]\nlogN_HI=21\nlogN_HI_err=0.1\nlogN_H=21\nlogN_H_err=0.1\nsource=\"a\"\n", []string{"they could disagree"}},
	{"H2 alone", scaled + "[sightline.hydrogen]\nlogN_H2=20\nlogN_H2_err=0.1\nsource=\"a\"\n", []string{"logN_HI: missing"}},
	{"no hydrogen in hydrogen", scaled + "[sightline.hydrogen]\nsource=\"a\"\n", []string{"hydrogen: no column given"}},
	{"linear N(H)", scaled + "[sightline.hydrogen]\nlogN_HI=1.2e21\nlogN_HI_err=0.1\nsource=\"a\"\n", []string{"logN_HI: 1.2e+21 log cm⁻² is impossible; must lie in [10, 25]"}},
	{"column without error", ok + "[[sightline.column]]\nspecies=\"Zn II\"\nlogN=13\nsource=\"a\"\n", []string{"column 1: logN_err: missing"}},
	{"limit with error", ok + "[[sightline.column]]\nspecies=\"Zn II\"\nlogN=13\nlogN_err=0.1\nkind=\"upper\"\nsource=\"a\"\n", []string{"column 1: logN_err: a limit has no error"}},
	{"level of a value", ok + "[[sightline.column]]\nspecies=\"Zn II\"\nlogN=13\nlogN_err=0.1\nsigma=3\nsource=\"a\"\n", []string{"column 1: sigma: only an upper limit has a level"}},
	{"strange species", ok + "[[sightline.column]]\nspecies=\"Zz II\"\nlogN=13\nlogN_err=0.1\nsource=\"a\"\n", []string{`species: "Zz II" is not a species; did you mean Zn II`}},
	{"column twice", ok + strings.Repeat("[[sightline.column]]\nspecies=\"Zn II\"\nlogN=13\nlogN_err=0.1\nsource=\"a\"\n", 2), []string{"column 2: Zn II by \"a\" is there twice"}},
	{"adopt without reason", ok + "[[sightline.adopt]]\nspecies=\"Na I\"\nmethod=\"growth curve\"\n", []string{"adopt 1: reason: missing"}},
	{"adopt both", ok + "[[sightline.adopt]]\nspecies=\"Na I\"\nmethod=\"fit\"\nlogN=12\nlogN_err=0.1\nreason=\"r\"\n", []string{"adopt 1: needs either a method or logN"}},
	{"adopt a value without error", ok + "[[sightline.adopt]]\nspecies=\"Na I\"\nlogN=12\nreason=\"r\"\n", []string{"adopt 1: logN_err: does not fit kind \"value\""}},
	{"adopt twice", ok + strings.Repeat("[[sightline.adopt]]\nspecies=\"Na I\"\nmethod=\"fit\"\nreason=\"r\"\n", 2), []string{"adopt 2: Na I is adopted twice"}},
	{"orders twice", ok + "orders = [3, 3]\n", []string{"orders: 3 is there twice"}},
	{"half a position", strings.Replace(ok, "name = \"Lantern 1\"", "name = \"Lantern 1\"\nra = 10", 1), []string{"one of ra and dec is missing"}},
	{"seed", strings.Replace(ok, "name = \"s\"", "name = \"s\"\nseed=-1", 1), []string{"survey: seed: -1 is impossible"}},
}

func TestMistakes(t *testing.T) {
	if _, err := load(t, ok); err != nil {
		t.Fatal(err)
	}
	for _, tc := range mistakes {
		t.Run(tc.name, func(t *testing.T) {
			_, err := load(t, tc.text)
			checkMistake(t, err, tc.want)
			if err != nil && strings.Contains(err.Error(), "\n") {
				t.Errorf("more than the one mistake:\n%v", err)
			}
		})
	}
}

func checkMistake(t *testing.T, err error, want []string) {
	t.Helper()
	if !oops.IsInput(err) {
		t.Fatalf("got %v, want the user's mistake", err)
	}
	for _, w := range want {
		if !strings.Contains(err.Error(), w) {
			t.Errorf("no %q in\n%v", w, err)
		}
	}
}

func TestAllMistakesAtOnce(t *testing.T) {
	_, err := load(t, ok+"resolving_power = -1\nmedum = \"air\"\n[[sightline.line]]\nname = \"Na D7\"\n")
	checkMistake(t, err, []string{"resolving_power: -1 is impossible", "medum: unknown key", "name: "})
	if n := strings.Count(err.Error(), "\n"); n != 2 {
		t.Errorf("%d lines:\n%v", n+1, err)
	}
	text := ok
	for i := range 50 {
		text += fmt.Sprintf("x%d = 1\n", i)
	}
	_, err = load(t, text)
	checkMistake(t, err, []string{"and 30 more mistakes"})
}

func TestLoadFiles(t *testing.T) {
	dir := t.TempDir()
	_, err := Load(filepath.Join(dir, "none.toml"))
	checkMistake(t, err, []string{"none.toml: no such file", "lacuna new"})
	_, err = Load(dir)
	checkMistake(t, err, []string{"is a folder"})
	_, err = LoadGrowth(filepath.Join(dir, "none.toml"))
	checkMistake(t, err, []string{"no such file"})
	p := filepath.Join(dir, "s.toml")
	if err := os.WriteFile(p, []byte(ok), 0o644); err != nil {
		t.Fatal(err)
	}
	s, err := Load(p)
	if err != nil || s.Dir != dir || s.Path("a.fits") != filepath.Join(dir, "a.fits") || s.Path("/a.fits") != "/a.fits" {
		t.Errorf("%+v, %v", s, err)
	}
}
