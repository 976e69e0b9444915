package report

import (
	"fmt"
	"math"
	"sort"
	"strings"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"lacuna/measure"
	"lacuna/spectrum/frame"
	"lacuna/survey"
)

// Sizes of the velocity stack, in points.
const (
	headRow     = 9.5 // one row of the text above a panel
	fluxHeight  = 58.0
	naHeight    = 23.0
	blockGap    = 5.0
	axisBelow   = 24.0 // tick labels and axis label
	marginLeft  = 39.0
	marginRight = 5.0
	keyRow      = 9.5
	rowsAPage   = 6
	oneColLines = 4 // up to this many lines one column suffices
)

// LineFigures draws every measured line of a sightline on one velocity scale:
// flux over continuum in steps, the continuum and its placement, the integration
// range, the pixels that carry the continuum, masked pixels, blends, and below
// the apparent column N_a(v). Up to 12 lines share a figure; more lines make
// more figures, …-lines, …-lines-2, …
func LineFigures(r survey.Record) []Figure {
	all := r.Result.Widths
	pages := (len(all) + 2*rowsAPage - 1) / (2 * rowsAPage)
	lo, hi := velocityRange(all)
	var out []Figure
	for k := range pages {
		ws := all[k*len(all)/pages : (k+1)*len(all)/pages]
		s := newStack(ws, all, lo, hi, r.Result.Frame)
		f := Figure{Name: figureName(r.Name, "lines"), Title: plain(r.Name), Caption: stackCaption(r, ws, s)}
		s.title = plain(r.Name)
		if pages > 1 {
			f.Title += fmt.Sprintf(" (%d of %d)", k+1, pages)
			s.title = f.Title
			if k > 0 {
				f.Name += fmt.Sprintf("-%d", k+1)
			}
		}
		s.note = resolvingPower(r.Result.Spectra)
		f.Width, f.Height = s.size()
		f.draw = s.draw
		out = append(out, f)
	}
	return out
}

// velocityRange is the range of all integration windows, and on either side as
// much again as tells how quiet the continuum is, but not beyond the data.
func velocityRange(ws []measure.Width) (lo, hi float64) {
	lo, hi = math.Inf(1), math.Inf(-1)
	first, last := math.Inf(1), math.Inf(-1)
	for _, w := range ws {
		if w.Window[1] > w.Window[0] {
			lo, hi = math.Min(lo, w.Window[0]), math.Max(hi, w.Window[1])
		}
		if n := len(w.Profile.V); n > 0 {
			first, last = math.Min(first, w.Profile.V[0]), math.Max(last, w.Profile.V[n-1])
		}
	}
	if !(hi > lo) {
		lo, hi = -50, 50
	}
	pad := math.Max(0.6*(hi-lo), 20)
	lo, hi = lo-pad, hi+pad
	if last > first && first < hi && last > lo {
		lo, hi = math.Max(lo, first), math.Min(hi, last)
	}
	if !(hi > lo) {
		lo, hi = lo-50, lo+50
	}
	return lo, hi
}

// A stack is one page of panels.
type stack struct {
	title, note string
	blocks      []block
	x           axis
	xLabel      string
	cols, rows  int
	nameRows    int // rows of blend names above the spectra
	headRows    int
	wide        vg.Length // of a data area
	key         [][]keyEntry
}

type block struct {
	w       measure.Width
	name    string
	width   string // "W = 48.6 ± 0.5 mÅ"
	column  string
	marks   []mark
	missing bool
}

func newStack(ws, all []measure.Width, lo, hi float64, kind frame.Kind) *stack {
	s := &stack{cols: 1, rows: len(ws), headRows: 1}
	total := oneColumn
	if len(ws) > oneColLines {
		s.cols, s.rows, total = 2, (len(ws)+1)/2, twoColumn
	}
	s.wide = total/vg.Length(s.cols) - vg.Points(marginLeft+marginRight)
	n := 6
	s.x = axis{Lo: lo, Hi: hi, Ticks: ticks(lo, hi, n, 0)}
	s.xLabel = velocityLabel(kind) + " (km s^{−1})"
	times := map[string]int{}
	for _, w := range all {
		times[w.Line]++
	}
	for _, w := range ws {
		b := block{w: w, name: plain(w.Line), width: figureWidth(w), column: figureColumn(w)}
		if times[w.Line] > 1 {
			b.name += fmt.Sprintf(", order %d", w.Order)
		}
		b.missing = len(w.Profile.V) < 2
		var rows int
		b.marks, rows = placeMarks(w.Blends, w.Wave, lo, hi, s.wide)
		s.nameRows = max(s.nameRows, rows)
		if !fits(b, s.wide) {
			s.headRows = 2
		}
		s.blocks = append(s.blocks, b)
	}
	s.key = layKey(stackKey(ws, s.blocks), total-vg.Points(2*marginRight))
	return s
}

