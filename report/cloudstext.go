package report

import (
	"fmt"
	"io"
	"math"
	"strings"

	"lacuna/abundance"
	"lacuna/budget"
	"lacuna/survey"
	"lacuna/voigt/clouds"
)

// clouds writes the fits of a sightline: a row for each species of each cloud, totals,
// and warnings.
func (p *page) clouds(fits []survey.Fit) {
	for i, f := range fits {
		if i > 0 {
			p.blank()
		}
		p.para("  ", fitHead(f), strong)
		p.grid(cloudGrid(f))
		for _, s := range f.Warnings {
			p.para("  ! ", s, warn)
		}
	}
}

// fitHead says what was fitted and how well.
func fitHead(f survey.Fit) string {
	r := f.Result
	n := count(len(r.Clouds), "cloud")
	if f.Auto {
		n += ", found automatically"
	}
	s := fmt.Sprintf("fit of %s: %s; χ² %s for %d, BIC %s", f.Name, n, number(r.Chi2, 1), r.DOF, number(r.BIC, 1))
	if !r.Converged {
		s += "; not converged"
	}
	return s
}

func cloudGrid(f survey.Fit) *grid {
	r := f.Result
	g := &grid{indent: 2, align: "llnnnnf", head: []string{"cloud", "species", "v (km/s)", "b (km/s)", "log N", "τ₀", "remarks"}}
	for i, c := range r.Clouds {
		for j, s := range c.Species {
			name := ""
			if j == 0 {
				name = fmt.Sprintf("%d", i+1)
				if c.Name != "" && c.Name != fmt.Sprintf("cloud %d", i+1) {
					name += " " + c.Name
				}
			}
			v, b := plainCell(printNumber(s.V, 1, 2).text()), limitCell(printNumber(s.B, 1, 2))
			if j > 0 { // what is shared stands once
				if q := c.Species[j-1]; q.V.X == s.V.X && q.V.Err() == s.V.Err() {
					v = cell{}
				}
				if q := c.Species[j-1]; q.B.X == s.B.X && q.B.Err() == s.B.Err() {
					b = cell{}
				}
			}
			g.add(plainCell(name), plainCell(s.Carrier), v, b, logCell(s.LogN),
				plainCell(tauText(s.Tau0)), cell{cloudRemarks(c, s), warn})
		}
	}
	for _, t := range r.Totals {
		if len(r.Clouds) < 2 {
			break
		}
		g.add(plainCell("all"), plainCell(t.Carrier), plainCell(""), plainCell(""), logCell(t.LogN), plainCell(""), plainCell(totalRemarks(t)))
	}
	return g
}

func tauText(x float64) string {
	if !finite(x) {
		return ""
	}
	if x < 10 {
		return number(x, 2)
	}
	return number(x, 0)
}

func limitCell(p printed) cell {
	c := plainCell(p.text())
	if p.kind == "upper" || p.kind == "lower" {
		c.tone = warn
	}
	return c
}

func cloudRemarks(c clouds.CloudFit, s clouds.SpeciesFit) string {
	var parts []string
	if f := notFitted(s); len(f) > 0 {
		parts = append(parts, strings.ReplaceAll(strings.Join(f, " and "), "logN", "log N")+" fixed")
	}
	if c.T != nil && c.Turb != nil {
		parts = append(parts, "T "+paramText(*c.T, 0, " K")+", turbulence "+paramText(*c.Turb, 2, " km/s"))
	}
	parts = append(parts, ((s.V.Flag | s.B.Flag | s.LogN.Flag) &^ (budget.Upper | budget.Lower | budget.Interval)).Words()...)
	if s.LogN.Is(budget.Upper) {
		if s.LogN.Conf > 0 {
			parts = append(parts, number(s.LogN.Conf, decimalsOf(s.LogN.Conf))+"σ limit")
		}
		parts = append(parts, linearText(s.N))
	}
	if math.Abs(s.CorrNB) > 0.9 {
		parts = append(parts, "log N and b trade against each other ("+minus(fmt.Sprintf("%+.2f", s.CorrNB))+")")
	}
	return strings.Join(parts, "; ")
}

func paramText(p clouds.Param, decimals int, unit string) string {
	if p.Undetermined {
		return "not constrained"
	}
	n := budget.Number{X: p.X}
	if p.Err > 0 {
		n.Shifts = []budget.Shift{{Cause: budget.Photon, D: p.Err}}
	}
	return printNumber(n, 1, decimals).text() + unit
}

// linearText is a column as N ± σ, in the power of ten of its error.
func linearText(n budget.Number) string {
	if n.Behind != nil {
		n = *n.Behind
	}
	n = plainValue(n)
	e := n.Err()
	if !(e > 0) || !finite(n.X, e) {
		return ""
	}
	p := math.Floor(math.Log10(math.Max(math.Abs(n.X), e)))
	return fmt.Sprintf("N = (%s)·10^%.0f", printNumber(n, math.Pow(10, -p), 2).text(), p)
}

