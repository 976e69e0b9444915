package report

import (
	"fmt"
	"math"
	"sort"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"lacuna/measure"
)

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
	if deepest > 0.45 {
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
	if !(top > 0) && !(low < 0) { // nothing was measured here
		p.frame(lowest, false)
		return
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
