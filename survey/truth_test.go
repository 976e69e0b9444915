package survey_test

import (
	"math"
	"os"
	"path/filepath"
	"testing"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/cog"
	"lacuna/config"
	"lacuna/measure"
	"lacuna/simulate"
	"lacuna/spectrum/frame"
	"lacuna/survey"
	"lacuna/voigt"
)

// Widths of the simulated survey against the exact widths of its clouds, over
// several noise seeds: the quoted errors must describe the scatter. The exact
// width is that of package cog, itself checked against tables; the simulation goes
// through air, the Earth's motion, blaze, correlated noise and cosmic rays.
//
// Left out: Ca II H and K of Lantern 1, which lie inside stellar lines, and the
// marked part of K; their errors are meant to be larger than the scatter.
func TestWidthsHoldTheTruth(t *testing.T) {
	dir := t.TempDir()
	if err := simulate.WriteLantern(dir); err != nil {
		t.Fatal(err)
	}
	cfg, err := config.Load(filepath.Join(dir, "survey.toml"))
	if err != nil {
		t.Fatal(err)
	}
	table := atomic.Default()
	const seeds = 10
	var pulls []float64
	for seed := range uint64(seeds) {
		lights := map[string][]survey.Light{}
		stars := map[string]simulate.Star{}
		for k, e := range simulate.Lantern() {
			stars[e.Star.Name] = e.Star
			obs, err := simulate.Observe(e.Star, e.Instrument, table, e.Earth, 500+seed, uint64(k))
			if err != nil {
				t.Fatal(err)
			}
			for i, seg := range obs.Segments {
				seg.Frame, seg.Source.File = e.Frame, e.File
				if e.Frame == frame.Topocentric {
					seg.Shift = []frame.Applied{{Keyword: "VHELIO", To: frame.Heliocent, V: e.Earth}}
				}
				if err := seg.ToVacuum(frame.Ciddor1996); err != nil {
					t.Fatal(err)
				}
				if err := seg.ToFrame(frame.Heliocent); err != nil {
					t.Fatal(err)
				}
				l := survey.Light{Seg: seg, Index: i, R: seg.Resolution}
				l.Earth, l.Placed = l.Seg.Motion()
				lights[e.Star.Name] = append(lights[e.Star.Name], l)
			}
		}
		for _, s := range cfg.Sightlines {
			var tasks []survey.LineTask
			for _, l := range s.Lines {
				line, err := table.Find(l.Name)
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
			widths, _, err := survey.MeasureLines(lights[s.Name], tasks, table)
			if err != nil {
				t.Fatal(err)
			}
			for _, w := range widths {
				if s.Name == "Lantern 1" && w.Species == "Ca II" || w.Species == "Ca I" {
					continue
				}
				line, err := table.Find(w.Line)
				if err != nil {
					t.Fatal(err)
				}
				var clouds []voigt.Cloud
				for _, c := range stars[s.Name].Clouds {
					for _, col := range c.Cols {
						if col.Species == line.Carrier() {
							clouds = append(clouds, voigt.Cloud{V: c.V, B: c.B, LogN: col.LogN})
						}
					}
				}
				truth := 0.0
				if clouds != nil {
					truth = cog.WidthOf(line, clouds)
				}
				pulls = append(pulls, (w.W.X-truth)/w.W.Err())
			}
		}
	}
	var mean, square float64
	in := 0
	for _, p := range pulls {
		mean += p / float64(len(pulls))
		square += p * p / float64(len(pulls))
		if math.Abs(p) < 1 {
			in++
		}
	}
	part := float64(in) / float64(len(pulls))
	t.Logf("%d widths: mean pull %+.2f, rms %.2f, %.0f %% within 1σ", len(pulls), mean, math.Sqrt(square), 100*part)
	// Lines of one exposure share noise of the continuum: about 300 pulls count as 200.
	if !(math.Abs(mean) < 0.35) || !(square > 0.75*0.75 && square < 1.25*1.25) || !(part > 0.58) {
		t.Errorf("pulls of the widths: mean %+.2f, rms %.2f, %.0f %% within 1σ", mean, math.Sqrt(square), 100*part)
	}
}

// The adopted columns of the demonstration lie within 3σ of the truth, limits on
// its right side.
func TestLanternColumns(t *testing.T) {
	dir := t.TempDir()
	if err := simulate.WriteLantern(dir); err != nil {
		t.Fatal(err)
	}
	cfg, err := config.Load(filepath.Join(dir, "survey.toml"))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := os.Stat(filepath.Join(dir, simulate.TruthName)); err != nil {
		t.Error(err)
	}
	records, err := survey.Run(t.Context(), cfg, survey.Options{})
	if err != nil {
		t.Fatal(err)
	}
	n := 0
	for _, r := range records {
		for _, e := range simulate.Lantern() {
			if e.Star.Name != r.Name {
				continue
			}
			for _, col := range e.Star.Columns() {
				for _, got := range r.Result.Adopted {
					if got.Species != col.Species {
						continue
					}
					n++
					x := got.LogN
					ok := false
					switch x.Kind() {
					case "value":
						s := x.ErrUp()
						if col.LogN < x.X {
							s = x.ErrLo()
						}
						ok = math.Abs(x.X-col.LogN) < 3*s
					case "upper":
						ok = col.LogN < x.X
					case "lower":
						ok = col.LogN > x.X-0.1
					case "interval":
						ok = col.LogN > x.X-x.Lo-0.1 && col.LogN < x.X+x.Up+0.1
					}
					t.Logf("%s %-9s %6.2f ± %.2f %-8s truth %.2f", r.Name, col.Species, x.X, x.Err(), x.Kind(), col.LogN)
					if !ok {
						t.Errorf("%s: %s adopted as %.2f ± %.2f (%s, %s), truth %.2f", r.Name, col.Species, x.X, x.Err(), x.Kind(), got.Method, col.LogN)
					}
				}
			}
			break
		}
		if h := r.Result.Hydrogen; h == nil || !(h.H.X > 20) {
			t.Errorf("%s: no hydrogen", r.Name)
		}
	}
	if n < 15 {
		t.Errorf("only %d columns compared", n)
	}
	if n := records[1].Result.Hydrogen.H; !n.Is(budget.Interval) {
		t.Error("Lantern 2 has no H2 value, but N(H) is no interval")
	}
}
