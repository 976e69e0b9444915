package report

import (
	"math"
	"strings"

	"lacuna/budget"
	"lacuna/internal/table"
	"lacuna/spectrum/frame"
	"lacuna/survey"
)

// Numbers in the tables keep two digits more than the rule of rounding prints
// (package table: 355/950), so that a reader may compute with them and round
// once; limits are rounded outward at that place. The journal has every digit.
const guardDigits = 2

const roundingNote = "two digits beyond the 355/950 rule of rounding; limits rounded outward"

// numberCells returns a number as four cells: its kind, the value or limit, and
// the upward and downward error (empty for limits). The ends of an interval stand
// as its middle with half its width.
func numberCells(n budget.Number, k float64, decimals int) (kind, x, up, lo table.Cell) {
	n = n.Plain()
	kind = table.Str(n.Kind())
	switch n.Kind() {
	case "none":
		return table.Missing, table.Missing, table.Missing, table.Missing
	case "upper", "lower":
		return kind, table.Num(outward(n.X*k, decimals+guardDigits, n.Kind() == "upper")), table.Missing, table.Missing
	}
	u, l := n.ErrUp()*k, n.ErrLo()*k
	d := decimals + guardDigits
	if u > 0 || l > 0 {
		d = errorDecimals(u, l) + guardDigits
	}
	return kind, table.Num(table.FormatFixed(n.X*k, d)), errorCell(u, d), errorCell(l, d)
}

// errorCell leaves an error empty where there is none, or no end to it.
func errorCell(e float64, d int) table.Cell {
	if !(e > 0) || math.IsInf(e, 1) {
		return table.Missing
	}
	return table.Num(table.FormatFixed(e, d))
}

// errorDecimals is the decimal place at which the rule rounds a value with these
// errors.
func errorDecimals(up, lo float64) int {
	v, _, _ := table.RoundAsym(0, up, lo)
	if mant, exp, ok := strings.Cut(v, "e-"); ok { // errors below 1e-9
		d := 0
		for _, c := range exp {
			d = 10*d + int(c-'0')
		}
		return d + places(mant)
	}
	return places(v)
}

// places counts the digits after the point.
func places(s string) int {
	_, after, _ := strings.Cut(s, ".")
	return len(after)
}

// real is a column of numbers.
func real(name, unit, about string) table.Column {
	return table.Column{Name: name, Unit: unit, Type: table.Real, Description: about}
}

func word(name, about string) table.Column {
	return table.Column{Name: name, Type: table.Text, Description: about}
}

func whole(name, about string) table.Column {
	return table.Column{Name: name, Type: table.Integer, Description: about}
}

const (
	kms    = "km / s"
	mAngst = "mAngstrom"
	logCm2 = "dex(1 / cm2)"
	dexes  = "dex"
)

// velocityColumn names the column of velocities by the frame that all records
// share, v where they do not.
func velocityColumn(rs []survey.Record) (name, about string) {
	kind := sharedFrame(rs)
	switch kind {
	case frame.Heliocent:
		name = "v_helio"
	case frame.Barycentric:
		name = "v_bary"
	case frame.LSRK, frame.LSRD:
		name = "v_lsr"
	case frame.Topocentric:
		name = "v_topo"
	case frame.Geocentric:
		name = "v_geo"
	default:
		return "v", "Velocity in the frame of the column frame, v = cz"
	}
	return name, velocityLabel(kind) + ", v = cz"
}

// sharedFrame is the frame of all records, or Unknown where they differ.
func sharedFrame(rs []survey.Record) frame.Kind {
	kind, first := frame.Unknown, true
	for _, r := range rs {
		if r.Status == failed {
			continue
		}
		if first {
			kind, first = r.Result.Frame, false
		}
		if r.Result.Frame != kind {
			return frame.Unknown
		}
	}
	return kind
}

const failed = "failed"

func flagCell(f budget.Flag) table.Cell {
	return table.StrOr(strings.Join(f.Words(), ", "))
}

// rowOf finds the row of a data table that a result rests on.
func rowOf(r survey.Record, tab, key string) survey.Row {
	for _, row := range r.Result.Rows {
		if row.Table == tab && row.Key == key {
			return row
		}
	}
	return survey.Row{}
}

// meta is what every table says about itself.
func meta(rs []survey.Record, more ...table.KV) []table.KV {
	out := []table.KV{{Key: "sightlines", Value: len(rs)}}
	if k := sharedFrame(rs); k != frame.Unknown {
		out = append(out, table.KV{Key: "frame", Value: string(k)})
	}
	return append(append(out, more...), table.KV{Key: "rounding", Value: roundingNote})
}

// positive is a fixed cell, missing where x is not above zero: for quantities of
// which zero means unknown.
func positive(x float64, decimals int) table.Cell {
	if !(x > 0) {
		return table.Missing
	}
	return table.Fixed(x, decimals)
}
