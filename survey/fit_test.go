package survey_test

import (
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/config"
	"lacuna/internal/oops"
	"lacuna/measure"
	"lacuna/simulate"
	"lacuna/spectrum"
	"lacuna/spectrum/frame"
	"lacuna/survey"
	"lacuna/voigt/clouds"
)

// lantern reads the survey of the demonstration.
func lantern(t *testing.T) *config.Survey {
	t.Helper()
	dir := t.TempDir()
	if err := simulate.WriteLantern(dir); err != nil {
		t.Fatal(err)
	}
	cfg, err := config.Load(filepath.Join(dir, "survey.toml"))
	if err != nil {
		t.Fatal(err)
	}
	return cfg
}

// exposed observes a star of the demonstration with noise of another seed.
func exposed(t *testing.T, name string, seed uint64) (lights []survey.Light, star simulate.Star) {
	t.Helper()
	for k, e := range simulate.Lantern() {
		if e.Star.Name != name {
			continue
		}
		star = e.Star
		obs, err := simulate.Observe(e.Star, e.Instrument, atomic.Default(), e.Earth, seed, uint64(k))
		if err != nil {
			t.Fatal(err)
		}
		for i, seg := range obs.Segments {
			seg.Frame, seg.Source.File = e.Frame, e.File
			seg.Shift = []frame.Applied{{Keyword: "VHELIO", To: frame.Heliocent, V: e.Earth}}
			if err := seg.ToVacuum(frame.Ciddor1996); err != nil {
				t.Fatal(err)
			}
			if err := seg.ToFrame(frame.Heliocent); err != nil {
				t.Fatal(err)
			}
			l := survey.Light{Seg: seg, Index: i, R: seg.Resolution, RErr: 0.05}
			l.Earth, l.Placed = l.Seg.Motion()
			lights = append(lights, l)
		}
	}
	return lights, star
}

// tasksOf are the lines of a sightline.
func tasksOf(t *testing.T, s config.Sightline) []survey.LineTask {
	t.Helper()
	var tasks []survey.LineTask
	for _, l := range s.Lines {
		line, err := atomic.Default().Find(l.Name)
		if err != nil {
			t.Fatal(err)
		}
		task := survey.LineTask{Line: line, Window: l.Window, Degree: l.Degree, Continuum: l.Continuum, MaxDegree: s.MaxDegree, Velocity: s.Velocity,
			Zero: func(string) measure.Zero { return measure.Zero{Err: 0.01, By: "prior"} }}
		for _, o := range s.Lines {
			task.Also = append(task.Also, o.Name)
		}
		tasks = append(tasks, task)
	}
	return tasks
}

// The clouds of Lantern 1 come out as they were put in: v, b and log N of every species
// in every cloud, for several seeds of the noise, with pulls whose scatter is that of the
// quoted errors. The simulation shares no code with the fit but the profile function,
// and goes through air, the Earth's motion, blaze, correlated noise and cosmic rays. The
// resolving power is the true one, so the profile adds nothing to the scatter and the
// pulls may be a little below 1. Of the automatic fit (Ca II, inside stellar lines) the
// totals are looked at.
func TestCloudsHoldTheTruth(t *testing.T) {
	one := lantern(t).Sightlines[0]
	const seeds = 8
	pulls := map[string][]float64{}
	for seed := range uint64(seeds) {
		lights, star := exposed(t, one.Name, 900+seed)
		pieces := survey.Cut(lights, tasksOf(t, one), atomic.Default())
		if _, _, err := pieces.Measure(); err != nil {
			t.Fatal(err)
		}
		for _, f := range one.Fits {
			fit, err := pieces.Fit(f, survey.FitOptions{Seed: 1})
			if err != nil {
				t.Fatal(err)
			}
			r := fit.Result
			if !r.Converged || r.Chi2 > float64(r.DOF)+5*math.Sqrt(2*float64(r.DOF)) {
				t.Errorf("seed %d, %s: χ² %.1f for %d, %s", seed, f.Name, r.Chi2, r.DOF, r.Stop)
			}
			for i, c := range r.Clouds {
				if f.Auto { // promised for sums only: here a stellar line under K may count as one more
					break
				}
				for _, s := range c.Species {
					truth := star.Clouds[i]
					pull := func(what string, n budget.Number, x float64) {
						e := n.ErrUp()
						if x < n.X {
							e = n.ErrLo()
						}
						if n.Kind() != "value" || !(e > 0) || math.IsInf(e, 0) {
							if n.Kind() == "upper" && x > n.X {
								t.Errorf("seed %d, %s: %s < %.2f, truth %.2f", seed, s.Carrier, what, n.X, x)
							}
							return
						}
						p := (n.X - x) / e
						pulls[what] = append(pulls[what], p)
						if !(math.Abs(p) < 4.5) {
							t.Errorf("seed %d, %s of %s: %s = %.3f ± %.3f, truth %.3f", seed, s.Carrier, c.Name, what, n.X, e, x)
						}
					}
					if s.Carrier == c.Species[0].Carrier { // what all share counts once
						pull("v", s.V, truth.V)
						pull("b", s.B, truth.B)
					}
					for _, col := range truth.Cols {
						if col.Species == s.Carrier {
							pull("log N", s.LogN, col.LogN)
						}
					}
				}
			}
			for _, tot := range r.Totals {
				for _, col := range star.Columns() {
					if col.Species == tot.Carrier && tot.LogN.Kind() == "value" {
						e := tot.LogN.ErrUp()
						if col.LogN < tot.LogN.X {
							e = tot.LogN.ErrLo()
						}
						pulls["total"] = append(pulls["total"], (tot.LogN.X-col.LogN)/e)
					}
				}
			}
		}
	}
	for what, want := range map[string]int{"v": 5 * seeds, "b": 4 * seeds, "log N": 9 * seeds, "total": 6 * seeds} {
		ps := pulls[what]
		mean, square := 0.0, 0.0
		for _, p := range ps {
			mean += p / float64(len(ps))
			square += p * p / float64(len(ps))
		}
		t.Logf("%-6s %d pulls: mean %+.2f, rms %.2f", what, len(ps), mean, math.Sqrt(square))
		if len(ps) < want {
			t.Errorf("only %d pulls of %s", len(ps), what)
		}
		// Columns include the error of f, which the simulation does not scatter; n pulls
		// know their rms to 1/√2n and their mean to 1/√n: 3.5 of each, and 0.2 for what the
		// errors hold beyond the scatter.
		n := float64(len(ps))
		if rms := math.Sqrt(square); !(math.Abs(mean) < 3.5/math.Sqrt(n)) || !(rms < 1+3.5/math.Sqrt(2*n)) || !(rms > 0.4) {
			t.Errorf("pulls of %s: mean %+.2f, rms %.2f", what, mean, math.Sqrt(square))
		}
	}
}

