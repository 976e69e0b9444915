package config

import (
	"strings"

	"lacuna/internal/table"
)

// growthTable makes sightlines of a table of widths, in order of first appearance.
func (l *loader) growthTable(g *Growth) []string {
	if g.Table == "" {
		return nil
	}
	t, err := table.Read(join(g.Dir, g.Table))
	if err != nil {
		l.add(err)
		return nil
	}
	cols := map[string]*table.Column{}
	// In the table of a survey the star is the object, and what was not detected
	// keeps its measured width beside the limit.
	own := t.Has("W_meas_mA") && t.Has("W_meas_err_mA")
	for _, name := range []string{"sightline", "line", "W_mA", "W_err_mA", "W_kind"} {
		c, err := t.Col(name)
		switch {
		case name == "sightline" && err != nil && t.Has("object"):
			c, err = t.Col("object")
		case own && (name == "W_mA" || name == "W_err_mA"):
			c, err = t.Col(strings.Replace(name, "W_", "W_meas_", 1))
		}
		if err == nil {
			cols[name] = c
			continue
		}
		if name != "W_kind" {
			l.add(err)
			continue
		}
		for _, c := range t.Cols { // a slip of the pen would turn limits into values
			if slip(strings.ToLower(c.Name), "w_kind") {
				l.bad(at(show(g.Table), "column "+c.Name), "name it W_kind, or give it a name less like it", "is this W_kind?")
			}
		}
	}
	if len(l.errs) > 0 {
		return nil
	}
	var places []string
	index := map[string]int{}
	for i := range t.Rows() {
		where := g.Table + " " + t.Where(i)
		cell := func(col string) map[string]any {
			if c := cols[col]; c != nil {
				if s, ok := t.String(c, i); ok && s != "" {
					return map[string]any{col: s}
				}
			}
			return nil
		}
		name, _ := cell("sightline")["sightline"].(string)
		line, _ := cell("line")["line"].(string)
		if name == "" || line == "" {
			l.bad(where, "fill in sightline and line", "a row without a name")
			continue
		}
		j, ok := index[name]
		if !ok {
			j = len(g.Sightlines)
			index[name] = j
			x := GrowthSightline{BRange: g.BRange, by: origins{"b_range": "growth"}}
			l.fill(where, "growth.sightline", map[string]any{"name": name}, &x, x.by, "catalogue")
			g.Sightlines = append(g.Sightlines, x)
			places = append(places, where)
		}
		m := map[string]any{"line": line}
		kind, _ := cell("W_kind")["W_kind"].(string)
		keys := map[string]string{"W_mA": "W_mA", "W_err_mA": "err_mA"}
		switch kind {
		case "", "value", "marginal":
		case "upper":
			if own {
				break
			}
			keys = map[string]string{"W_mA": "limit_mA"}
		default:
			l.bad(at(where, "W_kind"), "one of value, marginal, upper", "%s is not known", show(kind))
			continue
		}
		for _, col := range []string{"W_mA", "W_err_mA"} {
			key, wanted := keys[col]
			x, ok, err := t.Float(cols[col], i)
			switch {
			case err != nil:
				l.add(err)
			case ok && wanted:
				m[key] = x
			case wanted:
				l.bad(at(where, col), "fill it in, or leave the row out", "missing")
			}
		}
		w := GrowthWidth{by: origins{}}
		if l.read(where, "growth.sightline.width", m, &w, w.by, "catalogue") {
			l.growthWidth(where, g, &w)
		}
		g.Sightlines[j].Widths = append(g.Sightlines[j].Widths, w)
	}
	return places
}