// fits reports whether the text above a panel fits in one row.
func fits(b block, wide vg.Length) bool {
	sty := letters(textSize, ink, text.XLeft, text.YBottom)
	return width(heavy(sty), b.name)+width(sty, b.width)+width(sty, b.column)+vg.Points(14) <= wide
}

func (s *stack) top() float64 {
	return 4 + titleSize + 5 + keyRow*float64(len(s.key)) + 3
}

func (s *stack) flux() float64 { return fluxHeight*s.tall() + rowHeight*float64(s.nameRows) }

func (s *stack) na() float64 { return naHeight * (1 + (s.tall()-1)/2) }

// tall stretches the panels of a figure with few of them.
func (s *stack) tall() float64 {
	switch s.rows {
	case 1:
		return 1.8
	case 2:
		return 1.3
	}
	return 1
}

func (s *stack) blockHeight() float64 {
	return headRow*float64(s.headRows) + s.flux() + s.na() + blockGap
}

func (s *stack) size() (w, h vg.Length) {
	w = oneColumn
	if s.cols == 2 {
		w = twoColumn
	}
	return w, vg.Points(s.top() + float64(s.rows)*s.blockHeight() + axisBelow)
}

func (s *stack) draw(c draw.Canvas) {
	y := c.Max.Y - vg.Points(4)
	left := c.Min.X + vg.Points(marginRight)
	c.FillText(heavy(letters(titleSize, ink, text.XLeft, text.YTop)), vg.Point{X: left, Y: y}, s.title)
	sty := letters(textSize, ink, text.XRight, text.YTop)
	if width(heavy(letters(titleSize, ink, 0, 0)), s.title)+width(sty, s.note)+vg.Points(12) < c.Max.X-c.Min.X-vg.Points(2*marginRight) {
		c.FillText(sty, vg.Point{X: c.Max.X - vg.Points(marginRight), Y: y - vg.Points(1)}, s.note)
	}
	drawKey(c, s.key, vg.Point{X: left, Y: y - vg.Points(titleSize+5)})
	column := (c.Max.X - c.Min.X) / vg.Length(s.cols)
	top := c.Max.Y - vg.Points(s.top())
	for k := range s.cols {
		first, last := k*s.rows, min((k+1)*s.rows, len(s.blocks))
		if first >= last {
			break
		}
		x := c.Min.X + vg.Length(k)*column
		for i := first; i < last; i++ {
			at := vg.Point{X: x + vg.Points(marginLeft), Y: top - vg.Points(float64(i-first)*s.blockHeight())}
			s.drawBlock(c, s.blocks[i], at, i == last-1)
		}
		below := top - vg.Points(float64(last-first)*s.blockHeight()-blockGap)
		c.FillText(letters(textSize, ink, text.XCenter, text.YTop),
			vg.Point{X: x + vg.Points(marginLeft) + s.wide/2, Y: below - vg.Points(11)}, s.xLabel)
		side := letters(textSize, ink, text.XCenter, text.YTop)
		side.Rotation = math.Pi / 2
		words := "F / F_{c}; below: N_{a}(v) in cm^{−2} (km s^{−1})^{−1}"
		if width(side, words) > top-below {
			words = "F / F_{c}; below: N_{a}(v)"
		}
		c.FillText(side, vg.Point{X: x + vg.Points(2), Y: (top + below) / 2}, words)
	}
}

// drawBlock draws one line with its upper left corner at pt.
func (s *stack) drawBlock(c draw.Canvas, b block, pt vg.Point, lowest bool) {
	sty := letters(textSize, ink, text.XLeft, text.YBottom)
	base := pt.Y - vg.Points(headRow-1.5)
	right := sty
	right.XAlign = text.XRight
	c.FillText(heavy(sty), vg.Point{X: pt.X, Y: base}, b.name)
	if s.headRows == 1 {
		free := s.wide - width(heavy(sty), b.name) - width(sty, b.width) - width(sty, b.column)
		c.FillText(sty, vg.Point{X: pt.X + width(heavy(sty), b.name) + free/2, Y: base}, b.width)
	} else {
		base -= vg.Points(headRow)
		c.FillText(sty, vg.Point{X: pt.X, Y: base}, b.width)
	}
	c.FillText(right, vg.Point{X: pt.X + s.wide, Y: base}, b.column)

	top := pt.Y - vg.Points(headRow*float64(s.headRows))
	split := top - vg.Points(s.flux())
	bottom := split - vg.Points(s.na())
	area := vg.Rectangle{Min: vg.Point{X: pt.X, Y: split}, Max: vg.Point{X: pt.X + s.wide, Y: top}}
	s.drawFlux(newPanel(c, area, s.x, axis{}), b)
	area = vg.Rectangle{Min: vg.Point{X: pt.X, Y: bottom}, Max: vg.Point{X: pt.X + s.wide, Y: split}}
	s.drawNa(newPanel(c, area, s.x, axis{}), b, lowest)
}

