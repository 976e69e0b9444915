package spectrum

import (
	"fmt"
	"io"
	"strconv"
	"strings"

	"lacuna/internal/table"
)

// writeText writes one row a pixel, with a column order where there are several
// segments.
func (s *Spectrum) writeText(w io.Writer, extra []Card, ecsv bool) error {
	unit := standardUnit(s.Segments[0].Unit)
	errors, lower, continuum := s.has()
	t := table.New()
	if len(s.Segments) > 1 {
		t.Cols = append(t.Cols, table.Column{Name: "order", Type: table.Integer})
	}
	t.Cols = append(t.Cols, table.Column{Name: "wave", Unit: "Angstrom", Type: table.Real}, table.Column{Name: "flux", Unit: unit, Type: table.Real})
	if errors {
		t.Cols = append(t.Cols, table.Column{Name: "err", Unit: unit, Type: table.Real})
	}
	if lower {
		t.Cols = append(t.Cols, table.Column{Name: "err_low", Unit: unit, Type: table.Real, Description: "err is then the upper one"})
	}
	t.Cols = append(t.Cols, table.Column{Name: "mask", Type: table.Integer, Description: "0 is good"})
	if continuum {
		t.Cols = append(t.Cols, table.Column{Name: "continuum", Unit: unit, Type: table.Real})
	}
	for k := range s.Segments {
		g := &s.Segments[k]
		for i := range g.Wave {
			var row []table.Cell
			if len(s.Segments) > 1 {
				row = append(row, table.Int(g.Order))
			}
			row = append(row, table.Exact(g.Wave[i]), table.Exact(g.Flux[i]))
			if errors {
				row = append(row, table.Exact(value(g.Err, i)))
			}
			if lower {
				row = append(row, table.Exact(value(g.ErrLow, i)))
			}
			bad := 0
			if g.Mask[i].Bad() {
				bad = 1
			}
			row = append(row, table.Int(bad))
			if continuum {
				row = append(row, table.Exact(value(g.Continuum, i)))
			}
			t.AddRow(row...)
		}
	}
	meta := s.meta(extra)
	if ecsv {
		t.Meta = meta
		return t.WriteECSV(w)
	}
	for i := range t.Cols { // CSV has no place for units but the name
		if t.Cols[i].Name == "wave" {
			t.Cols[i].Name = "wave_A"
		}
	}
	for _, kv := range meta {
		line := fmt.Sprintf("# %s: %v\n", kv.Key, kv.Value)
		if strings.ContainsAny(line[:len(line)-1], "\n\r") {
			return fmt.Errorf("writing CSV: %s has more than one line", kv.Key)
		}
		if _, err := io.WriteString(w, line); err != nil {
			return err
		}
	}
	return t.WriteCSV(w)
}

// meta is what a text header says, in the keys that the reader knows.
func (s *Spectrum) meta(extra []Card) []table.KV {
	g := &s.Segments[0]
	var out []table.KV
	add := func(key, value string) {
		if value != "" {
			out = append(out, table.KV{Key: key, Value: value})
		}
	}
	exact := func(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }
	add("object", s.Object)
	coord := s.Coord
	if coord == nil {
		coord = g.Coord
	}
	if coord != nil {
		add("ra", exact(coord.RA))
		add("dec", exact(coord.Dec))
	}
	add("medium", string(g.Medium))
	add("frame", string(g.Frame))
	if a, ok := g.correction(); ok {
		add("correction", exact(a.V))
		add("correction_to", string(a.To))
	}
	if g.Resolution > 0 {
		add("resolution", exact(g.Resolution))
	}
	if g.Normalised {
		add("normalised", "true")
	}
	add("flux_unit", standardUnit(g.Unit))
	for _, c := range extra {
		if c.Value != nil {
			add(strings.ToLower(c.Key), fmt.Sprint(c.Value))
		}
	}
	return out
}
