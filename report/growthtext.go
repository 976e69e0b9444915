package report

import (
	"fmt"
	"io"
	"strings"

	"lacuna/cog"
	"lacuna/internal/table"
)

// GrowthText writes the curves of growth of one sightline: N and b, and each line
// against the fitted curve.
func GrowthText(w io.Writer, sightline string, gs []cog.Result, o Options) error {
	p := newPage(o)
	p.heading(sightline)
	p.growth(gs)
	for _, r := range gs {
		if len(r.Lines) == 0 {
			continue
		}
		p.blank()
		g := &grid{indent: 2, align: "lnrrrrf", head: []string{"line", "W (mÅ)", "fitted", "ΔW/σ", "τ₀", "correction", "remarks"}}
		for _, l := range r.Lines {
			width := cell{text: "–"}
			pull, note := "", ""
			switch {
			case l.Limit:
				width = cell{"< " + number(l.W*mA, widthDecimals(l.W*mA)), warn}
				note = "given as a limit"
			case finite(l.W) && l.Err > 0:
				v, e := table.Round(l.W*mA, l.Err*mA)
				width.text = minus(v + " ± " + e)
				pull = minus(fmt.Sprintf("%+.1f", (l.W-l.Model)/l.Err))
			}
			g.add(plainCell(l.Line), width, plainCell(number(l.Model*mA, 1)), plainCell(pull), plainCell(number(l.Tau0, 2)),
				plainCell(correctionText(l.Correction)), plainCell(note))
		}
		p.grid(g)
	}
	p.blank()
	p.para("  ", "Errors 1σ (Δχ² = 1). Correction: log N less that of the weak-line relation, dex.", faint)
	return p.writeTo(w)
}

func correctionText(c float64) string {
	if !finite(c) {
		return ""
	}
	return strings.TrimSpace(minus(fmt.Sprintf("%+.2f", c)))
}