// The two lines of Na I at 3302 and 3303 Å lie 55 km/s apart, and so do the pixels of
// their pieces: they are one window, and no pixel counts twice. A line in two orders
// is two windows.
func TestFitWindows(t *testing.T) {
	one := lantern(t).Sightlines[0]
	lights, _ := exposed(t, one.Name, 3)
	pieces := survey.Cut(lights, tasksOf(t, one), atomic.Default())
	fit, err := pieces.Fit(one.Fits[0], survey.FitOptions{})
	if err != nil {
		t.Fatal(err)
	}
	if len(fit.Windows) != 2 || len(fit.Windows[0].Lines) != 2 {
		t.Fatalf("%d windows", len(fit.Windows))
	}
	pixels := 0
	for _, w := range fit.Windows {
		for i, x := range w.Wave {
			if i > 0 && !(x > w.Wave[i-1]) {
				t.Errorf("%s: %.4f Å after %.4f", w.Name, x, w.Wave[i-1])
			}
			if w.Used[i] {
				pixels++
			}
		}
		for i := range w.Wave {
			if w.Used[i] && !(math.Abs(w.Residual[i]-(w.Flux[i]-w.Model[i])/w.Err[i]) < 1.1e-4/w.Err[i]+1e-4*math.Abs(w.Residual[i])) { // five digits: 5e-5 above 1
				t.Errorf("%s, pixel %d: residual %.4f", w.Name, i, w.Residual[i])
			}
		}
		if len(w.Clouds) != 2 {
			t.Errorf("%s: curves of %d clouds", w.Name, len(w.Clouds))
		}
	}
	if pixels != fit.Result.Pixels {
		t.Errorf("%d pixels used, the fit counts %d", pixels, fit.Result.Pixels)
	}
	// The same exposure as two orders: columns stay, errors shrink by up to √2.
	twice := append(lights[:len(lights):len(lights)], lights...)
	for i := len(lights); i < len(twice); i++ {
		twice[i].Seg.Order += 1000
		twice[i].Seg.Label = fmt.Sprintf("order %d", twice[i].Seg.Order)
	}
	pieces = survey.Cut(twice, tasksOf(t, one), atomic.Default())
	both, err := pieces.Fit(one.Fits[0], survey.FitOptions{})
	if err != nil {
		t.Fatal(err)
	}
	if len(both.Windows) != 4 || both.Result.Pixels != 2*pixels {
		t.Errorf("%d windows with %d pixels", len(both.Windows), both.Result.Pixels)
	}
	a, b := fit.Result.Clouds[1].Species[0], both.Result.Clouds[1].Species[0]
	if !(math.Abs(a.LogN.X-b.LogN.X) < 0.2*a.LogN.Err()) {
		t.Errorf("log N %.4f once, %.4f twice", a.LogN.X, b.LogN.X)
	}
	// Noise averages, what is known of the profile's width beforehand does not.
	if e := b.V.Err() / a.V.Err(); !(e > math.Sqrt2/2-0.01 && e < 0.8) {
		t.Errorf("error of v with the same data twice: %.3f of that of once", e)
	}
}

