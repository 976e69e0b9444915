package report

import (
	"fmt"
	"io"
	"math"
	"strings"

	"lacuna/budget"
	"lacuna/measure"
	"lacuna/spectrum/frame"
)

// WidthText writes everything about one measured line: width or limit, the error
// split by cause, what the noise and the continuum rest on, and the columns that
// the line gives by itself. kind is the frame of the velocities.
func WidthText(w io.Writer, m measure.Width, kind frame.Kind, o Options) error {
	p := newPage(o)
	p.heading(m.Line)
	g := &grid{indent: 2, align: "lf"}
	say := func(name, text string, t tone) {
		if text != "" {
			g.add(plainCell(name), cell{text, t})
		}
	}
	air := ""
	if m.WaveAir > 0 {
		air = fmt.Sprintf(" (air %.4f Å)", m.WaveAir)
	}
	say("transition", fmt.Sprintf("%.4f Å in vacuum%s, f = %.4g", m.Wave, air, m.F), normal)
	say("spectrum", fmt.Sprintf("%s, order %d", m.File, m.Order), normal)
	if m.Detected {
		say("W", printWidth(m).text()+" mÅ"+significance(m), strong)
	} else {
		if m.Limit > 0 {
			say("W", fmt.Sprintf("< %s mÅ (%sσ, over %s km/s with b = %s km/s)", printWidthLimit(m), number(m.LimitSigma, decimalsOf(m.LimitSigma)),
				number(m.LimitWidth, decimalsOf(m.LimitWidth)), number(m.LimitB, decimalsOf(m.LimitB))), warn)
		}
		say("measured", printWidth(m).text()+" mÅ"+significance(m), normal)
	}
	how := "chosen by the user"
	if m.AutoWindow {
		how = "found automatically"
	}
	say("window", fmt.Sprintf("%s … %s km/s, %s", number(m.Window[0], 1), number(m.Window[1], 1), how), normal)
	if m.V.Kind() != "none" && m.Detected {
		say("velocity", printNumber(m.V, 1, 2).text()+" km/s ("+strings.ToLower(velocityLabel(kind))+", weighted by absorbed flux)", normal)
	}
	say("depth", number(m.Depth, 3), normal)
	say("S/N", snText(m), normal)
	say("noise", noiseText(m), normal)
	say("continuum", fmt.Sprintf("%s, degree %d%s", m.ContinuumBy, m.Degree, windowsPhrase(m.Windows)), normal)
	say("", placementsText(m), normal)
	say("zero level", zeroText(m.Zero), normal)
	if m.FillPart != 0 {
		say("filled", fmt.Sprintf("%s %% of W lies in masked pixels", number(100*m.FillPart, 1)), warn)
	}
	say("saturated", m.Saturated, warn)
	say("blends", blendsText(m.Blends), warn)
	say("flags", strings.Join((m.Flag|m.W.Flag).Words(), ", "), warn)
	for _, n := range m.Notes {
		say("note", n, normal)
	}
	p.grid(g)

	p.blank()
	p.errorSplit(m)

	cols := &grid{indent: 2, align: "lnf", head: []string{"column", "log N", ""}}
	cols.add(plainCell("weak line"), logCell(budget.Log10(m.Linear)), plainCell(why(m)))
	if n := budget.Log10(m.AOD); n.Kind() != "none" && m.Detected {
		more := []string{}
		if m.AODV.Kind() != "none" {
			more = append(more, "v = "+printNumber(m.AODV, 1, 2).text()+" km/s")
		}
		if m.AODB.Kind() != "none" {
			more = append(more, "b = "+printNumber(m.AODB, 1, 2).text()+" km/s")
		}
		more = append(more, "largest τ "+number(m.TauPeak, 2))
		if math.Abs(m.AODBias) >= 0.0005 {
			more = append(more, "noise bias "+minus(fmt.Sprintf("%+.1f", 100*m.AODBias))+" % (not corrected)")
		}
		cols.add(plainCell("apparent optical depth"), logCell(n), plainCell(strings.Join(more, ", ")))
	}
	if cols.rows[0][1].text != "" || len(cols.rows) > 1 {
		p.blank()
		p.grid(cols)
	}
	return p.writeTo(w)
}

