package report

import (
	"fmt"
	"io"
	"strings"

	"lacuna/abundance"
	"lacuna/budget"
)

// DepletionText writes the depletions of one sightline with and without the error
// of the solar scale, and the reason where there is none.
func DepletionText(w io.Writer, name string, ds []abundance.Depletion, h *abundance.Hydrogen, o Options) error {
	p := newPage(o)
	title := name
	if len(ds) > 0 && ds[0].Scale != "" {
		title += " · solar scale " + ds[0].Scale
	}
	p.heading(title)
	p.depletion(ds, h)
	return p.writeTo(w)
}

func (p *page) depletion(ds []abundance.Depletion, h *abundance.Hydrogen) {
	if h != nil {
		p.para("  ", hydrogenText(h), normal)
	}
	g := &grid{indent: 2, align: "lnrnlf", head: []string{"element", "D (dex)", "σ without scale", "12 + log X/H", "from", "remarks"}}
	for _, d := range ds {
		d1, gas := logCell(d.D), logCell(d.Gas)
		noscale := ""
		if d.D.Kind() == "value" {
			noscale = printNumber(budget.Number{X: 0, Shifts: []budget.Shift{{Cause: budget.Photon, D: d.D.Without(budget.Solar)}}}, 1, 2).up
		}
		var note []string
		t := normal
		if d.Refused != "" {
			d1, gas, noscale = plainCell("–"), cell{}, ""
			note, t = append(note, d.Refused), warn
		}
		if words := (d.D.Flag &^ (budget.Upper | budget.Lower | budget.Interval)).Words(); len(words) > 0 && d.Refused == "" {
			note = append(note, words...)
		}
		g.add(plainCell(d.Element), d1, plainCell(noscale), gas, plainCell(strings.Join(d.Species, " + ")),
			cell{strings.Join(append(note, d.Notes...), "; "), t})
	}
	p.grid(g)
}

func hydrogenText(h *abundance.Hydrogen) string {
	s := "log N(H) = " + printLog(h.H).text()
	switch k := h.H.Kind(); k {
	case "upper", "lower":
		s = "log N(H) " + printLog(h.H).text()
	case "none":
		s = "log N(H) is not known"
	case "interval":
		s += " (an interval)"
	}
	var parts []string
	for _, part := range []struct {
		name string
		n    budget.Number
	}{{"log N(H I)", h.HI}, {"log N(H₂)", h.H2}} {
		if t := printLog(part.n); t.kind == "upper" || t.kind == "lower" {
			parts = append(parts, part.name+" "+t.text())
		} else if t.kind != "none" && part.n.X != 0 {
			parts = append(parts, part.name+" = "+t.text())
		}
	}
	for _, t := range []string{h.Route, h.Source} {
		if t != "" {
			parts = append(parts, t)
		}
	}
	if len(parts) > 0 {
		s += fmt.Sprintf(" (%s)", strings.Join(parts, "; "))
	}
	return strings.Join(append([]string{s}, h.Notes...), "; ")
}
