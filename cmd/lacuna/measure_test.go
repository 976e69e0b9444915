package main

import (
	"encoding/json"
	"fmt"
	"image/png"
	"math"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/survey"
)

func measured(t testing.TB, args ...string) survey.Record {
	t.Helper()
	r := lacuna(t, append([]string{"measure", "--json"}, args...)...)
	if r.code != 0 || r.err != "" {
		t.Fatalf("%v: exit code %d\n%s", args, r.code, r.err)
	}
	var rec survey.Record
	if err := json.Unmarshal([]byte(r.out), &rec); err != nil {
		t.Fatal(err)
	}
	return rec
}

// Options may stand anywhere, also with values that begin with a minus sign.
func TestMeasureOptionsAnywhere(t *testing.T) {
	red := filepath.Join(demo(t), "lantern1_red.fits")
	want := works(t, "measure", red, "--line", "Na I 5889.95", "--window", "-40,20")
	for _, args := range [][]string{
		{"--line", "Na I 5889.95", "--window", "-40,20", red},
		{"--line", "Na I 5889.95", red, "--window", "-40,20"},
		{"--window=-40,20", red, "--line=Na I 5889.95"},
		{"-window", "-40,20", "-line", "NaI D2", "--", red},
	} {
		if got := works(t, append([]string{"measure"}, args...)...); got != want {
			t.Errorf("measure %v prints something else:\n%s", args, got)
		}
	}
	for _, w := range []string{"W  ", "mÅ", "pixel noise", "zero level", "apparent optical depth", "5891.5833 Å in vacuum (air 5889.95", "heliocentric", "telluric"} {
		if !strings.Contains(want, w) {
			t.Errorf("no %q in\n%s", w, want)
		}
	}
}

// What is printed is what the JSON holds: W and its error, with causes that add
// up to it.
func TestMeasureJSON(t *testing.T) {
	red := filepath.Join(demo(t), "lantern1_red.fits")
	args := []string{red, "--line", "K I 7698.96", "--window", "-40,20"}
	rec := measured(t, args...)
	if rec.Name != "Lantern 1" || len(rec.Result.Widths) != 1 {
		t.Fatalf("%s with %d widths", rec.Name, len(rec.Result.Widths))
	}
	w := rec.Result.Widths[0]
	m := regexp.MustCompile(`W +([0-9.]+) ± ([0-9.]+) mÅ`).FindStringSubmatch(works(t, append([]string{"measure"}, args...)...))
	if m == nil {
		t.Fatal("no W ± σ in the text")
	}
	for i, want := range []float64{w.W.X * 1e3, w.W.Err() * 1e3} {
		got, err := strconv.ParseFloat(m[i+1], 64)
		if err != nil || math.Abs(got-want) > 0.05001 { // printed to one decimal
			t.Errorf("the text says %s, the JSON %.4f", m[i+1], want)
		}
	}
	if w.Window != [2]float64{-40, 20} || !w.Detected || w.Order != 97 {
		t.Errorf("window %v, detected %v, order %d", w.Window, w.Detected, w.Order)
	}
}