// A species that is not there, at the clouds of another, gets N ± σ and a limit; a cloud
// that is not there keeps v and b of its start.
func TestLimitsAtOtherClouds(t *testing.T) {
	two := lantern(t).Sightlines[1]
	lights, star := exposed(t, two.Name, 5)
	pieces := survey.Cut(lights, tasksOf(t, two), atomic.Default())
	f := fitOf([]string{"Na I 5895.92", "CN 3874.60"}, 5, 20)
	f.Telluric = "keep"
	fit, err := pieces.Fit(f, survey.FitOptions{})
	if err != nil {
		t.Fatal(err)
	}
	cs := fit.Result.Clouds
	na, cn := cs[0].Species[1], cs[0].Species[0]
	if na.Carrier != "Na I" || cn.Carrier != "CN N=0" {
		t.Fatalf("%s, %s", na.Carrier, cn.Carrier)
	}
	if truth := star.Clouds[0].Cols[0].LogN; !(math.Abs(na.LogN.X-truth) < 4*na.LogN.Err()) {
		t.Errorf("log N(Na I) = %.3f ± %.3f, truth %.2f", na.LogN.X, na.LogN.Err(), truth)
	}
	if !cn.LogN.Is(budget.Upper) || cn.LogN.Conf != 3 || !(math.Abs(cn.N.X) < 3.5*cn.N.Err()) {
		t.Errorf("CN is not there, yet %s %.2f, N = %.2g ± %.2g", cn.LogN.Kind(), cn.LogN.X, cn.N.X, cn.N.Err())
	}
	// 3σ above N ± σ by the parabola; the likelihood differs little for so thin a line.
	if lim := math.Pow(10, cn.LogN.X); !(math.Abs(lim/(max(cn.N.X, 0)+3*cn.N.Err())-1) < 0.3) {
		t.Errorf("limit %.3g for N = %.3g ± %.3g", lim, cn.N.X, cn.N.Err())
	}
	ghost := cs[1]
	if ghost.V.X != 20 || ghost.V.Err() != 0 || ghost.Species[1].B.X != 2 {
		t.Errorf("a cloud that is not there: v = %.2f ± %.2f, b = %.2f", ghost.V.X, ghost.V.Err(), ghost.Species[1].B.X)
	}
	for _, s := range ghost.Species {
		if !s.LogN.Is(budget.Upper) {
			t.Errorf("%s at a cloud that is not there: %s", s.Carrier, s.LogN.Kind())
		}
	}
	if !strings.Contains(strings.Join(fit.Warnings, "\n"), "cloud 2 is not seen") {
		t.Errorf("%q", fit.Warnings)
	}
}

// fitOf is a fit as the configuration makes it, with clouds at velocities.
func fitOf(lines []string, vs ...float64) config.Fit {
	f := config.Fit{Name: "test", Lines: lines, Degree: -1, Most: 8, ShareB: true, ShareV: true, Telluric: "mask"}
	for i, v := range vs {
		b := config.StartAt(2)
		f.Clouds = append(f.Clouds, config.FitCloud{Name: fmt.Sprintf("cloud %d", i+1), V: config.StartAt(v), B: &b})
	}
	f.Auto = len(vs) == 0
	return f
}

