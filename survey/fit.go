package survey

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"lacuna/abundance"
	"lacuna/budget"
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
}

// Fit fits clouds to the lines of f. What is wrong with f or its data is the user's
// mistake; a fit that does not converge, or rests on a bound, says so in its warnings.
func (p *Pieces) Fit(f config.Fit, o FitOptions) (Fit, error) {
	out, err := p.fit(f, o)
	if err != nil {
		return out, inFit(f.Name, err)
	}
	return out, nil
}

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
		if fitter, err = clouds.New(clouds.Problem{Windows: ws, Clouds: cs, Shared: shared}, clouds.Options{}); err != nil {
			return out, err
		}
		if out.Result, err = fitter.Fit(); err != nil {
			return out, err
		}
		begin := slices.Clone(cs)
		cs = fitter.Clouds(out.Result.X)
		if fitter, cs, held, err = absent(&out.Result, fitter, cs, begin, ws); err != nil {
			return out, err
		}
		for _, name := range held {
			out.Warnings = append(out.Warnings, name+" is not seen: its v and b are held at the start, and limits hold for them")
		}
	}
	if len(cs) > 0 {
		if fitter, err = refine(&out.Result, fitter, cs, ws, held, o.Sigma); err != nil {
			return out, err
		}
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
		Windows: ws, Shared: offsets(f), Like: like(f, species), V: [2]float64{lo, hi}, Max: f.Most, Seed: uint64(o.Seed),
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

// absent finds clouds of which no species is detected and without which χ² is less
// than 9 larger. Their v and b mean nothing: they are held at the starts, one cloud after
// the other, so that of two clouds in the place of one the other remains.
func absent(r *clouds.Result, f *clouds.Fitter, cs, begin []clouds.Cloud, ws []clouds.Window) (*clouds.Fitter, []clouds.Cloud, []string, error) {
	var held []string
	for i := len(cs) - 1; i >= 0; i-- {
		if !unseen(cs[i], *r) || needed(cs, cs[i].Name) {
			continue
		}
		shared := f.SharedAt(r.X)
		with := r.Chi2
		less := slices.Delete(slices.Clone(cs), i, i+1)
		if every(less, cs[i]) || len(less) == 0 { // the others hold all of its species: it can be left out
			p := clouds.Problem{Windows: ws, Clouds: less, Shared: shared}
			if len(less) == 0 {
				p.Shared = nil
			}
			g, err := clouds.New(p, clouds.Options{})
			if err != nil {
				return nil, nil, nil, err
			}
			without, err := g.Fit()
			if err != nil {
				return nil, nil, nil, err
			}
			if without.Chi2-with > 9 {
				continue
			}
		}
		cs = slices.Clone(cs)
		cs[i] = hold(cs[i], begin[i])
		held = append(held, cs[i].Name)
		g, err := clouds.New(clouds.Problem{Windows: ws, Clouds: cs, Shared: shared}, clouds.Options{})
		if err != nil {
			return nil, nil, nil, err
		}
		if *r, err = g.Fit(); err != nil {
			return nil, nil, nil, err
		}
		f, cs = g, g.Clouds(r.X)
	}
	return f, cs, held, nil
}

// every reports whether clouds hold all species of another one.
func every(cs []clouds.Cloud, c clouds.Cloud) bool {
	for _, s := range c.Species {
		if !slices.ContainsFunc(cs, func(o clouds.Cloud) bool {
			return slices.ContainsFunc(o.Species, func(q clouds.Species) bool { return q.Carrier == s.Carrier })
		}) {
			return false
		}
	}
	return true
}

// refine makes the columns of undetected species linear, with limits by Δχ², and the
// errors of the others those of their profile likelihood where a parabola is a poor
// guide.
func refine(r *clouds.Result, f *clouds.Fitter, cs []clouds.Cloud, ws []clouds.Window, held []string, sigma float64) (*clouds.Fitter, error) {
	conditional := r.Conditional
	notes := r.Notes
	if weak(cs, *r, held) {
		g, err := clouds.New(clouds.Problem{Windows: ws, Clouds: cs, Shared: f.SharedAt(r.X)}, clouds.Options{})
		if err != nil {
			return nil, err
		}
		s, err := g.Fit()
		if err != nil {
			return nil, err
		}
		if s.Converged { // else what was there tells more
			if conditional {
				s.Conditional = true
				s.Notes = append(s.Notes, last(notes)...)
			}
			*r, f = s, g
		}
	}
	for i := range r.Clouds {
		for j := range r.Clouds[i].Species {
			s := &r.Clouds[i].Species[j]
			if _, linear := r.Param(r.Clouds[i].Name + ": N(" + s.Carrier + ")"); !linear || !(s.N.X < sigma*s.N.Err()) {
				continue
			}
			n, err := f.UpperLimit(*r, r.Clouds[i].Name, s.Carrier, sigma)
			if err != nil {
				return nil, err
			}
			if !math.IsNaN(n.X) {
				s.LogN = budget.Log10(n)
			}
		}
	}
	if err := f.Asymmetric(r); err != nil {
		return nil, err
	}
	return f, boundB(r, f, sigma)
}

// boundB gives limits of b their likelihood (Δχ² = sigma²) where the fit stopped at the
// lower bound: a parabola says nothing there.
func boundB(r *clouds.Result, f *clouds.Fitter, sigma float64) error {
	for i := range r.Clouds {
		c := &r.Clouds[i]
		for j := range c.Species {
			s := &c.Species[j]
			if !s.B.Is(budget.Upper | budget.AtBound) {
				continue
			}
			for _, name := range []string{c.Name + ": b(" + s.Carrier + ")", c.Name + ": b"} {
				q, ok := r.Param(name)
				if !ok || !q.Free || q.AtBound >= 0 {
					continue
				}
				iv, err := f.Profile(*r, name, sigma*sigma)
				if err != nil {
					return err
				}
				s.B.X, s.B.Conf = iv.Hi, sigma
				if iv.OpenHi {
					s.B.X = math.NaN()
				}
				break
			}
		}
	}
	return nil
}

// last is the note of an automatic fit on its errors, which is its last.
func last(notes []string) []string {
	if len(notes) == 0 {
		return nil
	}
	return notes[len(notes)-1:]
}

// structure gives totals the structure error of those found with them, where a new fit
// or a profile likelihood has taken their place.
func structure(r *clouds.Result, with []clouds.Total) {
	for _, t := range with {
		for i := range r.Totals {
			u := &r.Totals[i]
			d := t.N.ErrBy(budget.Structure)
			if u.Carrier != t.Carrier || !(d > 0) {
				continue
			}
			if u.N.ErrBy(budget.Structure) == 0 {
				u.N = u.N.Add(budget.Shift{Cause: budget.Structure, D: d})
			}
			if u.LogN.ErrBy(budget.Structure) == 0 && u.N.X > 0 && u.LogN.Kind() == "value" {
				dex := d / (u.N.X * math.Ln10)
				u.LogN = u.LogN.Add(budget.Shift{Cause: budget.Structure, D: dex})
			}
		}
	}
}

// flag marks the columns of a species all of whose lines lie on something else: blended,
// in a stellar line, in lines of the air that were not masked.
func (p *Pieces) flag(out *Fit, f config.Fit) {
	for _, s := range out.Species {
		all, any := budget.Blended|budget.InStellar|budget.InTelluric, false
		if f.Telluric != "keep" {
			all &^= budget.InTelluric
		}
		for _, w := range p.widths {
			if slices.Contains(out.Lines, w.Line) && carrier(w) == s {
				all &= w.Flag
				any = true
			}
		}
		if !any {
			continue
		}
		for i := range out.Result.Totals {
			if t := &out.Result.Totals[i]; t.Carrier == s {
				t.N, t.LogN = t.N.With(all), t.LogN.With(all)
			}
		}
	}
}

// curves fills a window with its model.
func (k *patch) curves(f *clouds.Fitter, i int, r clouds.Result) (FitWindow, error) {
	c, err := f.Curves(i, r.X)
	if err != nil {
		return FitWindow{}, err
	}
	seg := k.light.Seg
	out := FitWindow{Name: k.Name, File: seg.Source.File, Order: seg.Order, Used: c.Used, Telluric: k.telluric, Others: k.others}
	for _, l := range k.lines {
		out.Lines = append(out.Lines, FitLine{l.Name, l.Carrier(), l.Wave, k.window[l.Name]})
	}
	for j, x := range c.Wave {
		out.Wave = append(out.Wave, math.Round(x*1e5)/1e5)
		out.Flux = append(out.Flux, five(c.Flux[j]/c.Continuum[j]))
		out.Err = append(out.Err, five(c.Err[j]/c.Continuum[j]))
		out.Model = append(out.Model, five(c.Model[j]/c.Continuum[j]))
		out.Residual = append(out.Residual, five(c.Residual[j]))
	}
	for _, one := range c.Cloud {
		curve := FitCurve{}
		from, to := len(one), 0
		for j, y := range one {
			if 1-y/c.Continuum[j] > curveDepth {
				from, to = min(from, j), j+1
			}
		}
		if from < to {
			curve.From = from
			for j := from; j < to; j++ {
				curve.Flux = append(curve.Flux, five(one[j]/c.Continuum[j]))
			}
		}
		out.Clouds = append(out.Clouds, curve)
	}
	return out, nil
}

// five rounds to five digits; what is no number becomes 0.
func five(x float64) float64 {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return 0
	}
	y, err := strconv.ParseFloat(strconv.FormatFloat(x, 'g', 5, 64), 64)
	if err != nil {
		return 0
	}
	return y
}

