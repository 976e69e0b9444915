package report

import (
	"fmt"
	"io"
	"strings"

	"lacuna/abundance"
	"lacuna/budget"
	"lacuna/internal/table"
	"lacuna/measure"
	"lacuna/spectrum/frame"
	"lacuna/survey"
)

// Summary writes what was found on each sightline: lines with widths or limits
// and the columns they give, the adopted columns with the rule that chose them,
// hydrogen, depletions, and warnings in words.
func Summary(w io.Writer, rs []survey.Record, o Options) error {
	p := newPage(o)
	done := 0
	for i, r := range rs {
		if i > 0 {
			p.blank()
		}
		if r.Status == failed {
			p.heading(r.Name)
			p.para("  failed: ", r.Error, fail)
			continue
		}
		done++
		p.sightline(r)
	}
	if len(rs) > 0 {
		p.blank()
	}
	p.para("", fmt.Sprintf("%s: %d done, %d failed. Errors 1σ, windows in km/s, N in cm⁻², N_a by apparent optical depth.",
		count(len(rs), "sightline"), done, len(rs)-done), faint)
	return p.writeTo(w)
}

func (p *page) sightline(r survey.Record) {
	res := r.Result
	title := []string{r.Name}
	if res.Frame != frame.Unknown {
		title = append(title, strings.ToLower(velocityLabel(res.Frame)[:1])+velocityLabel(res.Frame)[1:])
	}
	if res.FSet != "" && res.FSet != "default" {
		title = append(title, "f set "+res.FSet)
	}
	if res.Scale != "" {
		title = append(title, "solar scale "+res.Scale)
	}
	p.heading(strings.Join(title, " · "))
	for _, s := range res.Spectra {
		p.para("  ", spectrumText(s), faint)
	}
	if len(res.Widths) > 0 {
		p.blank()
		p.widths(res.Widths)
	}
	for _, d := range res.Doublets {
		p.para("  ", doubletText(d), normal)
	}
	if len(res.Growth) > 0 {
		p.blank()
		p.growth(res.Growth)
	}
	if len(res.Fits) > 0 {
		p.blank()
		p.clouds(res.Fits)
	}
	if len(res.Adopted) > 0 {
		p.blank()
		p.adopted(res.Adopted)
		p.verdicts(res.Verdicts)
	}
	if res.Hydrogen != nil || len(res.Depletions) > 0 {
		p.blank()
		p.depletion(res.Depletions, res.Hydrogen)
	}
	if len(res.Failures) > 0 {
		p.blank()
		for _, s := range res.Failures {
			p.para("  ! ", "not measured: "+s, fail)
		}
	}
	if len(res.Warnings) > 0 {
		p.blank()
		for _, s := range res.Warnings {
			p.para("  ! ", s, warn)
		}
	}
}

func spectrumText(s survey.SpectrumInfo) string {
	t := fmt.Sprintf("%s: %s, %s, %s", s.File, s.Layout, count(s.Orders, "order"), by(s.Medium, s.MediumBy))
	t += ", " + by(frameWord(frame.Kind(s.Frame)), s.FrameBy)
	for _, a := range s.Shifts {
		state := "applied"
		if a.Done {
			state = "already in the file"
		}
		t += fmt.Sprintf(", %s km/s to %s %s (%s)", minus(fmt.Sprintf("%+.3f", a.V)), frameWord(a.To), state, a.Keyword)
	}
	if s.R > 0 {
		t += ", R " + by(number(s.R, 0), s.RBy)
	}
	for _, n := range s.Notes {
		t += "; " + n
	}
	return t
}

// by adds who says so, where it is known.
func by(what, who string) string {
	if what == "" {
		what = "not known"
	}
	if who == "" {
		return what
	}
	return what + " (" + who + ")"
}

// count puts a number before a noun: "1 order", "3 orders".
func count(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return fmt.Sprintf("%d %ss", n, noun)
}

func (p *page) widths(ws []measure.Width) {
	g := &grid{indent: 2, align: "lnrlnnf", head: []string{"line", "W (mÅ)", "S/N", "window", "log N weak", "log N_a", "remarks"}}
	times := map[string]int{}
	for _, w := range ws {
		times[w.Line]++
	}
	for _, w := range ws {
		name := w.Line
		if times[w.Line] > 1 {
			name += fmt.Sprintf(" #%d", w.Order)
		}
		width, tone := cell{text: printWidth(w).text()}, normal
		if !w.Detected {
			tone = warn
			if w.Limit > 0 && !marginal(w) {
				width = cell{"< " + printWidthLimit(w), warn}
			}
		}
		weak, aod := logCell(budget.Log10(w.Linear)), logCell(budget.Log10(w.AOD))
		if !w.Detected {
			aod = cell{}
		}
		g.add(cell{name, normal}, width, plainCell(number(w.SNPixel, 0)), plainCell(rangeText(w.Window)), weak, aod, cell{remarks(w), remarkTone(w, tone)})
	}
	p.grid(g)
}