// What is wrong with data or settings is said with its place; what is odd is a result
// with a warning. No number of a result is NaN without a word.
func TestFitMistakes(t *testing.T) {
	one := lantern(t).Sightlines[0]
	lights, _ := exposed(t, one.Name, 4)
	tasks := tasksOf(t, one)
	pieces := survey.Cut(lights, tasks, atomic.Default())
	dir := t.TempDir()
	profile := func(name, text string) func(string) string {
		p := filepath.Join(dir, name)
		if err := os.WriteFile(p, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
		return func(string) string { return p }
	}
	k := []string{"K I 7698.96"}
	wide := fitOf(k, -14)
	wide.Window = [2]float64{-40.001, -40}
	many := fitOf(k)
	many.Auto = false
	for i := range 80 {
		b := config.StartAt(1)
		many.Clouds = append(many.Clouds, config.FitCloud{Name: fmt.Sprintf("cloud %d", i+1), V: config.StartAt(-30 + 0.5*float64(i)), B: &b})
	}
	bounds := fitOf(k, -14)
	far := [2]float64{-10, 0}
	bounds.Clouds[0].V.Range = &far
	circle := fitOf(k, -14, -6)
	circle.Clouds[0].B = &config.Parameter{To: "cloud 2"}
	circle.Clouds[1].B = &config.Parameter{To: "cloud 1"}
	for _, tc := range []struct {
		name   string
		fit    config.Fit
		spread func(string) string
		want   []string
	}{
		{"no such line", fitOf([]string{"Ca I 4226.74"}, -14), nil, []string{"fit of test", "no spectrum holds"}},
		{"empty window", wide, nil, []string{"fit of test", "no good pixel", "widen the window"}},
		{"too many parameters", many, nil, []string{"fit of test", "K I 7698.96", "parameters", "pixels"}},
		{"bounds exclude the start", bounds, nil, []string{"fit of test: cloud 1: v", "exclude the start -14"}},
		{"ties in a circle", circle, nil, []string{"fit of test", "circle"}},
		{"no such profile", fitOf(k, -14), func(string) string { return filepath.Join(dir, "none.txt") }, []string{"none.txt"}},
		{"profile not normalised", fitOf(k, -14), profile("half.txt", "offset_kms any\n-10 0\n-5 0\n0 -1\n5 0\n10 0\n"), []string{"half.txt"}},
		{"profile cut off", fitOf(k, -14), profile("short.txt", "offset_kms any\n-1 1\n0 1\n1 1\n"), []string{"short.txt"}},
	} {
		_, err := pieces.Fit(tc.fit, survey.FitOptions{LineSpread: tc.spread})
		if !oops.IsInput(err) {
			t.Errorf("%s: %v, want the user's mistake", tc.name, err)
			continue
		}
		for _, w := range tc.want {
			if !strings.Contains(err.Error(), w) {
				t.Errorf("%s: no %q in %v", tc.name, w, err)
			}
		}
	}
	dark := make([]survey.Light, len(lights))
	copy(dark, lights)
	for i := range dark {
		dark[i].R = 0
	}
	p := survey.Cut(dark, tasks, atomic.Default())
	if _, err := p.Fit(fitOf(k, -14), survey.FitOptions{}); !oops.IsInput(err) || !strings.Contains(err.Error(), "resolving power is not known") {
		t.Errorf("no resolving power: %v", err)
	}
}

// A spectrum without any line gives no cloud automatically, and limits for one that is
// asked for.
func TestFitOfNothing(t *testing.T) {
	one := lantern(t).Sightlines[0]
	lights, _ := exposed(t, one.Name, 6)
	var flat []survey.Light
	for _, l := range lights {
		l.Seg = flattened(l.Seg)
		flat = append(flat, l)
	}
	tasks := tasksOf(t, one)
	pieces := survey.Cut(flat, tasks[2:3], atomic.Default()) // K I
	auto, err := pieces.Fit(fitOf([]string{"K I 7698.96"}), survey.FitOptions{Seed: 1})
	if err != nil {
		t.Fatal(err)
	}
	if len(auto.Result.Clouds) != 0 || len(auto.Columns()) != 0 || !strings.Contains(strings.Join(auto.Warnings, "\n"), "no cloud is seen") {
		t.Errorf("%d clouds in a flat spectrum: %q", len(auto.Result.Clouds), auto.Warnings)
	}
	fit, err := pieces.Fit(fitOf([]string{"K I 7698.96"}, -14), survey.FitOptions{})
	if err != nil {
		t.Fatal(err)
	}
	s := fit.Result.Clouds[0].Species[0]
	if !s.LogN.Is(budget.Upper) || !(s.LogN.X > 9 && s.LogN.X < 11) {
		t.Errorf("log N %s %.2f in a flat spectrum", s.LogN.Kind(), s.LogN.X)
	}
	for _, c := range fit.Result.Clouds {
		noHoles(t, c)
	}
}

// noHoles: a number without a value says so by its kind.
func noHoles(t *testing.T, c clouds.CloudFit) {
	t.Helper()
	for _, s := range c.Species {
		for _, n := range []budget.Number{s.V, s.B, s.LogN, s.N} {
			if math.IsNaN(n.Err()) || math.IsInf(n.X, 0) {
				t.Errorf("%s: %+v", s.Carrier, n)
			}
		}
	}
}

// flattened replaces lines by continuum with noise.
func flattened(s spectrum.Segment) spectrum.Segment {
	flux := make([]float64, len(s.Flux))
	for i := range flux {
		flux[i] = 1000 + 3*math.Sin(1e5*float64(i)*float64(i)) // deterministic, white enough
	}
	s.Flux, s.Err = flux, make([]float64, len(flux))
	s.Mask = make([]spectrum.Reason, len(flux))
	for i := range s.Err {
		s.Err[i] = 2.12 // rms of the sine
	}
	return s
}