// warn gathers what a reader must know.
func (o *Fit) warn(f config.Fit, ks []*patch) {
	r := o.Result
	say := func(format string, a ...any) { o.Warnings = append(o.Warnings, fmt.Sprintf(format, a...)) }
	if !r.Converged {
		say("the fit did not converge: %s", r.Stop)
	}
	if r.DOF > 0 && chance(r.Chi2, r.DOF) < leastGoodness {
		say("the clouds do not explain the lines: χ² = %.1f for %d degrees of freedom", r.Chi2, r.DOF)
	}
	if z := r.Whiteness.WatsonZ; math.Abs(z) > 4 {
		say("residuals of neighbouring pixels are alike (Durbin–Watson %.2f, %.1fσ from chance)", r.Whiteness.DurbinWatson, math.Abs(z))
	}
	for _, c := range r.Clouds {
		narrow := false
		for _, s := range c.Species {
			if s.LogN.Is(budget.AtBound) || s.B.Is(budget.AtBound) {
				say("%s of %s stops at a bound", s.Carrier, c.Name)
			}
			narrow = narrow || s.B.Is(budget.Upper)
		}
		if narrow {
			say("%s is narrower than the instrument resolves: its b is an upper limit", c.Name)
		}
	}
	for _, d := range r.Degenerate {
		if strings.Contains(d.A, ": b") && strings.Contains(d.B, ": log N") { // tables say so
			continue
		}
		say("%s and %s are hardly told apart (correlation %+.2f)", d.A, d.B, d.Corr)
	}
	for _, k := range ks {
		if k.masked > 0 {
			say("%s: %s not used because lines of the air fall there", k.Name, pixels(k.masked))
		}
		if len(k.others) > 0 {
			say("%s: not in the fit, and may absorb there too: %s", k.Name, strings.Join(k.others, ", "))
		}
	}
}

