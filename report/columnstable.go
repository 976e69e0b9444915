package report

import (
	"strings"

	"lacuna/abundance"
	"lacuna/budget"
	"lacuna/cog"
	"lacuna/internal/table"
	"lacuna/survey"
)

// Columns returns one row for each column density: every method, with adopted
// true on the one row a species that the survey stands by.
func Columns(rs []survey.Record) *table.Table {
	t := table.New(
		word("object", "Sightline"),
		word("ion", "Species, with its level"),
		word("element", "Element; empty for molecules"),
		table.Column{Name: "adopted", Type: table.Logical, Description: "The column that the survey stands by"},
		word("method", "weak line, apparent optical depth, growth curve, fit or given"),
		word("line", "Transition, where one line gives the column"),
		word("logN_kind", "value, upper, lower, marginal or interval (logN its middle, errors its half-width)"),
		real("logN", logCm2, "Column density, or its limit"),
		real("logN_err_up", dexes, "Upward 1σ error; none for a limit"),
		real("logN_err_lo", dexes, "Downward 1σ error; none: open"),
		real("logN_err_f", dexes, "Part of the error: oscillator strength"),
		real("limit_sigma", "", "Confidence of a limit, in σ"),
		word("rule", "Why the column was adopted"),
		word("flag", "What a reader must know"),
	)
	t.Meta = meta(rs)
	for _, r := range rs {
		for _, part := range []struct {
			cols    []abundance.Column
			adopted bool
		}{{r.Result.Columns, false}, {r.Result.Adopted, true}} {
			for _, c := range part.cols {
				kind, x, up, lo := numberCells(c.LogN, 1, columnDecimals)
				f := errorCell(c.LogN.ErrBy(budget.FValue), 4)
				conf := table.Missing
				if c.LogN.Is(budget.Upper) || c.LogN.Is(budget.Lower) {
					conf, f = positive(c.LogN.Conf, 1), table.Missing
				}
				t.AddRow(table.Str(r.Name), table.Str(c.Species), table.StrOr(c.Element), table.Bool(part.adopted), table.Str(c.Method),
					table.StrOr(c.Line), kind, x, up, lo, f, conf, table.StrOr(c.Rule), flagCell(c.LogN.Flag))
			}
		}
	}
	return t
}

// Depletions returns one row for each element of each sightline, the refused
// ones with their reason and without a number.
func Depletions(rs []survey.Record) *table.Table {
	t := table.New(
		word("object", "Sightline"),
		word("element", "Element"),
		word("ions", "Species that D is made from"),
		word("D_kind", "value, upper, lower, marginal or interval"),
		real("D", dexes, "log N(X)/N(H) minus the solar value; 0: no dust"),
		real("D_err_up", dexes, "Upward 1σ error, all causes"),
		real("D_err_lo", dexes, "Downward 1σ error"),
		real("D_err_noscale", dexes, "1σ error without that of the solar scale"),
		real("D_err_hydrogen", dexes, "Part of the error: hydrogen column"),
		real("gas", dexes, "12 + log N(X)/N(H)"),
		word("refused", "Why there is no number"),
		word("scale", "Solar scale"),
		real("solar", dexes, "Solar abundance, 12 + log X/H"),
		real("solar_err", dexes, "1σ error"),
		word("logNH_kind", "Kind of logNH"),
		real("logNH", logCm2, "Total hydrogen column"),
		real("logNH_err_up", dexes, "Upward 1σ error"),
		real("logNH_err_lo", dexes, "Downward 1σ error"),
		word("NH_by", "How the hydrogen column was made, and its source"),
		word("flag", "What a reader must know"),
		word("note", "Notes"),
	)
	t.Meta = meta(rs)
	for _, r := range rs {
		h := hydrogenCells(r.Result.Hydrogen)
		for _, d := range r.Result.Depletions {
			kind, x, up, lo := numberCells(d.D, 1, columnDecimals)
			_, gas, _, _ := numberCells(d.Gas, 1, columnDecimals)
			noscale, byH := table.Missing, table.Missing
			if d.Refused != "" {
				kind, x, up, lo, gas = table.Missing, table.Missing, table.Missing, table.Missing, table.Missing
			} else if up.Set {
				noscale, byH = errorCell(d.D.Without(budget.Solar), 4), errorCell(d.D.ErrBy(budget.Hydrogen), 4)
			}
			cells := []table.Cell{table.Str(r.Name), table.Str(d.Element), table.StrOr(strings.Join(d.Species, " + ")),
				kind, x, up, lo, noscale, byH, gas, table.StrOr(d.Refused),
				table.StrOr(d.Scale), positive(d.Solar, 2), errorCell(d.SolarErr, 2)}
			cells = append(cells, h...)
			t.AddRow(append(cells, flagCell(d.D.Flag), table.StrOr(strings.Join(d.Notes, "; ")))...)
		}
	}
	return t
}