func TestMeasureOptions(t *testing.T) {
	red, blue := filepath.Join(demo(t), "lantern1_red.fits"), filepath.Join(demo(t), "lantern1_blue.fits")
	base := []string{red, "--line", "K I 7698.96", "--window", "-40,20"}
	with := func(more ...string) survey.Record { return measured(t, append(more, base...)...) }

	w := with("--continuum", "-150,-60", "--continuum", "40,130", "--degree", "1").Result.Widths[0]
	if w.Degree != 1 || len(w.Windows) != 2 || math.Abs(w.Windows[0][0]+150) > 2 || math.Abs(w.Windows[1][1]-130) > 2 {
		t.Errorf("--continuum and --degree: degree %d on %v", w.Degree, w.Windows)
	}
	if w = with("--zero-level", "0.02,0.001").Result.Widths[0]; w.Zero.Level != 0.02 || w.Zero.By != "user" {
		t.Errorf("--zero-level: %+v", w.Zero)
	}
	// Added light z, as part of the star's continuum, makes lines too weak:
	// W_obs = W/(1+z) exactly (1 − F/C with z added above and below).
	if ratio := w.W.X / with("--zero-level", "0,0.001").Result.Widths[0].W.X; !(math.Abs(ratio-1.02) < 1e-9) {
		t.Errorf("a zero level of 2 %% changes W by a factor %.8f, want 1.02", ratio)
	}
	if w = with("--auto-window").Result.Widths[0]; !w.AutoWindow || !(w.Window[0] > -40 && w.Window[1] < 20) {
		t.Errorf("--auto-window found %v, %v", w.Window, w.AutoWindow)
	}
	if w = with("--order", "97").Result.Widths[0]; w.Order != 97 {
		t.Errorf("--order 97 measured in %d", w.Order)
	}
	if r := with("--resolving-power", "40000").Result.Spectra[0]; r.R != 40000 || r.RBy != "user" {
		t.Errorf("--resolving-power: %g by %s", r.R, r.RBy)
	}
	if r := with("--correction", "10").Result.Spectra[0]; len(r.Shifts) != 1 || r.Shifts[0].V != 10 {
		t.Errorf("--correction 10: %+v", r.Shifts)
	}
	// A correction that is 3.21 km/s less moves the line by as much (v = cz; the
	// product of two (1 + z) differs from the sum by v²/c, 1 m/s here).
	v0 := with().Result.Widths[0].V.X
	if v := measured(t, red, "--line", "K I 7698.96", "--window", "-43.21,16.79", "--correction", "10").Result.Widths[0].V.X; !(math.Abs(v0-3.21-v) < 0.05) {
		t.Errorf("velocity %.3f with the header's 13.21 km/s, %.3f with 10", v0, v)
	}
	limit := func(more ...string) float64 {
		return measured(t, append([]string{blue, "--line", "CN R(1)", "--window", "-25,5"}, more...)...).Result.Widths[0].LimitB
	}
	if b := limit("--b", "0.7"); b != 0.7 {
		t.Errorf("--b 0.7 assumes %g", b)
	}
	if rec := measured(t, blue, "--line", "CN R(0)", "--line", "CH 4300.31", "--window", "-25,5"); len(rec.Result.Widths) != 2 {
		t.Errorf("two lines give %d widths", len(rec.Result.Widths))
	}
}

func TestMeasureFigure(t *testing.T) {
	dir := t.TempDir()
	base := []string{"measure", filepath.Join(demo(t), "lantern1_red.fits"), "--line", "K I 7698.96", "--window", "-40,20", "--figure"}
	svg := filepath.Join(dir, "k.svg")
	works(t, append(base, svg)...)
	drawing(t, svg, []byte(read(t, svg)))
	works(t, append(base, filepath.Join(dir, "k.png"))...)
	f, err := os.Open(filepath.Join(dir, "k.png"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	if _, err := png.Decode(f); err != nil {
		t.Error(err)
	}
	mistake(t, 2, []string{"k.pdf", ".svg or .png"}, append(base, filepath.Join(dir, "k.pdf"))...)
	// A folder that cannot be written to is the file system's failure, not a
	// mistake: exit code 1.
	mistake(t, 1, []string{filepath.Join(svg, "x.svg")}, append(base, filepath.Join(svg, "x.svg"))...)
	if got := names(t, dir); len(got) != 2 {
		t.Errorf("left behind: %v", got)
	}
}

// Wrong use of measure, with what each message must name.
func TestMeasureMistakes(t *testing.T) {
	red := filepath.Join(demo(t), "lantern1_red.fits")
	for _, tc := range []struct {
		args  []string
		words []string
	}{
		{nil, []string{"no line given", "lacuna lines"}},
		{[]string{"--line", "Na I 5889.95"}, []string{"no window given", "--window -40,40"}},
		{[]string{"--line", "Na I 5888.95", "--window", "-4,4"}, []string{"Na I has no line at 5888.95", "Na I 5889.95 (D2)"}},
		{[]string{"--line", "Na I", "--window", "-4,4"}, []string{`"Na I" does not say which line`, "Na I 3302.37"}},
		{[]string{"--line", "D2", "--window", "-4,4"}, []string{`no line "D2"`, "did you mean", "Na I 5889.95 (D2)", "Begin with the species"}},
		{[]string{"--line", "5889.95", "--window", "-4,4"}, []string{`no line "5889.95"`, "did you mean Na I 5889.95 (D2)?"}},
		{[]string{"--line", "", "--window", "-4,4"}, []string{"no name of a line"}},
		{[]string{"--line", "Na I D2", "--window", "4,-4"}, []string{`"4,-4"`, "lower first"}},
		{[]string{"--line", "Na I D2", "--window", "4"}, []string{`"4"`, "comma"}},
		{[]string{"--line", "Na I D2", "--window", "-4,4,5"}, []string{`"-4,4,5"`}},
		{[]string{"--line", "Na I D2", "--window", "nan,4"}, []string{`"nan,4"`}},
		{[]string{"--line", "Na I D2", "--window", "-1e9,1e9"}, []string{"beyond ±30000 km/s"}},
		{[]string{"--line", "Na I D2", "--window"}, []string{"--window needs a value"}},
		{[]string{"--line", "--window", "-4,4"}, []string{"--line needs a value"}},
		{[]string{"--line", "Na I D2", "--window", "5000,6000"}, []string{red, "no spectrum holds its window", "5989.84 to 6009.50 Å", "order 98"}},
		{[]string{"--line", "Na I 3302.37", "--window", "-4,4"}, []string{"no spectrum holds its window", "3303"}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--order", "5"}, []string{"there is no order 5", "order 98", "order 97"}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--order", "97"}, []string{"order 97 does not hold its window"}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--order", "1.5"}, []string{`--order "1.5" is not a whole number`}},
		{[]string{"--line", "Na I D2", "--window", "-40,20", "--continuum", "-30,-10"}, []string{"--continuum -30,-10", "reaches into the window -40,20"}},
		{[]string{"--line", "Na I D2", "--window", "-40,20", "--continuum", "-90,-50", "--degree", "2"}, []string{"order 98", "0 above", "both sides, or degree 0"}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--degree", "9"}, []string{"--degree 9", "to 5"}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--to", "mars"}, []string{"--to", `"mars" is not a velocity frame`}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--frame", "mars"}, []string{"--frame", `"mars" is not a velocity frame`}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--medium", "water"}, []string{"--medium", `"water" is not a medium`}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--correction", "x"}, []string{`--correction "x" is not a number`}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--b", "0"}, []string{"--b 0 is not above 0"}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--zero-level", "0.1"}, []string{"--zero-level", "0.003,0.001"}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--zero-level", "3,0.1"}, []string{"--zero-level"}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--normalised"}, []string{"--continuum-err"}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--resolving-power", "-3"}, []string{"--resolving-power -3 is not above 0"}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--f-set", "nosuch"}, []string{`no set of f-values "nosuch"`}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--hdu", "7"}, []string{red, "no HDU 7", "HDU 1"}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--columns", "a"}, []string{`--columns "a"`, "WAVE,FLUX"}},
		{[]string{"--line", "Na I D2", "--window", "-4,4", "--columns", "a,b"}, []string{red, "a; its columns", "FLUX"}},
	} {
		mistake(t, 2, tc.words, append([]string{"measure", red}, tc.args...)...)
	}
	mistake(t, 2, []string{"one spectrum file wanted, 2 given"}, "measure", red, red, "--line", "Na I D2", "--window", "-4,4")
}