// fluxRange shows the line from zero to the continuum where it is deep, and
// only its own depth where it is shallow.
func fluxRange(w measure.Width, lo, hi float64) (float64, float64) {
	p := w.Profile
	var sigmas []float64
	deepest := 0.0
	for i, v := range p.V {
		if v < lo || v > hi || value(p.Bad, i) || !finite(value(p.Flux, i)) {
			continue
		}
		if e := value(p.Err, i); finite(e) && e > 0 {
			sigmas = append(sigmas, e)
		}
		deepest = math.Max(deepest, 1-value(p.Flux, i))
	}
	sigma := 0.02
	if len(sigmas) > 0 {
		sort.Float64s(sigmas)
		sigma = sigmas[len(sigmas)/2]
	}
	sigma = math.Min(sigma, 0.3)
	if deepest > 0.45 || w.Saturated != "" {
		return math.Min(-0.12, -3*sigma), 1 + math.Max(0.15, 3.5*sigma)
	}
	return 1 - math.Max(1.25*deepest, 5*sigma), 1 + math.Max(0.35*deepest, 4.5*sigma)
}

func (s *stack) drawFlux(p panel, b block) {
	w, pr := b.w, b.w.Profile
	lo, hi := fluxRange(w, s.x.Lo, s.x.Hi)
	room := 0.0 // above the spectrum, for the names of blends
	if len(b.marks) > 0 {
		room = rowHeight*float64(s.nameRows) + tickLength
	}
	p.Y = axis{Lo: lo, Hi: lo + (hi-lo)*s.flux()/(s.flux()-room)}
	for n := 4; n < 8 && labelled(p.Y.Ticks) < 2; n++ { // one label is no scale
		p.Y.Ticks = ticks(lo, hi, n, 0.05)
	}
	if b.missing {
		p.Y.Ticks = nil
		p.frame(false, false)
		p.FillText(letters(textSize, ink, text.XCenter, text.YCenter), p.Center(), "no usable pixels")
		return
	}
	below := p // the part of the panel below the names
	below.Max.Y = p.py(hi)
	below.Y.Hi = hi
	if w.Window[1] > w.Window[0] {
		below.column(paleBlue, w.Window[0], w.Window[1])
	}
	for _, sp := range spans(pr.V, func(i int) bool { return value(pr.Bad, i) }) {
		below.column(paleGrey, sp[0], sp[1])
	}
	p.drawPlacement(pr)
	p.horizontal(stroke(midGrey, hair, 1, 1.5), 0)
	if z := w.Zero; z.Level != 0 && finite(z.Level) {
		p.horizontal(stroke(green, fine, 5, 1.5, 1, 1.5), z.Level)
	}
	p.horizontal(stroke(vermilion, fine, 3, 1.5), 1)
	if w.Window[1] > w.Window[0] {
		for _, edge := range w.Window {
			below.vertical(stroke(blue, hair, 2, 1.2), edge)
		}
	}
	x, y := outline(pr.V, pr.Flux, func(i int) bool { return value(pr.Bad, i) && i < len(pr.Flux) })
	p.curve(stroke(midGrey, fine), x, y)
	x, y = outline(pr.V, pr.Flux, func(i int) bool { return !value(pr.Bad, i) && i < len(pr.Flux) })
	p.curve(stroke(ink, medium), x, y)
	foot := p.Min.Y + vg.Points(2)
	for _, sp := range spans(pr.V, func(i int) bool { return value(pr.Used, i) }) {
		a, z := math.Max(sp[0], p.X.Lo), math.Min(sp[1], p.X.Hi)
		if a < z {
			p.StrokeLine2(stroke(green, 1.6), p.px(a), foot, p.px(z), foot)
		}
	}
	p.drawMarks(b.marks, s.nameRows)
	p.frame(false, true)
}

// drawPlacement fills the band in which the continuum may lie.
func (p panel) drawPlacement(pr measure.Profile) {
	if len(pr.Placement) != len(pr.V) {
		return
	}
	var x, y []float64
	for i, v := range pr.V {
		if finite(pr.Placement[i]) {
			x, y = append(x, v), append(y, 1+pr.Placement[i])
		}
	}
	for i := len(x) - 1; i >= 0; i-- {
		x, y = append(x, x[i]), append(y, 2-y[i])
	}
	p.region(paleOrange, x, y)
}