func pixels(n int) string {
	if n == 1 {
		return "1 pixel is"
	}
	return fmt.Sprintf("%d pixels are", n)
}

// fits runs the fits of a sightline.
func (c *chain) fits(res *Result, p *Pieces, s config.Sightline) error {
	spread := func(file string) string {
		for _, sp := range s.Spectra {
			if sp.File == file && sp.LineSpread != "" {
				return c.cfg.Path(sp.LineSpread)
			}
		}
		return ""
	}
	for _, f := range s.Fits {
		fit, err := p.Fit(f, FitOptions{Seed: c.cfg.Seed, LineSpread: spread, Sigma: s.LimitSigma})
		if err != nil {
			if f.Inherited && oops.IsInput(err) {
				res.Warnings = append(res.Warnings, err.Error())
				continue
			}
			return err
		}
		res.Fits = append(res.Fits, fit)
	}
	return nil
}

// worst is the χ² per degree of freedom up to which a fit gives columns.
const worst = 3

// Columns are the totals of a fit over its clouds. Where χ² is larger than chance
// allows, the clouds are not all there is: the errors are then scaled by √(χ²/ν)
// (common practice, no source), and beyond χ²/ν = 3, or without convergence, there are
// none.
func (o Fit) Columns() []abundance.Column {
	r := o.Result
	scale := 1.0
	if r.DOF > 0 && chance(r.Chi2, r.DOF) < leastGoodness {
		scale = math.Sqrt(r.Chi2 / float64(r.DOF))
	}
	if !r.Converged || scale*scale > worst {
		return nil
	}
	var out []abundance.Column
	for _, t := range r.Totals {
		n := t.LogN
		if scale > 1 && n.Kind() == "value" {
			n = n.Add(budget.Shift{Cause: budget.Structure, D: n.Err() * math.Sqrt(scale*scale-1)})
		}
		out = append(out, abundance.Column{Species: t.Carrier, Element: element(t.Carrier), Method: abundance.MethodFit, LogN: n})
	}
	return out
}
