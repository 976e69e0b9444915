package config

import (
	"strings"
	"testing"
)

// fitted is a survey with every kind of parameter.
const fitted = `
[survey]
name = "s"
[defaults]
velocity = [-50, 45]
lines = ["Na I 5889.95", "Na I 5895.92", "K I 7698.96", "CH 4300.31"]
[[defaults.fit]]
lines = ["Na D1", "Na D2", "Ca II K"]
auto = true
[[sightline]]
name = "Lantern 1"
[[sightline.spectrum]]
file = "a.fits"
line_spread = "lsf.txt"
[[sightline.fit]]
lines = ["Na D1", "K I 7698.96"]
offset = ["KI"]
[[sightline.fit.cloud]]
v = -14
b = {start = 1.3, range = [0.5, 3]}
columns = {"NaI" = 12.8, "K I" = {start = 11.4, fixed = true}}
[[sightline.fit.cloud]]
v = {to = "cloud 1", shift = 7.5}
b = {to = "cloud 1"}
columns = {"K I" = {to = "Na I", ratio = 0.02}, "Na I" = {prior = 12, prior_err = 0.2}}
[[sightline.fit]]
name = "warm"
lines = ["Na D1", "CH 4300.31"]
window = [-40, 10]
thermal = true
velocity_zero_err = 0.2
telluric = "keep"
[[sightline.fit.cloud]]
v = {range = [-20, -10]}
[[sightline]]
name = "Lantern 2"
[[sightline.spectrum]]
file = "b.fits"
`

func TestFits(t *testing.T) {
	s := mustLoad(t, fitted)
	one, two := s.Sightlines[0], s.Sightlines[1]
	if len(one.Fits) != 2 || len(two.Fits) != 1 || one.Spectra[0].LineSpread != "lsf.txt" {
		t.Fatalf("%d and %d fits", len(one.Fits), len(two.Fits))
	}
	f := one.Fits[0]
	if f.Name != "Na I + K I" || strings.Join(f.Lines, ", ") != "Na I 5895.92, K I 7698.96" || strings.Join(f.Offset, "") != "K I" || !f.ShareB || f.Degree != -1 {
		t.Errorf("%+v", f)
	}
	a, b := f.Clouds[0], f.Clouds[1]
	if a.Name != "cloud 1" || *a.V.Start != -14 || *a.B.Range != [2]float64{0.5, 3} || *a.Columns["Na I"].Start != 12.8 || !a.Columns["K I"].Fixed {
		t.Errorf("%+v", a)
	}
	if b.V.To != "cloud 1" || *b.V.Shift != 7.5 || b.B.To != "cloud 1" || b.Columns["K I"].To != "Na I" || *b.Columns["Na I"].Start != 12 {
		t.Errorf("%+v", b)
	}
	warm := one.Fits[1].Clouds[0]
	if *warm.V.Start != -15 || warm.B != nil || *warm.T.Start != 100 || *warm.Turbulence.Start != 1 || warm.Columns != nil {
		t.Errorf("%+v", warm)
	}
	// The fit of [defaults] is for sightlines without their own, less what they lack.
	if g := two.Fits[0]; !g.Auto || g.Most != 8 || strings.Join(g.Lines, ", ") != "Na I 5895.92, Na I 5889.95" || g.Name != "Na I" {
		t.Errorf("%+v", g)
	}
	again, err := load(t, string(s.Resolved()))
	if err != nil {
		t.Fatalf("%v\n%s", err, s.Resolved())
	}
	same(t, s, again, s.Resolved(), again.Resolved())
	for _, want := range []string{
		`columns = {"K I" = {to = "Na I", ratio = 0.02}, "Na I" = {start = 12.0, prior = 12.0, prior_err = 0.2}}`,
		"v = {to = \"cloud 1\", shift = 7.5}", "T = 100.0  # default", "auto = true  # defaults",
	} {
		if !strings.Contains(string(s.Resolved()), want) {
			t.Errorf("no %q in\n%s", want, s.Resolved())
		}
	}
}

