package main

import (
	"path/filepath"
	"strings"
	"testing"
)

const goodSurvey = `[survey]
name = "S"
scale = "asplund2021"

[[sightline]]
name = "Lantern 1"
velocity = [-40, 20]
lines = ["K I 7698.96"]
[[sightline.spectrum]]
file = "lantern1_red.fits"
`

// Mistakes in a survey file: one line with place and fix, exit code 2, and no
// results folder.
func TestSurveyMistakes(t *testing.T) {
	dir := spectra(t)
	write(t, dir, "nomedium.txt", "5880 1 0.01\n5881 1 0.01\n5882 1 0.01\n")
	file, out := filepath.Join(dir, "survey.toml"), filepath.Join(dir, "out")
	edit := func(old, new string) string {
		if !strings.Contains(goodSurvey, old) {
			t.Fatalf("no %q in the survey", old)
		}
		return strings.Replace(goodSurvey, old, new, 1)
	}
	for _, tc := range []struct {
		toml  string
		words []string
	}{
		{"", []string{"survey.toml: nothing in it", "lacuna new"}},
		{"# only a comment\n", []string{"survey.toml: nothing in it"}},
		{"[survey]\nname = \"S\"\n", []string{"sightline", "add [[sightline]]"}},
		{"[growth]\nname = \"S\"\n", []string{"survey.toml: a batch", "lacuna growth takes it"}},
		{edit("velocity =", "velocty ="), []string{"sightline 1 (Lantern 1): velocty: unknown key", "did you mean velocity?"}},
		{edit("velocity = [-40, 20]", `velocity = "wide"`), []string{"sightline 1 (Lantern 1): velocity", `"wide" is a text, wanted a pair of numbers`}},
		{edit("[-40, 20]", "[nan, 20]"), []string{"velocity: NaN is not a number"}},
		{edit("[-40, 20]", "[20, -40]"), []string{"velocity: 20 is not below -40"}},
		{edit("velocity = [-40, 20]\n", ""), []string{"K I 7698.96 has no velocity range", "window = [low, high]"}},
		{edit("[-40, 20]", "[-4e9, 20]"), []string{"velocity", "-4e+09", "30000"}},
		{edit("K I 7698.96", "K I 7698.00"), []string{"lines 1", "K I 7698.96"}},
		{edit("K I 7698.96", "D1"), []string{"lines 1", "D1"}},
		{edit("asplund2021", "asplund2012"), []string{"survey: scale", "asplund2021"}},
		{edit("lantern1_red", "lantern9_red"), []string{"spectrum 1: file", `"lantern9_red.fits": no such file`}},
		{edit(`name = "S"`, `name = 5`), []string{"survey: name: 5 is an integer, wanted a text"}},
		{edit("[survey]", "[survye]"), []string{"survye", "survey"}},
		{edit("[[sightline]]", "[sightline]"), []string{"sightline", "two brackets"}},
		{goodSurvey + "orders = 97\n", []string{"spectrum 1: orders", "wanted a list"}},
		{goodSurvey + "medium = \"vacum\"\n", []string{"medium", `did you mean "vacuum"?`}},
		{goodSurvey + "normalised = true\n", []string{"continuum_err", "missing"}},
		{goodSurvey + "key without value\n", []string{"line 11", "not TOML"}},
		{goodSurvey + "[sightline.hydrogen]\nlogN_HI = 21\nsource = \"x\"\n", []string{"hydrogen: logN_HI_err", "missing"}},
		{goodSurvey + "[sightline.hydrogen]\nlogN_HI = 1e21\nlogN_HI_err = 0.1\nsource = \"x\"\n", []string{"logN_HI", "1e+21", "[10, 25]"}},
		{goodSurvey + "[[sightline.adopt]]\nspecies = \"K I\"\nmethod = \"growth curve\"\n", []string{"adopt 1: reason: missing"}},
	} {
		write(t, dir, "survey.toml", tc.toml)
		mistake(t, 2, tc.words, "run", file, "--out", out)
		if got, _ := filepath.Glob(out + "/*"); got != nil {
			t.Errorf("%v: wrote %v", tc.words, got)
		}
	}
	write(t, dir, "survey.toml", goodSurvey)
	mistake(t, 2, []string{"survey.toml: --only", `no sightline "Lantern"`, `did you mean "Lantern 1"?`}, "run", file, "--only", "Lantern", "--out", out)
	mistake(t, 1, []string{"results folder", file}, "run", file, "--out", filepath.Join(file, "out"))
	mistake(t, 1, []string{"results folder", "/proc"}, "run", file, "--out", "/proc/nosuch/out")
	if got, _ := filepath.Glob(out + "*"); got != nil {
		t.Errorf("wrote %v", got)
	}

	// Mistakes that show only in the spectra: the journal keeps that they failed,
	// but no table without a row is written.
	for i, tc := range []struct {
		toml  string
		words []string
	}{
		{edit("[-40, 20]", "[9000, 9020]"), []string{"survey.toml: Lantern 1: K I 7698.96: no spectrum holds its window", "order 97"}},
		{goodSurvey + "orders = [3]\n", []string{"Lantern 1: spectrum 1", "no order is left to use"}},
		{goodSurvey + "[[sightline.line]]\nname = \"K I 7698.96\"\norder = 3\n", []string{"Lantern 1: K I 7698.96: there is no order 3"}},
		{goodSurvey + "mask = [[7690, 7710]]\n", []string{"Lantern 1: K I 7698.96: all pixels from -40.0 to 20.0 km/s are masked"}},
		{edit("lantern1_red.fits", "nomedium.txt"), []string{"Lantern 1: spectrum 1", "nomedium.txt", "medium"}},
		{edit("lantern1_red.fits", "survey.toml"), []string{"Lantern 1: spectrum 1", "survey.toml"}},
		{edit("lantern1_red.fits", "cut.fits"), []string{"Lantern 1: spectrum 1", "cut.fits", "truncated"}},
		{goodSurvey + "medium = \"air\"\nframe = \"heliocentric\"\n[[sightline.line]]\nname = \"K I 7698.96\"\ncontinuum = [[-4000, -3900], [3900, 4000]]\n", []string{"Lantern 1: K I 7698.96"}},
	} {
		write(t, dir, "cut.fits", read(t, filepath.Join(dir, "lantern1_red.fits"))[:20000])
		write(t, dir, "survey.toml", tc.toml)
		folder := filepath.Join(dir, "data", string(rune('a'+i)))
		mistake(t, 2, tc.words, "run", file, "--out", folder)
		for _, name := range names(t, folder) {
			wellFormed(t, filepath.Join(folder, name))
			if name != "journal.jsonl" && name != "journal.lock" && name != "manifest.json" {
				t.Errorf("%v: wrote %s", tc.words, name)
			}
		}
	}
	// Mended, the same folder gives results.
	write(t, dir, "survey.toml", goodSurvey)
	works(t, "run", file, "--out", filepath.Join(dir, "data", "a"))
}

