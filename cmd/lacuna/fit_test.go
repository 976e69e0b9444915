package main

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"lacuna/budget"
	"lacuna/simulate"
	"lacuna/survey"
)

func fitted(t testing.TB, args ...string) survey.Record {
	t.Helper()
	r := lacuna(t, append([]string{"fit", "--json"}, args...)...)
	if r.code != 0 || r.err != "" {
		t.Fatalf("%v: exit code %d\n%s", args, r.code, r.err)
	}
	var rec survey.Record
	if err := json.Unmarshal([]byte(r.out), &rec); err != nil {
		t.Fatal(err)
	}
	return rec
}

var naD = []string{"--line", "Na I 5889.95", "--line", "Na I 5895.92", "--window", "-40,20", "--keep-telluric"}

// Clouds of one spectrum, given or found, are those that the spectrum was made from.
func TestFitHoldsTheTruth(t *testing.T) {
	red := filepath.Join(demo(t), "lantern1_red.fits")
	truth := simulate.Lantern()[0].Star
	for _, how := range [][]string{{"--clouds", "-14,-6.5"}, {"--auto", "--most", "4"}} {
		rec := fitted(t, append(append([]string{red}, naD...), how...)...)
		if len(rec.Result.Fits) != 1 || len(rec.Result.Fits[0].Result.Clouds) != 2 {
			t.Fatalf("%v: %d fits", how, len(rec.Result.Fits))
		}
		near := func(what string, n budget.Number, x float64) {
			t.Helper()
			if n.Kind() != "value" || !(math.Abs(n.X-x) < 4*math.Max(n.ErrUp(), n.ErrLo())) { // one draw of the noise
				t.Errorf("%v: %s = %.3f ± %.3f (%s), truth %.3f", how, what, n.X, n.Err(), n.Kind(), x)
			}
		}
		for i, c := range rec.Result.Fits[0].Result.Clouds {
			s := c.Species[0]
			near("v", s.V, truth.Clouds[i].V)
			near("b", s.B, truth.Clouds[i].B)
			near("log N", s.LogN, truth.Clouds[i].Cols[0].LogN)
		}
		total := rec.Result.Fits[0].Result.Totals[0]
		near("log N of both", total.LogN, truth.Columns()[0].LogN)
		methods := map[string]bool{}
		for _, c := range rec.Result.Columns {
			methods[c.Method] = true
		}
		if !methods["fit"] || !methods["apparent optical depth"] || len(rec.Result.Verdicts) != 1 {
			t.Errorf("%v: methods %v, %d verdicts", how, methods, len(rec.Result.Verdicts))
		}
	}
}

// Options may stand anywhere; the text says what the JSON holds; a figure is written.
func TestFitOutput(t *testing.T) {
	red := filepath.Join(demo(t), "lantern1_red.fits")
	want := works(t, append([]string{"fit", red, "--clouds", "-14,-6.5"}, naD...)...)
	if got := works(t, append(append([]string{"fit", "--clouds=-14,-6.5"}, naD...), red)...); got != want {
		t.Errorf("another order of the options prints\n%s", got)
	}
	for _, w := range []string{"fit of Na I: 2 clouds", "−14.2", "zero level", "fit", "doublet-corrected optical depth", "differs from fit"} {
		if !strings.Contains(want, w) {
			t.Errorf("no %q in\n%s", w, want)
		}
	}
	svg := filepath.Join(t.TempDir(), "na.svg")
	works(t, append([]string{"fit", red, "--clouds", "-14,-6.5", "--figure", svg}, naD...)...)
	b, err := os.ReadFile(svg)
	if err != nil || !strings.Contains(string(b), "Na I 5895.92") {
		t.Errorf("figure: %v", err)
	}
	blue := filepath.Join(demo(t), "lantern1_blue.fits")
	for _, extra := range [][]string{{"--own-b"}, {"--thermal"}, {"--velocity-zero-err", "0.2"}, {"--degree", "2", "--b", "1.5"}, {"--order", "127"}} {
		args := []string{blue, "--line", "CH 4300.31", "--window", "-40,20", "--clouds", "-14,-6.5"}
		if extra[0] == "--thermal" {
			args = append(args, "--line", "Ca II K")
		}
		rec := fitted(t, append(args, extra...)...)
		if f := rec.Result.Fits[0].Result; !f.Converged || len(f.Clouds) != 2 {
			t.Errorf("%v: %s", extra, f.Stop)
		}
	}
}

