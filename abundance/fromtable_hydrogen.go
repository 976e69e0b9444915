package abundance

import (
	"fmt"
	"strings"

	"lacuna/budget"
)

// hydrogen reads the hydrogen columns of a sightline, which must agree on all its
// rows; nil where there are none.
func (r *rows) hydrogen(name string, at []int) (*Hydrogen, error) {
	in := HydrogenInput{Sightline: name}
	first := -1
	for _, c := range []struct {
		col string
		to  **budget.Number
	}{{"logN_HI", &in.HI}, {"logN_H2", &in.H2}, {"logN_H", &in.Total}} {
		row, n, err := r.hydrogenColumn(c.col, at)
		if err != nil {
			return nil, err
		}
		if n != nil {
			*c.to = n
			if first < 0 || row < first {
				first = row
			}
		}
	}
	if first < 0 {
		return nil, nil
	}
	same := func(col string) (string, error) {
		text, from := "", -1
		for _, row := range at {
			if s, ok := r.text(col, row); ok {
				if from >= 0 && s != text {
					return "", r.bad(row, col, fmt.Sprintf("%q here, %q at %s", s, text, r.t.Where(from)), "a sightline has one hydrogen column")
				}
				text, from = s, row
			}
		}
		return text, nil
	}
	var err error
	if in.Source, err = same("hydrogen_source"); err != nil {
		return nil, err
	}
	if in.Tracer, err = same("hydrogen_from"); err != nil {
		return nil, err
	}
	if in.Tracer != "" {
		if in.Tracer, err = r.species(first, in.Tracer); err != nil {
			return nil, err
		}
	}
	if in.Source == "" {
		in.Source = r.t.File + ", " + r.t.Where(first)
	}
	h, err := NewHydrogen(in)
	if err != nil {
		return nil, fmt.Errorf("%s: %s (%s): %w", r.t.File, r.t.Where(first), name, err)
	}
	return &h, nil
}

// hydrogenColumn reads one hydrogen column of a sightline and the row that it
// first stands on; nil where there is none.
func (r *rows) hydrogenColumn(col string, at []int) (int, *budget.Number, error) {
	type entry struct {
		x, up, lo, limit float64
		kind             string
	}
	var first *entry
	from := -1
	for _, row := range at {
		x, okX, err := r.num(col, row, 10, 25, "give log10 of the column in cm-2")
		if err != nil {
			return 0, nil, err
		}
		limit, okMax, err := r.num(col+"_max", row, 10, 25, "give log10 of the column in cm-2")
		if err != nil {
			return 0, nil, err
		}
		up, lo, err := r.errors(col, row)
		if err != nil {
			return 0, nil, err
		}
		kind, okKind := r.text(col+"_kind", row)
		e := entry{x, up, lo, limit, strings.ToLower(kind)}
		isLimit := e.kind == "upper" || e.kind == "lower"
		switch {
		case okX && okMax:
			return 0, nil, r.bad(row, col, col+" beside "+col+"_max", "keep the value or the limit")
		case !okX && (up != 0 || okKind && !okMax):
			return 0, nil, r.bad(row, col, "an error or a kind without a column", "give "+col+", or leave them empty")
		case okMax && (up != 0 || okKind && e.kind != "upper"):
			return 0, nil, r.bad(row, col+"_max", "an upper limit with an error or another kind", "leave them empty")
		case okX && isLimit && up != 0:
			return 0, nil, r.bad(row, col+"_err", "a limit with an error", "leave the error empty, or make it a value")
		case okX && !isLimit && up == 0:
			return 0, nil, r.bad(row, col+"_err", "a value without an error", fixErr+", or an upper limit as "+col+"_max")
		case !okX && !okMax:
			continue
		}
		if okMax {
			e.x, e.kind = limit, "upper"
		}
		if first != nil && (e.x != first.x || e.up != first.up || e.lo != first.lo || (e.kind == "upper") != (first.kind == "upper")) {
			return 0, nil, r.bad(row, col, fmt.Sprintf("%s of this sightline differs from %s", col, r.t.Where(from)), "a sightline has one hydrogen column")
		}
		if first == nil {
			first, from = &e, row
		}
	}
	if first == nil {
		return 0, nil, nil
	}
	n, err := Stated(first.x, first.up, first.lo, first.kind, 0, "")
	if err != nil {
		return 0, nil, r.bad(from, col+"_kind", err.Error(), "")
	}
	return from, &n, nil
}