func TestFitMistakes(t *testing.T) {
	const fit, cloud = "[[sightline.fit]]\nlines = [\"Na D2\"]\n", "[[sightline.fit.cloud]]\nv = -5\n"
	two := strings.Replace(ok, `["Na I 5889.95"]`, `["Na I 5889.95", "K I 7698.96"]`, 1)
	const both = "[[sightline.fit]]\nlines = [\"Na D2\", \"K I 7698.96\"]\n"
	for _, tc := range []struct {
		name, text string
		want       []string
	}{
		{"no lines", ok + "[[sightline.fit]]\n" + cloud, []string{"fit 1: lines: missing"}},
		{"empty lines", ok + "[[sightline.fit]]\nlines=[]\n" + cloud, []string{"fit 1: lines: none"}},
		{"line not measured", ok + "[[sightline.fit]]\nlines=[\"Na D1\"]\n" + cloud, []string{"lines 1: Na I 5895.92 is not among the lines of the sightline", "did you mean Na I 5889.95"}},
		{"line left out", two + "[[sightline.line]]\nname=\"K I 7698.96\"\nuse=false\n" + both + cloud, []string{"lines 2: K I 7698.96 is not among", "leave it out here too"}},
		{"unknown line", ok + "[[sightline.fit]]\nlines=[\"Na D9\"]\n" + cloud, []string{"fit 1: lines 1: "}},
		{"line twice", ok + "[[sightline.fit]]\nlines=[\"Na D2\", \"Na I 5889.95\"]\n" + cloud, []string{"lines 2: Na I 5889.95 is there twice"}},
		{"no cloud", ok + fit, []string{"fit 1: no cloud to start from; add [[sightline.fit.cloud]] with v = …, or auto = true"}},
		{"auto with clouds", ok + fit + "auto=true\n" + cloud, []string{"auto finds the clouds, yet 1 are given"}},
		{"too many clouds", ok + fit + strings.Repeat(cloud, 41), []string{"fit 1: 41 clouds, 40 at most"}},
		{"no v", ok + fit + "[[sightline.fit.cloud]]\nb = 1\n", []string{"cloud 1: v: missing; add v = "}},
		{"unknown key", ok + fit + cloud + "logN = 12\n", []string{"fit 1: cloud 1: logN: unknown key"}},
		{"key of a fit", ok + fit + cloud + "auto = true\n", []string{"auto: unknown key; this key belongs to [sightline.fit]"}},
		{"text", ok + fit + "[[sightline.fit.cloud]]\nv = \"-5\"\n", []string{`v: "-5" is a text, wanted a number or parameter; write v = 1.5, or v = {start = 1.5, range = [1, 2]}`}},
		{"negative b", ok + fit + cloud + "b = -1\n", []string{"b: -1 km/s is impossible; must lie in (0, 1000] km/s"}},
		{"negative b in a table", ok + fit + cloud + "b = {start = -1}\n", []string{"b: start: -1 km/s is impossible"}},
		{"range beyond b", ok + fit + cloud + "b = {start = 1, range = [-1, 2]}\n", []string{"b: range: -1 km/s is impossible"}},
		{"linear N", ok + fit + cloud + "columns = {\"Na I\" = 1e12}\n", []string{"columns: Na I: 1e+12 log cm⁻² is impossible; must lie in [4, 25]"}},
		{"range without start", ok + fit + cloud + "b = {start = 5, range = [0.5, 3]}\n", []string{"cloud 1: b: range: [0.5, 3] excludes the start 5; widen it, or start inside"}},
		{"fixed to nothing", ok + fit + cloud + "b = {fixed = true}\n", []string{"b: start: missing: fixed to what?"}},
		{"fixed in a range", ok + fit + cloud + "b = {start = 1, fixed = true, range = [0.5, 3]}\n", []string{"a fixed parameter has neither range nor prior"}},
		{"prior without error", ok + fit + cloud + "b = {prior = 1}\n", []string{"one of prior and prior_err is missing"}},
		{"nothing of a parameter", ok + fit + cloud + "b = {}\n", []string{"b: start: missing; add start, range, or prior with prior_err"}},
		{"turned range", ok + fit + cloud + "b = {range = [3, 1]}\n", []string{"range: 3 is not below 1"}},
		{"NaN", ok + fit + "[[sightline.fit.cloud]]\nv = nan\n", []string{"v: NaN is not a number to work with"}},
		{"outside the window", ok + fit + "[[sightline.fit.cloud]]\nv = 80\n", []string{"cloud 1: v: 80 km/s lies outside the window [-50, 45] of every line"}},
		{"outside the window of the fit", ok + fit + "window = [0, 20]\n" + cloud, []string{"v: -5 km/s lies outside the window [0, 20]"}},
		{"strange species", ok + fit + cloud + "columns = {\"Na I\" = 12, \"K I\" = 11}\n", []string{`columns: no line of the fit is one of "K I"; one of Na I`}},
		{"species without cloud", two + both + cloud + "columns = {\"Na I\" = 12}\n", []string{"fit 1: no cloud holds K I; put it into columns of a cloud"}},
		{"species twice", two + both + cloud + "columns = {\"Na I\" = 12, \"NaI\" = 12, \"K I\" = 11}\n", []string{"columns: Na I is there twice"}},
		{"list of columns", ok + fit + cloud + "columns = [12]\n", []string{"columns: [12] is a list, wanted a table of numbers or parameters, by species; write columns = {\"Na I\" = 12.5}"}},
		{"empty columns", ok + fit + cloud + "columns = {}\n", []string{"columns: the cloud holds nothing"}},
		{"tie to no cloud", ok + fit + cloud + "b = {to = \"cloud 2\"}\n", []string{`b: "cloud 2" is not another cloud of this fit; there is no other cloud`}},
		{"tie to itself", two + both + cloud + "columns = {\"Na I\" = {to = \"Na I\"}, \"K I\" = 11}\n", []string{"columns: Na I: it follows itself"}},
		{"tie with a start", ok + fit + cloud + cloud + "b = {to = \"cloud 1\", start = 1}\n", []string{"a parameter that follows another has no start"}},
		{"ratio of velocities", ok + fit + cloud + "[[sightline.fit.cloud]]\nv = {to = \"cloud 1\", ratio = 2}\n", []string{"v: ratio: velocities follow each other by a shift"}},
		{"shift of b", ok + fit + cloud + cloud + "b = {to = \"cloud 1\", shift = 2}\n", []string{"b: shift: only velocities"}},
		{"ratio to nothing", ok + fit + cloud + "b = {start = 1, ratio = 2}\n", []string{"ratio and shift belong to a parameter that follows another"}},
		{"cloud name twice", ok + fit + cloud + "name = \"a\"\n" + cloud + "name = \"a\"\n", []string{`cloud 2: two clouds are called "a"`}},
		{"fit twice", ok + fit + cloud + fit + cloud, []string{`fit 2: two fits are called "Na I"`}},
		{"T without thermal", ok + fit + cloud + "T = 80\n", []string{"T and turbulence are given, yet b is not split"}},
		{"b with thermal", two + both + "thermal = true\n" + cloud + "b = 1\n", []string{"with thermal, b follows from T and turbulence"}},
		{"one mass", ok + fit + "thermal = true\n" + cloud, []string{"species of one mass alone"}},
		{"thermal without shared b", two + both + "thermal = true\nshare_b = false\n" + cloud, []string{"share_b: with thermal"}},
		{"every species offset", ok + fit + "offset = [\"Na I\"]\n" + cloud, []string{"offset: every species has an offset"}},
		{"offset without shared v", two + both + "offset = [\"K I\"]\nshare_v = false\n" + cloud, []string{"share_v: an offset is between species"}},
		{"telluric", ok + fit + "telluric = \"remove\"\n" + cloud, []string{`telluric: "remove" is not known`, "mask, keep"}},
		{"most", ok + fit + "auto = true\nmost = 0\n", []string{"most: 0 is impossible; must lie in [1, 20]"}},
		{"mistake in defaults", strings.Replace(ok, "[defaults]", "[[defaults.fit]]\nlines=[\"Na D2\"]\n[defaults]", 1), []string{"defaults: fit 1: no cloud to start from"}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			_, err := load(t, tc.text)
			checkMistake(t, err, tc.want)
			if err != nil && strings.Contains(err.Error(), "\n") {
				t.Errorf("more than the one mistake:\n%v", err)
			}
		})
	}
}