// Two mistakes are two lines, each with its file.
func TestTwoMistakes(t *testing.T) {
	dir := spectra(t)
	file := write(t, dir, "survey.toml", strings.NewReplacer("name = \"S\"", "nmae = \"S\"", "asplund2021", "nosuch").Replace(goodSurvey))
	r := lacuna(t, "run", file)
	lines := strings.Split(strings.TrimSuffix(r.err, "\n"), "\n")
	if r.code != 2 || len(lines) < 2 {
		t.Fatalf("exit code %d\n%s", r.code, r.err)
	}
	for _, l := range lines {
		if !strings.HasPrefix(l, "lacuna: "+file+": ") {
			t.Errorf("%q does not begin with the program and the file", l)
		}
	}
}

// What a note is for stands on standard error; the text and the JSON keep to
// standard output.
func TestNotesGoToStandardError(t *testing.T) {
	dir := t.TempDir()
	file := write(t, dir, "b.toml", `[growth]
name = "b"
[[sightline]]
name = "Lantern 1"
[[sightline.width]]
line = "Ca II K"
W_mA = 120
err_mA = 3
[[sightline.width]]
line = "Ca II K"
W_mA = 121
err_mA = 4
[[sightline.width]]
line = "Ca II H"
W_mA = 74
err_mA = 3
`)
	r := lacuna(t, "growth", file, "--no-figures")
	if r.code != 0 || !strings.HasPrefix(r.err, "note: ") || strings.Count(r.err, "\n") != 1 || !strings.Contains(r.err, "Lantern 1: two widths of Ca II 3933.66 count as independent") {
		t.Errorf("exit code %d, standard error %q", r.code, r.err)
	}
	if strings.Contains(r.out, "note:") {
		t.Errorf("a note on standard output:\n%s", r.out)
	}
}

// The locale decides on signs beyond ASCII, and nothing else does.
func TestASCII(t *testing.T) {
	t.Setenv("LC_ALL", "C")
	red := filepath.Join(demo(t), "lantern1_red.fits")
	for _, args := range [][]string{{"measure", red, "--line", "K I 7698.96", "--window", "-40,20"}, {"inspect", red}, {"lines", "--species", "Na I"}} {
		for _, r := range lacuna(t, args...).out {
			if r > 126 || r == '?' { // "?" stands for a sign that has no spelling
				t.Fatalf("%s: the sign %q in a locale without UTF-8", args[0], r)
			}
		}
	}
}

// Neither the environment nor a wish for colour puts escape codes into a pipe.
func TestNoColourInPipes(t *testing.T) {
	t.Setenv("TERM", "xterm-256color")
	t.Setenv("FORCE_COLOR", "1")
	for _, no := range []string{"", "1"} {
		t.Setenv("NO_COLOR", no)
		works(t, "inspect", filepath.Join(demo(t), "lantern1_red.fits"))
		works(t, "lines", "--species", "Na I")
	}
}