func hydrogenCells(h *abundance.Hydrogen) []table.Cell {
	if h == nil {
		return make([]table.Cell, 5)
	}
	kind, x, up, lo := numberCells(h.H, 1, columnDecimals)
	by := h.Route
	if h.Source != "" {
		by += "; " + h.Source
	}
	return []table.Cell{kind, x, up, lo, table.StrOr(by)}
}

// Growth returns one row for each column that a curve of growth gave: species
// with several levels have a row a level, all with the same b.
func Growth(rs []survey.Record) *table.Table {
	t := table.New(
		word("object", "Sightline"),
		word("ion", "Species"),
		word("level", "Level of this column"),
		whole("lines", "Lines fitted"),
		whole("limits", "of these, lines that are limits"),
		word("logN_kind", "value, upper, lower or interval"),
		real("logN", logCm2, "Column density"),
		real("logN_err_up", dexes, "Upward 1σ error (Δχ² = 1)"),
		real("logN_err_lo", dexes, "Downward 1σ error; none: open"),
		word("b_kind", "Kind of b"),
		real("b", kms, "Doppler parameter"),
		real("b_err_up", kms, "Upward 1σ error (Δχ² = 1); none: open"),
		real("b_err_lo", kms, "Downward 1σ error; none: open"),
		real("chi2", "", "χ² of the fit"),
		whole("dof", "Degrees of freedom"),
		real("largest_correction", dexes, "Largest log N − log N of the weak-line relation among the lines"),
		word("open", "Directions in which the Δχ² = 2.30 contour does not close"),
		word("stop", "Why the fit stopped"),
		word("flag", "What a reader must know"),
		word("note", "Notes"),
	)
	t.Meta = meta(rs)
	for _, r := range rs {
		for _, g := range r.Result.Growth {
			for i, n := range g.LogN {
				t.AddRow(growthRow(r.Name, g, i, n)...)
			}
		}
	}
	return t
}

func growthRow(object string, g cog.Result, i int, n budget.Number) []table.Cell {
	limits, largest := 0, 0.0
	for _, l := range g.Lines {
		if l.Limit {
			limits++
		}
		if finite(l.Correction) && l.Correction > largest {
			largest = l.Correction
		}
	}
	open := table.Missing
	if len(g.Contours) > 0 {
		open = table.StrOr(g.Contours[0].Open)
	}
	kind, x, up, lo := numberCells(n, 1, columnDecimals)
	bKind, b, bUp, bLo := numberCells(g.B, 1, 2)
	return []table.Cell{table.Str(object), table.Str(g.Species), table.StrOr(value(g.Levels, i)), table.Int(len(g.Lines)), table.Int(limits),
		kind, x, up, lo, bKind, b, bUp, bLo, table.Fixed(g.Chi2, 3), table.Int(g.DOF), table.Fixed(largest, 3), open,
		table.StrOr(g.Stop), flagCell(n.Flag | g.B.Flag), table.StrOr(strings.Join(g.Notes, "; "))}
}
