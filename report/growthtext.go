package report

import (
	"fmt"
	"io"
	"slices"
	"strings"

	"lacuna/cog"
	"lacuna/internal/table"
	"lacuna/survey"
)

// fewSightlines is up to how many sightlines of a batch show each line as well.
const fewSightlines = 3

// GrowthText writes the curves of growth of a batch: N and b of each, and for a
// few sightlines each line against the fitted curve.
func GrowthText(w io.Writer, rs []survey.Record, o Options) error {
	p := newPage(o)
	if len(rs) > fewSightlines {
		p.growthBatch(rs)
	} else {
		for i, r := range rs {
			if i > 0 {
				p.blank()
			}
			p.heading(r.Name)
			if r.Status == failed {
				p.para("  failed: ", r.Error, fail)
				continue
			}
			p.growth(r.Result.Growth)
			for _, g := range r.Result.Growth {
				p.growthLines(g)
			}
		}
	}
	if len(rs) > 0 {
		p.blank()
	}
	p.para("", "Errors 1σ (Δχ² = 1). Correction: log N less that of the weak-line relation, dex.", faint)
	return p.writeTo(w)
}

// growthBatch is one row for each column of each sightline.
func (p *page) growthBatch(rs []survey.Record) {
	g := &grid{align: "llnnlf", head: []string{"sightline", "species", "log N", "b (km/s)", "χ² / dof", "remarks"}}
	for _, r := range rs {
		if r.Status == failed {
			g.add(plainCell(r.Name), plainCell(""), plainCell("–"), plainCell(""), plainCell(""), cell{"failed: " + r.Error, fail})
		}
		for _, c := range r.Result.Growth {
			for i, row := range growthRows(c) {
				name := ""
				if i == 0 {
					name = r.Name
				}
				g.add(append([]cell{plainCell(name)}, row...)...)
			}
		}
	}
	p.grid(g)
}

// growthRows returns a row for each level: species, log N, b, χ², remarks.
func growthRows(r cog.Result) [][]cell {
	var out [][]cell
	for i, n := range r.LogN {
		name := value(r.Levels, i)
		if name == "" {
			name = r.Species
		}
		b, chi, note := cell{}, "", ""
		if i == 0 {
			b = cell{text: printNumber(r.B, 1, 2).text()}
			if k := r.B.Kind(); k != "value" {
				b.tone = warn
			}
			chi = fmt.Sprintf("%.1f / %d", r.Chi2, r.DOF)
			if !finite(r.Chi2) {
				chi = ""
			}
			note = growthRemarks(r)
		}
		out = append(out, []cell{plainCell(name), logCell(n), b, plainCell(chi), plainCell(note)})
	}
	return out
}

func (p *page) growth(gs []cog.Result) {
	g := &grid{indent: 2, align: "lnnlf", head: []string{"growth curve", "log N", "b (km/s)", "χ² / dof", "remarks"}}
	for _, r := range gs {
		for _, row := range growthRows(r) {
			g.add(row...)
		}
	}
	p.grid(g)
}

func growthRemarks(r cog.Result) string {
	parts := []string{}
	if len(r.Lines) > 0 {
		parts = append(parts, count(len(r.Lines), "line"))
	}
	parts = append(parts, openContours(r.Contours)...)
	if r.Stop != "" && r.Stop != "converged" {
		parts = append(parts, "stopped: "+r.Stop)
	}
	return strings.Join(append(parts, r.Notes...), "; ")
}

// openContours says which contours do not close, each level once: a level may
// have several pieces.
func openContours(cs []cog.Contour) []string {
	var open []string // directions
	levels := map[string][]string{}
	for _, c := range cs {
		level := fmt.Sprintf("%.2f", c.Delta)
		if c.Open == "" || slices.Contains(levels[c.Open], level) {
			continue
		}
		if levels[c.Open] == nil {
			open = append(open, c.Open)
		}
		levels[c.Open] = append(levels[c.Open], level)
	}
	for i, o := range open {
		verb := "stay"
		if len(levels[o]) == 1 {
			verb = "stays"
		}
		open[i] = fmt.Sprintf("Δχ² = %s %s open in %s", strings.Join(levels[o], " and "), verb, o)
	}
	return open
}

// growthLines is each line of one fit against the curve.
func (p *page) growthLines(r cog.Result) {
	if len(r.Lines) == 0 {
		return
	}
	p.blank()
	g := &grid{indent: 2, align: "lnrrrrf", head: []string{"line", "W (mÅ)", "fitted", "ΔW/σ", "τ₀", "correction", "remarks"}}
	for _, l := range r.Lines {
		width, pull, note := cell{text: "–"}, "", ""
		digits := widthDecimals(l.Model * mA)
		switch {
		case l.Limit:
			width = cell{"< " + number(l.W*mA, widthDecimals(l.W*mA)), warn}
			note = "given as a limit"
		case finite(l.W) && l.Err > 0:
			v, e := table.Round(l.W*mA, l.Err*mA)
			digits = errorDecimals(l.Err*mA, l.Err*mA)
			width.text = minus(v + " ± " + e)
			pull = signed((l.W-l.Model)/l.Err, 1)
		}
		g.add(plainCell(l.Line), width, plainCell(fixed(l.Model*mA, digits)), plainCell(pull), plainCell(fixed(l.Tau0, 2)),
			plainCell(signed(l.Correction, 2)), plainCell(note))
	}
	p.grid(g)
}

// fixed prints a number, and nothing where it is not finite.
func fixed(x float64, d int) string {
	if !finite(x) {
		return ""
	}
	return number(x, d)
}

// signed is fixed with its sign always.
func signed(x float64, d int) string {
	s := fixed(x, d)
	if s == "" || strings.HasPrefix(s, "−") {
		return s
	}
	return "+" + s
}