// In spectra that a person might have, each fault is named or noted; see
// formats/bad of the reference material for what is refused and what is accepted.
func TestMeasureFaultySpectra(t *testing.T) {
	dir := t.TempDir()
	whole := read(t, filepath.Join(demo(t), "lantern1_red.fits"))
	sheet := func(name, head string, row func(i int, wave float64) string) string {
		var b strings.Builder
		b.WriteString(head)
		for i := range 800 {
			b.WriteString(row(i, 5885+0.0163*float64(i)) + "\n")
		}
		return write(t, dir, name, b.String())
	}
	flux := func(i int, wave float64) float64 { // a line at 0 km/s, noise of 1 %
		d := (wave - 5889.951) / 0.05
		return 1 - 0.5*math.Exp(-d*d) + 0.01*math.Sin(float64(i*i))
	}
	good := func(i int, w float64) string { return fmt.Sprintf("%.4f %.5f 0.01", w, flux(i, w)) }
	args := func(path string, more ...string) []string {
		return append([]string{"measure", path, "--line", "Na I 5889.95", "--window", "-20,20"}, more...)
	}
	say := []string{"--unit", "Angstrom", "--medium", "air", "--frame", "heliocentric"}

	mistake(t, 2, []string{"cut.fits: HDU 1", "truncated", "fetch the file again"}, args(write(t, dir, "cut.fits", whole[:20000]))...)
	mistake(t, 2, []string{"words.fits"}, args(write(t, dir, "words.fits", "This is not a spectrum at all.\n"))...)
	mistake(t, 2, []string{"page.fits", "HTML"}, args(write(t, dir, "page.fits", "<!DOCTYPE html><html><title>404 Not Found</title></html>"))...)
	mistake(t, 2, []string{"empty.fits", "empty"}, args(write(t, dir, "empty.fits", ""))...)
	mistake(t, 2, []string{"nosuch.fits", "no such file"}, args(filepath.Join(dir, "nosuch.fits"))...)
	mistake(t, 2, []string{dir, "not a file"}, args(dir)...)

	text := sheet("good.txt", "# wave flux err\n", good)
	mistake(t, 2, []string{"good.txt", "without a unit", "--unit Angstrom"}, args(text)...)
	mistake(t, 2, []string{"good.txt", "--medium air or --medium vacuum"}, args(text, say[:2]...)...)
	mistake(t, 2, []string{"good.txt", "--frame topocentric, heliocentric or barycentric"}, args(text, say[:4]...)...)
	w := measured(t, args(text, say...)[1:]...).Result.Widths[0]
	// ∫ 0.5 exp(−(Δλ/0.05 Å)²) dλ = 0.5·0.05·√π = 44.3 mÅ.
	if want := 0.5 * 0.05 * math.SqrtPi; !w.Detected || !(math.Abs(w.W.X-want) < 3*w.W.Err()) || !(w.W.Err() < 0.003) {
		t.Errorf("W = %.4f ± %.4f Å, want %.4f", w.W.X, w.W.Err(), want)
	}
	mistake(t, 2, []string{"good.txt", "LSRK", "ra and dec in a survey file"}, args(text, append(say, "--to", "LSRK")...)...)

	none := measured(t, args(sheet("none.txt", "", func(i int, w float64) string {
		return fmt.Sprintf("%.4f %.5f 0", w, flux(i, w))
	}), say...)[1:]...)
	if n := none.Result.Widths[0].NoiseBy; !strings.Contains(n, "scatter") && !strings.Contains(n, "residuals") {
		t.Errorf("where all errors are 0, the noise comes from %q", n)
	}
	some := sheet("some.txt", "", func(i int, w float64) string {
		e := 0.01
		if i >= 100 && i < 112 {
			e = -0.01
		}
		return fmt.Sprintf("%.4f %.5f %g", w, flux(i, w), e)
	})
	measured(t, args(some, say...)[1:]...)
	if out := works(t, append([]string{"inspect", some}, say...)...); !strings.Contains(strings.Join(strings.Fields(out), " "), "12 pixels have an error that is 0, negative or no number") {
		t.Errorf("inspect does not tell of the negative errors:\n%s", out)
	}
	masked := sheet("masked.txt", "", func(i int, w float64) string {
		e := 0.01
		if math.Abs(w-5889.951) < 0.5 {
			e = -1
		}
		return fmt.Sprintf("%.4f %.5f %g", w, flux(i, w), e)
	})
	mistake(t, 2, []string{"masked.txt", "Na I 5889.95", "all pixels from -20.0 to 20.0 km/s are masked"}, args(masked, say...)...)
	mistake(t, 2, []string{"back.txt", "line 3", "monoton"}, args(write(t, dir, "back.txt", "5880 1 1\n5881 1 1\n5880.5 1 1\n5882 1 1\n"), say...)...)
	if left, _ := filepath.Glob(filepath.Join(dir, ".lacuna*")); len(left) > 0 {
		t.Errorf("left behind: %v", left)
	}
}

