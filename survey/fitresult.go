package survey

import (
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
		more := ""
		if r.Chi2 > worst*float64(r.DOF) {
			more = ": its columns are not used"
		}
		say("the clouds do not explain the lines: χ² = %.1f for %d degrees of freedom%s", r.Chi2, r.DOF, more)
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
	for _, t := range r.Totals {
		if vaguely(t.LogN) {
			say("the column of %s is hardly constrained and not used: add a weaker line, or bound b", t.Carrier)
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
		fit, err := p.Fit(f, FitOptions{Seed: c.cfg.Seed, LineSpread: spread, Sigma: s.LimitSigma, BRange: s.BRange})
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

const (
	worst = 2   // χ² per degree of freedom up to which a fit gives columns
	vague = 0.5 // dex, error above which a total is no column
)

// vaguely reports whether a total is hardly constrained.
func vaguely(n budget.Number) bool {
	return n.Kind() == "value" && math.Min(n.ErrUp(), n.ErrLo()) > vague
}

// Columns are the totals of a fit over its clouds. Where χ² is larger than chance
// allows, the clouds are not all there is: the errors are then scaled by √(χ²/ν)
// (common practice, no source), and beyond χ²/ν = 2, or without convergence, there are
// none. Nor is there a column that is not known to half a dex on either side.
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
		if vaguely(n) {
			continue
		}
		if scale > 1 && n.Kind() == "value" {
			n = n.Add(budget.Shift{Cause: budget.Structure, D: n.Err() * math.Sqrt(scale*scale-1)})
		}
		out = append(out, abundance.Column{Species: t.Carrier, Element: element(t.Carrier), Method: abundance.MethodFit, LogN: n})
	}
	return out
}