// totalRemarks says by how much errors that are taken for independent would be off.
func totalRemarks(t clouds.Total) string {
	var parts []string
	if e := t.N.Without(budget.FValue, budget.Structure); t.Naive > 0 && e > 0 && (e/t.Naive < 0.7 || e/t.Naive > 1.4) {
		parts = append(parts, fmt.Sprintf("its error is %s of what independent clouds would give", percent(e/t.Naive)))
	}
	if d := t.LogN.ErrBy(budget.Structure); d > 0 {
		parts = append(parts, fmt.Sprintf("of its error %s dex by the number of clouds", number(d, 3)))
	}
	return strings.Join(parts, "; ")
}

func percent(x float64) string { return number(100*x, 0) + " %" }

// verdicts says where methods differ, and in one sentence where they agree.
func (p *page) verdicts(vs []abundance.Verdict) {
	var agree []string
	for _, v := range vs {
		if v.Agree {
			agree = append(agree, v.Species)
			continue
		}
		p.para("  ! ", v.Text(), warn)
	}
	if len(agree) > 0 {
		p.para("  ", "methods agree within 2σ: "+strings.Join(agree, ", "), normal)
	}
}

// FitText writes everything about the fits of one record: clouds and totals, the
// windows with their residuals, and of automatic fits what else was tried.
func FitText(w io.Writer, r survey.Record, o Options) error {
	p := newPage(o)
	p.heading(strings.Join([]string{r.Name, strings.ToLower(velocityLabel(r.Result.Frame)[:1]) + velocityLabel(r.Result.Frame)[1:]}, " · "))
	for i, f := range r.Result.Fits {
		if i > 0 {
			p.blank()
		}
		p.clouds([]survey.Fit{f})
		p.blank()
		p.fitWindows(f)
		p.solutions(f)
	}
	if len(r.Result.Columns) > 0 {
		p.blank()
		p.methods(r.Result.Columns)
	}
	p.verdicts(r.Result.Verdicts)
	p.blank()
	p.para("", "Errors 1σ, all causes; a column of two lines or clouds has the error of their sum, not of independent parts.", faint)
	return p.writeTo(w)
}

func (p *page) fitWindows(f survey.Fit) {
	g := &grid{indent: 2, align: "lrrnnrf", head: []string{"window", "pixels", "χ²", "zero level", "FWHM (km/s)", "D–W", ""}}
	for _, w := range f.Result.Windows {
		zero := budget.Number{X: w.Zero}
		if w.ZeroErr > 0 {
			zero.Shifts = []budget.Shift{{Cause: budget.ZeroLevel, D: w.ZeroErr}}
		}
		remark := ""
		if z := w.Whiteness.WatsonZ; math.Abs(z) > 4 {
			remark = "neighbouring residuals are alike"
		}
		g.add(plainCell(w.Name), plainCell(fmt.Sprint(w.Pixels)), plainCell(number(w.Chi2, 1)), plainCell(printNumber(zero, 1, 3).text()),
			plainCell(number(w.FWHM, 2)), plainCell(number(w.Whiteness.DurbinWatson, 2)), cell{remark, warn})
	}
	p.grid(g)
}

func (p *page) solutions(f survey.Fit) {
	if len(f.Solutions) < 2 {
		return
	}
	p.blank()
	g := &grid{indent: 2, align: "rnrrf", head: []string{"clouds", "ΔBIC", "χ²", "AICc", "at (km/s)"}}
	for _, s := range f.Solutions {
		var vs []string
		for _, v := range s.V {
			vs = append(vs, number(v, 1))
		}
		at := strings.Join(vs, ", ")
		if s.Refused != "" {
			at += "; refused: " + s.Refused
		}
		aicc := ""
		if s.AICc > 0 {
			aicc = number(s.AICc, 1)
		}
		g.add(plainCell(fmt.Sprint(s.Number)), plainCell(number(s.BIC-f.Solutions[0].BIC, 1)), plainCell(number(s.Chi2, 1)), plainCell(aicc), plainCell(minus(at)))
	}
	p.grid(g)
}

// methods puts the columns of each species by all methods side by side.
func (p *page) methods(cols []abundance.Column) {
	g := &grid{indent: 2, align: "llnl", head: []string{"species", "method", "log N", ""}}
	last := ""
	for _, species := range speciesIn(cols) {
		for _, c := range cols {
			if c.Species != species {
				continue
			}
			name := species
			if species == last {
				name = ""
			}
			last = species
			g.add(plainCell(name), plainCell(c.Method), logCell(c.LogN), plainCell(withoutSpecies(c.Line, c.Species)))
		}
	}
	p.grid(g)
}

func speciesIn(cols []abundance.Column) []string {
	var out []string
	seen := map[string]bool{}
	for _, c := range cols {
		if !seen[c.Species] {
			seen[c.Species] = true
			out = append(out, c.Species)
		}
	}
	return out
}