// A line spread function from a file: a table of the same Gaussian gives the same
// clouds; one that is not normalised is refused.
func TestFitLineSpread(t *testing.T) {
	red := filepath.Join(demo(t), "lantern1_red.fits")
	dir := t.TempDir()
	const fwhm = 299792.458 / 65000 // km/s, of the simulation
	var b strings.Builder
	b.WriteString("offset_kms any\n")
	var sum float64
	const step = 0.25
	for v := -20.0; v <= 20; v += step {
		sum += math.Exp(-4 * math.Ln2 * v * v / (fwhm * fwhm))
	}
	for v := -20.0; v <= 20; v += step {
		b.WriteString(strings.Join([]string{num(v), num(math.Exp(-4*math.Ln2*v*v/(fwhm*fwhm)) / (sum * step))}, " ") + "\n")
	}
	lsf := filepath.Join(dir, "lsf.txt")
	if err := os.WriteFile(lsf, []byte(b.String()), 0o644); err != nil {
		t.Fatal(err)
	}
	args := append([]string{red, "--clouds", "-14,-6.5"}, naD...)
	a, c := fitted(t, args...), fitted(t, append(args, "--line-spread", lsf)...)
	for i := range 2 {
		x, y := a.Result.Fits[0].Result.Clouds[i].Species[0], c.Result.Fits[0].Result.Clouds[i].Species[0]
		if !(math.Abs(x.LogN.X-y.LogN.X) < 0.3*x.LogN.Err()) || !(math.Abs(x.V.X-y.V.X) < 0.3*x.V.Err()) {
			t.Errorf("cloud %d: log N %.4f with a Gaussian, %.4f with its table", i+1, x.LogN.X, y.LogN.X)
		}
	}
	bad := filepath.Join(dir, "bad.txt")
	if err := os.WriteFile(bad, []byte("offset_kms any\n-5 0\n0 nan\n5 0\n"), 0o644); err != nil {
		t.Fatal(err)
	}
	mistake(t, 2, []string{"bad.txt"}, append([]string{"fit", "--line-spread", bad}, args...)...)
}

func num(x float64) string {
	b, _ := json.Marshal(x)
	return string(b)
}

// Wrong use of fit, with what each message must name.
func TestFitMistakes(t *testing.T) {
	red := filepath.Join(demo(t), "lantern1_red.fits")
	k := []string{"--line", "K I 7698.96", "--window", "-40,20"}
	for _, tc := range []struct {
		args  []string
		words []string
	}{
		{nil, []string{"no line given"}},
		{[]string{"--line", "K I 7698.96"}, []string{"no window given"}},
		{k, []string{"no cloud to start from", "--clouds -14,-6.5", "--auto"}},
		{append(k, "--clouds", "-14", "--auto"), []string{"--auto", "--clouds", "keep one"}},
		{append(k, "--clouds", "a,b"), []string{`--clouds "a,b"`, "velocities with commas"}},
		{append(k, "--clouds", "60"), []string{"60 km/s lies outside the window -40,20"}},
		{append(k, "--clouds", "1e9"), []string{"beyond ±30000 km/s"}},
		{append(k, "--auto", "--most", "0"), []string{"--most 0 is not 1 to 20"}},
		{append(k, "--auto", "--seed", "-1"), []string{"--seed -1 is below 0"}},
		{append(k, "--clouds", "-14", "--thermal"), []string{"--thermal needs species of two masses"}},
		{append(k, "--clouds", "-14", "--thermal", "--own-b"), []string{"leave --own-b out"}},
		{append(k, "--clouds", "-14", "--b", "-1"), []string{"--b -1 is not above 0"}},
		{append(k, "--clouds", "-14", "--line", "K I 7698.96"), []string{"--line K I 7698.96 is there twice"}},
		{append(k, "--clouds", "-14", "--line-spread", "none.txt"), []string{"none.txt"}},
		{append(k, "--clouds", "1"+strings.Repeat(",1", 40)), []string{"41 velocities", "40 clouds at most"}},
	} {
		mistake(t, 2, tc.words, append([]string{"fit", red}, tc.args...)...)
	}
	mistake(t, 2, []string{"no spectrum file given"}, "fit")
}
