package report

import (
	"math"
	"strconv"
	"strings"

	"lacuna/budget"
	"lacuna/internal/table"
	"lacuna/measure"
)

// A printed number is its parts as text, rounded by the rule of package table.
type printed struct {
	kind   string // as budget.Number.Kind
	x      string // value or limit; the lower end of an interval
	up, lo string // errors; up is the upper end of an interval; equal: symmetric; "": open or none
	bare   bool   // a value without any error
	loose  bool   // errors so large that the value is none
}

// printNumber prints k·n. decimals is for what has no error to round by: limits,
// intervals and values that are fixed.
func printNumber(n budget.Number, k float64, decimals int) printed {
	n = n.Plain()
	p := printed{kind: n.Kind()}
	switch p.kind {
	case "none":
	case "upper", "lower":
		p.x = outward(n.X*k, decimals, p.kind == "upper")
	case "interval":
		lo, hi := n.Range()
		p.x = outward(lo*k, decimals, false)
		p.up = outward(hi*k, decimals, true)
	default:
		up, lo := n.ErrUp()*k, n.ErrLo()*k
		if !(up > 0) && !(lo > 0) {
			p.bare = true
			p.x = table.FormatFixed(n.X*k, decimals)
			break
		}
		p.x, p.up, p.lo = table.RoundAsym(n.X*k, up, lo)
		p.loose = finite(up, lo) && math.Min(up, lo) > 1e3*math.Max(math.Abs(n.X*k), 1)
	}
	return p
}

// outward rounds a limit away from what it excludes, but not for the last digits
// that arithmetic leaves: 20.449999999999996 is 20.45.
func outward(x float64, decimals int, upper bool) string {
	if y, err := strconv.ParseFloat(strconv.FormatFloat(x, 'g', 12, 64), 64); err == nil {
		x = y
	}
	return table.RoundLimit(x, decimals, upper)
}

// text joins the parts: "48.6 ± 0.5", "11.84 +0.03 −0.02", "< 2.1", "20.9 … 21.2".
func (p printed) text() string {
	var s string
	switch {
	case p.kind == "none" || p.x == "":
		return "–"
	case p.loose:
		return "not constrained"
	case p.kind == "upper":
		s = "< " + p.x
	case p.kind == "lower":
		s = "> " + p.x
	case p.kind == "interval":
		s = p.x + " … " + p.up
	case p.bare:
		s = p.x
	case p.up == p.lo:
		s = p.x + " ± " + p.up
	default:
		s = p.x + " " + side("+", p.up) + " " + side("-", p.lo)
	}
	return minus(s)
}

// marked is text for figures, with asymmetric errors raised and lowered, and the
// sign of equality that the rest of a label needs: "= 48.6 ± 0.5", "< 2.1".
func (p printed) marked() string {
	switch {
	case p.kind == "none" || p.x == "":
		return "not known"
	case p.loose:
		return p.text()
	case p.kind == "upper" || p.kind == "lower":
		return p.text()
	case p.kind == "interval":
		return "= " + p.text()
	case p.bare || p.up == p.lo:
		return "= " + p.text()
	}
	return minus("= " + p.x + "^{" + side("+", p.up) + "}_{" + side("-", p.lo) + "}")
}

func side(sign, s string) string {
	if s == "" {
		return sign + "∞"
	}
	return sign + s
}

// minus sets true minus signs.
func minus(s string) string { return strings.ReplaceAll(s, "-", "−") }

const mA = 1e3 // mÅ in an Å

// widthDecimals is the usual number of decimals of a width in mÅ without an
// error: one below 100 mÅ, two below 1 mÅ.
func widthDecimals(mA float64) int {
	switch a := math.Abs(mA); {
	case a < 1:
		return 2
	case a < 100:
		return 1
	}
	return 0
}

// printWidth prints W ± σ in mÅ, also where the line is not detected.
func printWidth(w measure.Width) printed {
	return printNumber(w.W, mA, widthDecimals(w.W.X*mA))
}

// printWidthLimit prints the upper limit of a line that is not detected, in mÅ.
func printWidthLimit(w measure.Width) string {
	return outward(w.Limit*mA, widthDecimals(w.Limit*mA), true)
}

// columnDecimals is the number of decimals of log N without an error.
const columnDecimals = 2

func printLog(n budget.Number) printed { return printNumber(n, 1, columnDecimals) }

// bestColumn is the column that one line gives by itself: the apparent column
// where it was detected, else the limit of the weak-line relation.
func bestColumn(w measure.Width) (logN budget.Number, apparent bool) {
	if w.Detected {
		if n := budget.Log10(w.AOD); n.Kind() != "none" {
			return n, true
		}
	}
	return budget.Log10(w.Linear), false
}

// figureWidth is the width as a figure's panel states it.
func figureWidth(w measure.Width) string {
	if !w.Detected && w.Limit > 0 && !marginal(w) {
		return "W < " + printWidthLimit(w) + " mÅ (" + number(w.LimitSigma, decimalsOf(w.LimitSigma)) + "σ)"
	}
	p := printWidth(w)
	if p.kind == "none" {
		return "W not measured"
	}
	s := "W " + p.marked() + " mÅ"
	if marginal(w) {
		s += " (marginal)"
	}
	return s
}

// marginal reports a line between 2σ and the threshold of detection: it shows its
// value, because a limit alone would hide it.
func marginal(w measure.Width) bool {
	return !w.Detected && (w.Flag|w.W.Flag)&budget.Marginal != 0
}

// figureColumn is the column as a figure's panel states it.
func figureColumn(w measure.Width) string {
	n, apparent := bestColumn(w)
	p := printLog(n)
	if p.kind == "none" {
		if w.Saturated != "" {
			return "saturated"
		}
		return ""
	}
	s := "log N"
	if apparent {
		s += "_{a}"
	}
	s += " " + p.marked()
	if w.Saturated != "" {
		s += ", saturated"
	}
	return s
}

// decimalsOf is 0 for whole numbers, else 1.
func decimalsOf(x float64) int {
	if x == math.Trunc(x) {
		return 0
	}
	return 1
}