func (s *stack) drawNa(p panel, b block, lowest bool) {
	pr := b.w.Profile
	inside := func(i int) bool {
		return i < len(pr.Na) && pr.V[i] >= b.w.Window[0] && pr.V[i] <= b.w.Window[1]
	}
	top, low := 0.0, 0.0
	for i := range pr.V {
		if inside(i) && finite(pr.Na[i]) {
			top, low = math.Max(top, pr.Na[i]), math.Min(low, pr.Na[i])
		}
	}
	p.Y = axis{Lo: -0.08, Hi: 1}
	if top > 0 {
		low = math.Max(low, -top)
		p.Y = axis{Lo: math.Min(1.15*low, -0.08*top), Hi: 1.18 * top, Ticks: []tick{{0, "0"}}}
		step, mantissa, exp := niceBelow(0.86 * p.Y.Hi)
		if float64(p.py(step)-p.py(0)) < textSize+1 { // no room for two labels
			p.Y.Ticks = nil
		}
		p.Y.Ticks = append(p.Y.Ticks, tick{step, fmt.Sprintf("%d·10^{%d}", mantissa, exp)})
	}
	if b.w.Window[1] > b.w.Window[0] {
		p.column(paleBlue, b.w.Window[0], b.w.Window[1])
	}
	x, y := outline(pr.V, pr.Na, inside)
	for _, sp := range runsOf(x, y) {
		fx := append(append([]float64{sp.x[0]}, sp.x...), sp.x[len(sp.x)-1])
		fy := append(append([]float64{0}, sp.y...), 0)
		p.region(midBlue, fx, fy)
	}
	p.horizontal(stroke(midGrey, hair, 1, 1.5), 0)
	p.curve(stroke(blue, medium), x, y)
	p.frame(lowest, true)
}

type xy struct{ x, y []float64 }

// runsOf splits a curve at its gaps.
func runsOf(x, y []float64) (out []xy) {
	start := 0
	for i := 0; i <= len(x); i++ {
		if i == len(x) || math.IsNaN(x[i]) {
			if i > start {
				out = append(out, xy{x[start:i], y[start:i]})
			}
			start = i + 1
		}
	}
	return out
}

// velocityLabel names the frame in words.
func velocityLabel(k frame.Kind) string {
	switch k {
	case frame.Heliocent:
		return "Heliocentric velocity"
	case frame.Barycentric:
		return "Barycentric velocity"
	case frame.LSRK:
		return "LSR velocity (kinematic)"
	case frame.LSRD:
		return "LSR velocity (dynamical)"
	case frame.Topocentric:
		return "Topocentric velocity"
	case frame.Geocentric:
		return "Geocentric velocity"
	case frame.Source:
		return "Velocity in the source's frame"
	}
	return "Velocity (frame not known)"
}

func resolvingPower(spectra []survey.SpectrumInfo) string {
	var parts []string
	seen := map[string]bool{}
	for _, s := range spectra {
		if s.R > 0 {
			t := "R = " + group(math.Round(s.R))
			if !seen[t] {
				seen[t] = true
				parts = append(parts, t)
			}
		}
	}
	return strings.Join(parts, ", ")
}

// group prints a whole number with thin gaps between thousands.
func group(x float64) string {
	s := number(x, 0)
	for i := len(s) - 3; i > 0; i -= 3 {
		s = s[:i] + " " + s[i:]
	}
	return s
}

func stackCaption(r survey.Record, ws []measure.Width, s *stack) string {
	var b strings.Builder
	fmt.Fprintf(&b, "Interstellar lines towards %s. %s. Steps: flux over continuum; dashed line and band: continuum and its placement error; "+
		"shaded: integration range; bars at the foot: continuum pixels; grey: masked pixels; lower panels: apparent column density per unit velocity. ",
		plain(r.Name), velocityLabel(r.Result.Frame))
	if p := resolvingPower(r.Result.Spectra); p != "" {
		fmt.Fprintf(&b, "Resolving power %s. ", p)
	}
	b.WriteString("S/N per pixel:")
	for i, w := range ws {
		if i > 0 {
			b.WriteString(",")
		}
		fmt.Fprintf(&b, " %s %s", plain(w.Line), number(w.SNPixel, 0))
	}
	b.WriteString(".")
	for _, bl := range s.blocks {
		for _, m := range bl.marks {
			if m.row < 0 {
				fmt.Fprintf(&b, " Tick without a name in %s at %s km/s: %s.", bl.name, number(m.v, 1), m.name)
			}
		}
	}
	return b.String()
}
