package survey

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"lacuna/config"
	"lacuna/internal/oops"
	"lacuna/voigt/clouds"
)

// A Fit is clouds fitted to several lines together, with everything that tables and
// figures need.
type Fit struct {
	Name      string            `json:"name"`
	Lines     []string          `json:"lines"`
	Species   []string          `json:"species"` // carriers, in the order of the lines
	Auto      bool              `json:"auto,omitempty"`
	Result    clouds.Result     `json:"result"`
	Solutions []clouds.Solution `json:"solutions,omitempty"` // with Auto: others near the best
	Windows   []FitWindow       `json:"windows"`             // in the order of Result.Windows
	Warnings  []string          `json:"warnings,omitempty"`
}

// A FitWindow is one window of a fit on its pixels. Fluxes are over the fitted
// continuum and have five digits; masked pixels without a number stand as 0.
type FitWindow struct {
	Name     string       `json:"name"`
	File     string       `json:"file"`
	Order    int          `json:"order"`
	Lines    []FitLine    `json:"lines"`
	Wave     []float64    `json:"wave"` // vacuum Å, frame of the results
	Flux     []float64    `json:"flux"`
	Err      []float64    `json:"err"`
	Model    []float64    `json:"model"`
	Residual []float64    `json:"residual"` // σ; 0 where not used
	Used     []bool       `json:"used"`
	Clouds   []FitCurve   `json:"clouds"` // in the order of Result.Clouds
	Telluric [][2]float64 `json:"telluric,omitempty"`
	Others   []string     `json:"others,omitempty"` // transitions that may absorb here and are not in the fit
}

// A FitLine is one transition in a window.
type FitLine struct {
	Name    string     `json:"name"`
	Carrier string     `json:"carrier"`
	Wave    float64    `json:"wave"`   // vacuum Å
	Window  [2]float64 `json:"window"` // km/s
}

// A FitCurve is what one cloud alone does, from pixel From on; the continuum elsewhere.
type FitCurve struct {
	From int       `json:"from"`
	Flux []float64 `json:"flux"`
}

// curveDepth is the absorption below which a cloud's curve is not kept.
const curveDepth = 2e-4

// FitOptions of Pieces.Fit.
type FitOptions struct {
	Seed       int                      // of automatic fits
	LineSpread func(file string) string // file of the line spread function of a spectrum; "": Gaussian
	Sigma      float64                  // of limits; 0: 3
	BRange     [2]float64               // km/s, that clouds of automatic fits may have; {0, 0}: 0.3 to 30
	grid       clouds.Options
}

// Fit fits clouds to the lines of f. What is wrong with f or its data is the user's
// mistake; a fit that does not converge, or rests on a bound, says so in its warnings.
func (p *Pieces) Fit(f config.Fit, o FitOptions) (Fit, error) {
	out, err := p.fit(f, o)
	if err != nil && o.grid == (clouds.Options{}) {
		// An uneven sub-grid may fail a cloud that became very narrow; the even one does not.
		o.grid.Steps = evenSteps
		if again, still := p.fit(f, o); still == nil {
			return again, nil
		}
	}
	if err != nil {
		return out, inFit(f.Name, err)
	}
	return out, nil
}

// evenSteps is a number of sub-grid steps for which package clouds takes even grids only.
const evenSteps = 12

// inFit puts the name of a fit before an error.
func inFit(name string, err error) error {
	var m *oops.Mistake
	if !errors.As(err, &m) {
		return fmt.Errorf("fit of %s: %w", name, err)
	}
	where := "fit of " + name
	if m.Where != "" {
		where += ": " + m.Where
	}
	return oops.Input(m.File, where, m.What, m.Fix)
}