// why says how the column of the weak-line relation is to be read.
func why(m measure.Width) string {
	var parts []string
	switch m.Linear.Kind() {
	case "lower":
		if m.Saturated != "" {
			parts = append(parts, "lower limit: the line is saturated")
		} else {
			parts = append(parts, "lower limit: not thin enough for this relation")
		}
	case "upper":
		parts = append(parts, "upper limit")
	case "marginal":
		parts = append(parts, "marginal")
	}
	if m.Correction > 0 && finite(m.Correction) {
		parts = append(parts, signed(m.Correction, 3)+" dex for its optical depth")
	}
	if m.Tau0 > 0 && finite(m.Tau0) {
		parts = append(parts, "τ₀ "+number(m.Tau0, 2)+" with b = "+number(m.B, 1)+" km/s")
	}
	return strings.Join(parts, ", ")
}

// placementsText is W with the other continua.
func placementsText(m measure.Width) string {
	var parts []string
	for _, q := range m.Placements {
		if finite(q.W) {
			parts = append(parts, q.What+": "+number(q.W*mA, widthDecimals(q.W*mA)))
		}
	}
	if len(parts) == 0 {
		return ""
	}
	return "W with other placements (mÅ): " + strings.Join(parts, ", ")
}

func significance(m measure.Width) string {
	e := m.W.Err()
	if !(e > 0) {
		return ""
	}
	return fmt.Sprintf(" (%sσ)", number(m.W.X/e, 1))
}

func snText(m measure.Width) string {
	if !(m.SNPixel > 0) {
		return ""
	}
	s := number(m.SNPixel, 0) + " per pixel"
	if m.SNElement > 0 {
		s += ", " + number(m.SNElement, 0) + " per resolution element"
	}
	return s
}

func noiseText(m measure.Width) string {
	s := m.NoiseBy
	if m.NoiseRatio > 0 {
		s += fmt.Sprintf("; scatter over tabulated error %s", number(m.NoiseRatio, 2))
	}
	if len(m.NoiseRho) > 0 {
		s += fmt.Sprintf(", correlation of neighbours %s", number(m.NoiseRho[0], 2))
	}
	if m.NoisePixels > 0 {
		s += fmt.Sprintf(", on %s", count(m.NoisePixels, "pixel"))
	}
	return s
}

func windowsPhrase(ws [][2]float64) string {
	var parts []string
	for _, w := range ws {
		parts = append(parts, number(w[0], 0)+" … "+number(w[1], 0))
	}
	if len(parts) == 0 {
		return ""
	}
	return " on " + strings.Join(parts, ", ") + " km/s"
}

func zeroText(z measure.Zero) string {
	if z.By == "" && z.Level == 0 && z.Err == 0 {
		return ""
	}
	s := printNumber(budget.Number{X: z.Level, Shifts: []budget.Shift{{Cause: budget.ZeroLevel, D: z.Err}}}, 1, 4).text() + " of the continuum"
	switch z.By {
	case "":
	case "prior":
		s += ", assumed"
	case "user":
		s += ", as given"
	default:
		s += ", from " + z.By
	}
	if z.Pixels > 0 {
		s += fmt.Sprintf(" (%s)", count(z.Pixels, "pixel"))
	}
	return s
}

// errorSplit writes the error of W by cause. Causes that share an unknown need
// not add in quadrature to the total.
func (p *page) errorSplit(m measure.Width) {
	g := &grid{indent: 2, align: "lrl", head: []string{"error of W", "mÅ", ""}}
	total := m.W.Err() * mA
	if !(total > 0) {
		return
	}
	d := errorDecimals(total, total) + 1
	for _, c := range budget.Causes() {
		if e := m.W.ErrBy(c) * mA; e > 0 {
			g.add(plainCell(causeText(c)), plainCell(number(e, d)), plainCell(bar(e/total)))
		}
	}
	g.add(cell{"total", strong}, cell{number(total, d), strong})
	if m.SigmaVE06 > 0 {
		g.add(cell{"(Vollmann & Eversberg 2006, for comparison)", faint}, cell{number(m.SigmaVE06*mA, d), faint})
	}
	p.grid(g)
}

// bar draws a share of 1 as up to 20 signs.
func bar(part float64) string {
	return strings.Repeat("▪", max(0, min(20, int(20*part+0.5))))
}
