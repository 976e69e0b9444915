package report

import (
	"fmt"
	"image/color"
	"math"
	"sort"
	"strings"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"lacuna/abundance"
	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/survey"
)

// DepletionFigure draws D(X) by element in order of atomic number: thick bars are
// errors without, thin ones with that of the solar scale; limits are arrows. It
// returns false where no element has a number.
func DepletionFigure(r survey.Record) (Figure, bool) {
	var ds []abundance.Depletion
	var refused []string
	for _, d := range r.Result.Depletions {
		if d.Refused == "" && d.D.Kind() != "none" {
			ds = append(ds, d)
		} else {
			refused = append(refused, plain(d.Element))
		}
	}
	if len(ds) == 0 {
		return Figure{}, false
	}
	sort.SliceStable(ds, func(i, j int) bool { return atomicNumber(ds[i].Element) < atomicNumber(ds[j].Element) })
	title := plain(r.Name)
	scale := ""
	if ds[0].Scale != "" {
		scale = "solar scale " + plain(ds[0].Scale)
	}
	f := Figure{Name: figureName(r.Name, "depletion"), Title: title + ": depletions", Width: oneColumn, Height: vg.Points(170),
		Caption: fmt.Sprintf("Depletions towards %s by atomic number (%s). Thick bars: 1σ without the error of the solar scale, thin bars: with it; arrows: limits; open circles: marginal; bars without a point: intervals.", title, scale)}
	if len(ds) > 16 {
		f.Width = twoColumn
	}
	note := ""
	if len(refused) > 0 {
		note = "no depletion: " + strings.Join(refused, ", ")
		f.Caption += " No depletion can be given from " + strings.Join(refused, ", ") + "."
	}
	f.draw = func(c draw.Canvas) {
		c.FillText(heavy(letters(titleSize, ink, text.XLeft, text.YTop)), vg.Point{X: c.Min.X + vg.Points(marginRight), Y: c.Max.Y - vg.Points(4)}, title)
		sty := letters(textSize, ink, text.XRight, text.YTop)
		if width(heavy(letters(titleSize, ink, 0, 0)), title)+width(sty, scale) < f.Width-vg.Points(22) {
			c.FillText(sty, vg.Point{X: c.Max.X - vg.Points(marginRight), Y: c.Max.Y - vg.Points(5)}, scale)
		}
		foot := 16.0
		if note != "" {
			foot += 11
			s := letters(textSize, ink, text.XLeft, text.YBottom)
			line := note
			if width(s, line) > f.Width-vg.Points(40) {
				line = fmt.Sprintf("no depletion for %d more elements", len(refused))
			}
			c.FillText(s, vg.Point{X: c.Min.X + vg.Points(33), Y: c.Min.Y + vg.Points(2)}, line)
		}
		area := vg.Rectangle{Min: vg.Point{X: c.Min.X + vg.Points(33), Y: c.Min.Y + vg.Points(foot)},
			Max: vg.Point{X: c.Max.X - vg.Points(marginRight), Y: c.Max.Y - vg.Points(18)}}
		drawDepletions(c, area, ds)
	}
	return f, true
}

func atomicNumber(element string) int {
	if e, ok := atomic.Element(element); ok {
		return e.Z
	}
	return math.MaxInt
}

func drawDepletions(c draw.Canvas, area vg.Rectangle, ds []abundance.Depletion) {
	lo, hi := -0.5, 0.3
	x := axis{Lo: 0.4, Hi: float64(len(ds)) + 0.6}
	for i, d := range ds {
		x.Ticks = append(x.Ticks, tick{float64(i + 1), plain(d.Element)})
		n := d.D.Plain()
		a, b := n.X, n.X
		if k := n.Kind(); k != "upper" && k != "lower" {
			a, b = n.X-n.ErrLo(), n.X+n.ErrUp()
		}
		for _, v := range []float64{n.X, a, b} {
			if finite(v) {
				lo, hi = math.Min(lo, v), math.Max(hi, v)
			}
		}
	}
	y := axis{Lo: lo - 0.12*(hi-lo), Hi: hi + 0.12*(hi-lo)} // room for arrows
	y.Ticks = ticks(y.Lo, y.Hi, 6, 0)
	p := newPanel(c, area, x, y)
	p.horizontal(stroke(midGrey, fine, 3, 1.5), 0)
	for i, d := range ds {
		at := float64(i + 1)
		n := d.D.Plain()
		dot := draw.GlyphStyle{Color: ink, Radius: vg.Points(2), Shape: draw.CircleGlyph{}}
		switch n.Kind() {
		case "upper":
			p.arrow(stroke(ink, medium), p.at(at, n.X), -1)
		case "lower":
			p.arrow(stroke(ink, medium), p.at(at, n.X), 1)
		case "interval":
			a, b := n.Range()
			p.curve(stroke(blue, medium), []float64{at, at}, []float64{a, b})
			for _, end := range []float64{a, b} {
				e := p.at(at, end)
				p.StrokeLine2(stroke(blue, medium), e.X-3, e.Y, e.X+3, e.Y)
			}
		default:
			part := 1.0
			if e := n.Err(); e > 0 {
				part = n.Without(budget.Solar) / e
			}
			up, down := n.ErrUp(), n.ErrLo()
			p.curve(stroke(ink, fine), []float64{at, at}, []float64{clampLow(n.X-down, y), n.X + up})
			for _, end := range []float64{n.X - down, n.X + up} {
				if finite(end) {
					e := p.at(at, end)
					p.StrokeLine2(stroke(ink, fine), e.X-2, e.Y, e.X+2, e.Y)
				}
			}
			p.curve(stroke(ink, 2), []float64{at, at}, []float64{clampLow(n.X-part*down, y), n.X + part*up})
			p.DrawGlyph(dot, p.at(at, n.X))
			if n.Kind() == "marginal" { // an open circle
				p.DrawGlyph(draw.GlyphStyle{Color: color.White, Radius: vg.Points(1.3), Shape: draw.CircleGlyph{}}, p.at(at, n.X))
			}
		}
	}
	p.frame(true, true)
	side := letters(textSize, ink, text.XCenter, text.YTop)
	side.Rotation = math.Pi / 2
	p.FillText(side, vg.Point{X: area.Min.X - vg.Points(31), Y: p.Center().Y}, "D(X) = log (X/H) − log (X/H)_{solar}")
}

// clampLow keeps an open lower end inside the panel.
func clampLow(v float64, y axis) float64 {
	if !finite(v) {
		return y.Lo
	}
	return v
}