func (p *Pieces) fit(f config.Fit, o FitOptions) (Fit, error) {
	out := Fit{Name: f.Name, Auto: f.Auto}
	if o.Sigma == 0 {
		o.Sigma = 3
	}
	if o.BRange == [2]float64{} {
		o.BRange = [2]float64{0.3, 30}
	}
	if o.LineSpread == nil {
		o.LineSpread = func(string) string { return "" }
	}
	ks, err := p.patches(f, o.LineSpread)
	if err != nil {
		return out, err
	}
	for _, name := range f.Lines {
		k := slices.IndexFunc(ks, func(k *patch) bool { _, ok := k.window[name]; return ok })
		if k < 0 {
			out.Warnings = append(out.Warnings, name+" is not in the fit: no good pixel is left in its window")
			continue
		}
		line, err := p.table.Find(name)
		if err != nil {
			return out, err
		}
		out.Lines = append(out.Lines, line.Name)
		if !slices.Contains(out.Species, line.Carrier()) {
			out.Species = append(out.Species, line.Carrier())
		}
	}
	f, dropped := without(f, out.Species)
	for _, s := range dropped {
		out.Warnings = append(out.Warnings, s+" is not in the fit: none of its lines is left")
	}
	var ws []clouds.Window
	for _, k := range ks {
		ws = append(ws, k.Window)
	}
	var fitter *clouds.Fitter
	var cs []clouds.Cloud
	var totals []clouds.Total // of an automatic fit, with their structure errors
	var held []string         // clouds that are not there
	if f.Auto {
		found, err := search(f, o, ks, ws, out.Species)
		if err != nil {
			return out, err
		}
		out.Result, fitter, cs, totals = found.Result, found.Fitter, found.Model, found.Totals
		out.Solutions = alternatives(found.Solutions)
		if len(cs) == 0 {
			out.Warnings = append(out.Warnings, "no cloud is seen in these lines")
		}
	} else {
		var shared []clouds.Shared
		cs, shared = model(f, out.Species, starts(f, ks, out.Species))
		if fitter, err = clouds.New(clouds.Problem{Windows: ws, Clouds: cs, Shared: shared}, o.grid); err != nil {
			return out, err
		}
		if out.Result, err = fitter.Fit(); err != nil {
			return out, err
		}
		begin := slices.Clone(cs)
		cs = fitter.Clouds(out.Result.X)
		if fitter, cs, held, err = absent(&out.Result, fitter, cs, begin, ws, o.grid); err != nil {
			return out, err
		}
		for _, name := range held {
			out.Warnings = append(out.Warnings, name+" is not seen: its v and b are held at the start, and limits hold for them")
		}
	}
	if len(cs) > 0 {
		var words []string
		if fitter, words, err = refine(&out.Result, fitter, cs, ws, held, o); err != nil {
			return out, err
		}
		out.Warnings = append(out.Warnings, words...)
		structure(&out.Result, totals)
	}
	p.flag(&out, f)
	for i, k := range ks {
		w, err := k.curves(fitter, i, out.Result)
		if err != nil {
			return out, err
		}
		out.Windows = append(out.Windows, w)
	}
	out.warn(f, ks)
	return out, nil
}

// without takes species that have no line left out of a fit.
func without(f config.Fit, species []string) (config.Fit, []string) {
	var dropped []string
	f.Offset = slices.DeleteFunc(slices.Clone(f.Offset), func(s string) bool { return !slices.Contains(species, s) })
	f.Clouds = slices.Clone(f.Clouds)
	for i := range f.Clouds {
		c := &f.Clouds[i]
		for _, ps := range []*config.Parameters{&c.Columns, &c.SpeciesB, &c.SpeciesV} {
			if *ps == nil {
				continue
			}
			left := config.Parameters{}
			for s, q := range *ps {
				if slices.Contains(species, s) && (q.To == "" || slices.Contains(species, q.To)) {
					left[s] = q
				} else if !slices.Contains(dropped, s) && !slices.Contains(species, s) {
					dropped = append(dropped, s)
				}
			}
			*ps = left
		}
	}
	slices.Sort(dropped)
	return f, dropped
}

// search finds the clouds of an automatic fit within the windows of its lines.
func search(f config.Fit, o FitOptions, ks []*patch, ws []clouds.Window, species []string) (clouds.Found, error) {
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, k := range ks {
		for _, l := range k.lines {
			lo, hi = min(lo, k.window[l.Name][0]), max(hi, k.window[l.Name][1])
		}
	}
	s := clouds.Search{
		Windows: ws, Shared: offsets(f), Like: like(f, species, [2]float64{lo, hi}, o.BRange), V: [2]float64{lo, hi}, Max: f.Most, Seed: uint64(o.Seed), Options: o.grid,
	}
	return s.Run()
}

// alternatives are the solutions worth showing: those within ΔBIC < 10 of the best, 8 at most.
func alternatives(all []clouds.Solution) []clouds.Solution {
	var out []clouds.Solution
	for _, s := range all {
		if len(out) < 8 && (len(out) == 0 || s.BIC < all[0].BIC+10) {
			out = append(out, s)
		}
	}
	return out
}
