package survey

import (
	"fmt"
	"slices"

	"lacuna/atomic"
)

// rows lists the rows of data tables that a result rests on.
func (c *chain) rows(res Result) []Row {
	var out []Row
	add := func(r Row) {
		if !slices.Contains(out, r) {
			out = append(out, r)
		}
	}
	for _, w := range res.Widths {
		l, err := c.table.Find(w.Line)
		if err != nil {
			continue // measured with it, so it is there
		}
		add(Row{"lines", l.Name + " f", fmt.Sprintf("%g", l.F), cite(l.FSource, l.File), string(l.FStatus)})
		add(Row{"lines", l.Name + " wavelength", fmt.Sprintf("%.4f Å vacuum", l.Wave), cite(l.WaveSource, l.File), string(l.WaveStatus)})
		if n := len(l.Parts); n > 0 {
			add(Row{"structure", l.Name, fmt.Sprintf("%d parts", n), "hyperfine and isotope structure: see structure.csv", string(l.Parts[0].Status)})
		}
	}
	for _, d := range res.Depletions {
		if d.Refused != "" {
			continue
		}
		if s, err := atomic.Solar(res.Scale, d.Element); err == nil {
			add(Row{"solar", res.Scale + " " + d.Element, fmt.Sprintf("%.2f ± %.2f (%s)", s.LogEps, s.Err, s.Kind), s.Source, string(s.Status)})
		}
	}
	return out
}

func cite(source, file string) string {
	if file != "" {
		return source + " (user's file " + file + ")"
	}
	return source
}