func rangeText(w [2]float64) string {
	return number(w[0], 0) + " … " + number(w[1], 0)
}

func logCell(n budget.Number) cell {
	s := printLog(n)
	c := cell{text: s.text()}
	switch s.kind {
	case "none":
		c.text = ""
	case "value":
	default:
		c.tone = warn
	}
	return c
}

// remarks is what a reader must know about a width, shortest first.
func remarks(w measure.Width) string {
	var parts []string
	if !w.Detected && w.Limit > 0 {
		first := "W = " + printWidth(w).text() + " mÅ"
		if marginal(w) {
			first = "< " + printWidthLimit(w) + " mÅ"
		}
		parts = append(parts, fmt.Sprintf("%s; %sσ limit over %s km/s with b = %s km/s", first, number(w.LimitSigma, decimalsOf(w.LimitSigma)),
			number(w.LimitWidth, decimalsOf(w.LimitWidth)), number(w.LimitB, decimalsOf(w.LimitB))))
		if in := w.Inside; in != nil {
			v, e := table.Round(in.W*mA, in.Err*mA)
			parts = append(parts, fmt.Sprintf("between %s and %s km/s W = %s ± %s mÅ, which sets the limit: narrow the window",
				number(in.Window[0], 1), number(in.Window[1], 1), minus(v), e))
		}
	}
	f := w.Flag | w.W.Flag
	parts = append(parts, (f &^ (budget.Upper | budget.Lower | budget.Interval | budget.Blended)).Words()...)
	if w.Saturated != "" && f&budget.Saturated == 0 {
		parts = append(parts, "saturated")
	}
	if len(w.Blends) > 0 {
		parts = append(parts, "blend: "+strings.Join(blendNames(w.Blends), ", "))
	} else if f&budget.Blended != 0 {
		parts = append(parts, "blended")
	}
	return strings.Join(parts, "; ")
}

func remarkTone(w measure.Width, t tone) tone {
	if w.Saturated != "" || len(w.Blends) > 0 || (w.Flag|w.W.Flag) != 0 {
		return warn
	}
	return t
}

func doubletText(d measure.Doublet) string {
	name := d.Species
	if d.Weak != "" && d.Strong != "" {
		name = d.Weak + " against " + strings.TrimPrefix(d.Strong, d.Species+" ")
	}
	if d.Delta.Kind() == "none" {
		return name + ": not compared: " + d.Refused
	}
	s := fmt.Sprintf("%s: Δ log N_a = %s", name, printLog(d.Delta).text())
	if d.Refused != "" {
		return s + "; not corrected for saturation: " + d.Refused
	}
	if c := printLog(d.Corrected); c.kind != "none" {
		s += "; log N corrected for saturation: " + c.text()
	}
	return s
}

func (p *page) adopted(cols []abundance.Column) {
	g := &grid{indent: 2, align: "lnlf", head: []string{"adopted", "log N", "by", "because"}}
	for _, c := range cols {
		how := c.Method
		if c.Line != "" {
			how += " (" + withoutSpecies(c.Line, c.Species) + ")"
		}
		why := c.Rule
		if words := (c.LogN.Flag &^ (budget.Upper | budget.Lower | budget.Interval)).Words(); len(words) > 0 {
			why += " [" + strings.Join(words, ", ") + "]"
		}
		g.add(plainCell(c.Species), logCell(c.LogN), plainCell(how), plainCell(strings.TrimSpace(why)))
	}
	p.grid(g)
}

// withoutSpecies is a line's name without the species that stands beside it, nor
// the species' level ("CN N=0", "CN 3874.61").
func withoutSpecies(line, species string) string {
	if s, ok := strings.CutPrefix(line, species+" "); ok {
		return s
	}
	word, _, _ := strings.Cut(species, " ")
	if s, ok := strings.CutPrefix(line, word+" "); ok && strings.Contains(species, "=") {
		return s
	}
	return line
}