// Files with known faults: what must be refused is, with the words that a user
// needs, and what must be accepted is. Source: formats/bad of the reference
// material (expected.json).
func TestInspectKnownFaults(t *testing.T) {
	dir := check.Shared(t, "formats/bad")
	var want struct {
		Files []struct {
			File, Defect, Expect string
			Words                []string `json:"message_should_mention"`
			Masked               int      `json:"masked_pixels"`
			Pixels               int      `json:"pixels"`
		}
	}
	if err := json.Unmarshal([]byte(read(t, filepath.Join(dir, "expected.json"))), &want); err != nil || len(want.Files) < 20 {
		t.Fatalf("%d files, %v", len(want.Files), err)
	}
	for _, f := range want.Files {
		path := filepath.Join(dir, f.File)
		r := lacuna(t, "inspect", path)
		said := strings.ToLower(strings.Join(strings.Fields(r.out+r.err), " "))
		switch f.Expect {
		case "error":
			mistake(t, 2, []string{f.File}, "inspect", path)
		default:
			if r.code != 0 {
				t.Errorf("%s (%s): exit code %d, want it accepted\n%s", f.File, f.Defect, r.code, r.err)
			}
			readable(t, []string{"inspect"}, r.out)
			if f.Pixels > 0 && !strings.Contains(said, strconv.Itoa(f.Pixels)) {
				t.Errorf("%s: no %d pixels in\n%s", f.File, f.Pixels, r.out)
			}
			if j := lacuna(t, "inspect", "--json", path); j.code != 0 || !json.Valid([]byte(j.out)) {
				t.Errorf("%s: --json: exit code %d, %s", f.File, j.code, j.err)
			}
		}
		for _, w := range f.Words {
			if !strings.Contains(said, strings.ToLower(w)) {
				t.Errorf("%s (%s): no %q in\n%s%s", f.File, f.Defect, w, r.out, r.err)
			}
		}
	}
}
