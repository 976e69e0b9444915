package report

import (
	"fmt"
	"image/color"
	"math"
	"strings"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"lacuna/atomic"
	"lacuna/cog"
	"lacuna/config"
)

// A growthPoint is one line in the plane of the curve of growth.
type growthPoint struct {
	name     string
	x        float64 // log₁₀ N f λ, λ in Å
	y        float64 // log₁₀ W/λ, of the limit where limit is set
	up, lo   float64 // dex; lo +Inf: open
	residual float64 // (W − model)/σ
	limit    bool
	column   int
}

// GrowthFigure draws one curve of growth of a sightline: log W/λ against
// log N f λ at the fitted N, with the theoretical curve for the fitted b and for
// b ± 1σ, residuals below, and beside it the contours Δχ² = 2.30 and 6.17 in the
// plane of log N and b.
//
// The theoretical curves are those of an unsplit line at the wavelength of the
// strongest fitted one with its damping; the residuals are against the exact
// widths of the fit.
func GrowthFigure(sightline string, g cog.Result) Figure {
	points := growthPoints(g)
	title := plain(sightline) + ": growth curve of " + plain(g.Species)
	f := Figure{Name: figureName(sightline, "growth-"+config.Slug(g.Species)), Title: title, Width: twoColumn, Height: vg.Points(236)}
	contours := len(g.Contours) > 0
	if !contours {
		f.Width = oneColumn
	}
	f.Caption = growthCaption(sightline, g, points)
	f.draw = func(c draw.Canvas) {
		left := c.Min.X + vg.Points(marginRight)
		c.FillText(heavy(letters(titleSize, ink, text.XLeft, text.YTop)), vg.Point{X: left, Y: c.Max.Y - vg.Points(4)}, title)
		const foot, residuals, head = 27.0, 38.0, 18.0
		wide := oneColumn
		area := vg.Rectangle{
			Min: vg.Point{X: c.Min.X + vg.Points(34), Y: c.Min.Y + vg.Points(foot+residuals)},
			Max: vg.Point{X: c.Min.X + wide - vg.Points(marginRight), Y: c.Max.Y - vg.Points(head)},
		}
		x := growthAxis(points)
		drawGrowth(c, area, x, g, points)
		area.Max.Y, area.Min.Y = area.Min.Y, c.Min.Y+vg.Points(foot)
		drawResiduals(c, area, x, points)
		if contours {
			drawContours(c, vg.Rectangle{
				Min: vg.Point{X: c.Max.X - wide + vg.Points(34), Y: c.Min.Y + vg.Points(foot)},
				Max: vg.Point{X: c.Max.X - vg.Points(marginRight), Y: c.Max.Y - vg.Points(head)},
			}, g)
		}
	}
	return f
}

func growthPoints(g cog.Result) []growthPoint {
	var out []growthPoint
	for _, l := range g.Lines {
		wave, f := l.Wave, l.F
		if !(wave > 0) || !(f > 0) || l.Column >= len(g.LogN) {
			continue
		}
		p := growthPoint{name: plain(withoutSpecies(l.Line, value(g.Levels, l.Column))), column: l.Column, limit: l.Limit,
			x: g.LogN[l.Column].X + math.Log10(f*wave), y: math.Log10(l.W / wave), residual: (l.W - l.Model) / l.Err}
		s := l.Err / l.W
		switch {
		case l.Limit:
		case !(l.W > 2*l.Err): // not seen: where it would have been
			p.limit, p.y = true, math.Log10((math.Max(l.W, 0)+3*l.Err)/wave)
		default:
			p.up, p.lo = math.Log10(1+s), -math.Log10(1-s)
		}
		if finite(p.x, p.y) {
			out = append(out, p)
		}
	}
	return out
}

func growthAxis(ps []growthPoint) axis {
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, p := range ps {
		lo, hi = math.Min(lo, p.x), math.Max(hi, p.x)
	}
	if !(hi >= lo) {
		lo, hi = 14, 18
	}
	pad := math.Max(0.25*(hi-lo), 0.6)
	a := axis{Lo: lo - pad, Hi: hi + pad}
	a.Ticks = ticks(a.Lo, a.Hi, 6, 0)
	return a
}

// theory returns log W/λ along the axis for one Doppler parameter.
func theory(l atomic.Line, b float64, x axis) (xs, ys []float64) {
	const n = 80
	for i := range n + 1 {
		at := x.Lo + (x.Hi-x.Lo)*float64(i)/n
		w := cog.Width(l, at-math.Log10(l.F*l.Wave), b)
		xs, ys = append(xs, at), append(ys, math.Log10(w/l.Wave))
	}
	return xs, ys
}

// reference is the line whose wavelength and damping the curves are drawn with.
func reference(g cog.Result) atomic.Line {
	l := atomic.Line{Wave: 5000, F: 0.1}
	best := 0.0
	for _, r := range g.Lines {
		if s := r.F * r.Wave; s > best {
			best = s
			l = atomic.Line{Wave: r.Wave, F: r.F}
			if row, err := atomic.Default().Find(r.Line); err == nil {
				l.Gamma = row.Gamma
			}
		}
	}
	return l
}

var columnShapes = []draw.GlyphDrawer{draw.CircleGlyph{}, draw.BoxGlyph{}, draw.PyramidGlyph{}, draw.CrossGlyph{}}
var columnColours = []color.Color{ink, blue, vermilion, green}

func drawGrowth(c draw.Canvas, area vg.Rectangle, x axis, g cog.Result, ps []growthPoint) {
	p := newPanel(c, area, x, axis{})
	line := reference(g)
	xs, best := theory(line, g.B.X, x)
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, y := range best {
		if finite(y) {
			lo, hi = math.Min(lo, y), math.Max(hi, y)
		}
	}
	for _, q := range ps {
		lo, hi = math.Min(lo, q.y), math.Max(hi, q.y)
	}
	if !(hi > lo) {
		lo, hi = -6, -4
	}
	p.Y = axis{Lo: lo - 0.06*(hi-lo), Hi: hi + 0.12*(hi-lo)}
	p.Y.Ticks = ticks(p.Y.Lo, p.Y.Hi, 6, 0.03)
	// the weak-line relation: W/λ = π rₑ N f λ
	slope := math.Log10(math.Pi * atomic.ElectronRadius * 1e-8)
	p.curve(stroke(midGrey, fine, 1, 1.5), []float64{x.Lo, x.Hi}, []float64{x.Lo + slope, x.Hi + slope})
	place := &placer{area: vg.Rectangle{Min: vg.Point{X: area.Min.X + 3, Y: area.Min.Y + 3}, Max: vg.Point{X: area.Max.X - 3, Y: area.Max.Y - 3}}}
	avoid := func(ys []float64) { // labels keep off the curves
		for i := range xs {
			if finite(ys[i]) {
				place.block(p.at(xs[i], ys[i]), 1)
			}
		}
	}
	for _, b := range []float64{g.B.X - g.B.ErrLo(), g.B.X + g.B.ErrUp()} {
		if b > 0 && finite(b) && g.B.Kind() == "value" {
			_, ys := theory(line, b, x)
			p.curve(stroke(blue, fine, 3, 1.5), xs, ys)
			avoid(ys)
		}
	}
	p.curve(stroke(blue, bold), xs, best)
	avoid(best)
	p.growthKey(g, place)
	for _, q := range ps {
		place.block(p.at(q.x, q.y), 3)
	}
	defer func() {
		for _, q := range ps {
			p.drawPoint(q)
		}
	}()
	sty := letters(textSize, ink, text.XLeft, text.YBottom)
	for _, q := range ps {
		dot, wide := p.at(q.x, q.y), width(sty, q.name)
		if at, far, ok := place.place(dot, wide, vg.Points(textSize), 4.5); ok {
			p.FillText(sty, vg.Point{X: at.X, Y: at.Y - vg.Points(0.5)}, q.name)
			if far { // a hair leads to the point
				x := min(max(dot.X, at.X), at.X+wide)
				y := min(max(dot.Y, at.Y), at.Y+vg.Points(textSize))
				p.StrokeLine2(stroke(midGrey, hair), dot.X, dot.Y, x, y)
			}
		}
	}
	p.frame(false, true)
	side := letters(textSize, ink, text.XCenter, text.YTop)
	side.Rotation = math.Pi / 2
	p.FillText(side, vg.Point{X: area.Min.X - vg.Points(31), Y: p.Center().Y}, "log (W / λ)")
}

// drawPoint draws one line with its error, or an arrow down from its limit.
func (p panel) drawPoint(q growthPoint) {
	col := columnColours[q.column%len(columnColours)]
	s := stroke(col, medium)
	if q.limit {
		p.arrow(s, p.at(q.x, q.y), -1)
		return
	}
	lo := p.Y.Lo
	if finite(q.lo) {
		lo = q.y - q.lo
	}
	p.curve(s, []float64{q.x, q.x}, []float64{math.Max(lo, p.Y.Lo), math.Min(q.y+q.up, p.Y.Hi)})
	p.DrawGlyph(draw.GlyphStyle{Color: col, Radius: vg.Points(1.9), Shape: columnShapes[q.column%len(columnShapes)]}, p.at(q.x, q.y))
}

// arrow draws a bar and an arrow of 8 points from it: dir −1 down, +1 up.
func (p panel) arrow(s draw.LineStyle, at vg.Point, dir vg.Length) {
	tip := at.Y + 8*dir
	p.StrokeLine2(s, at.X-2.5, at.Y, at.X+2.5, at.Y)
	p.StrokeLine2(s, at.X, at.Y, at.X, tip)
	p.FillPolygon(s.Color, []vg.Point{{X: at.X, Y: tip + dir}, {X: at.X - 1.8, Y: tip - 2.5*dir}, {X: at.X + 1.8, Y: tip - 2.5*dir}})
}

// growthKey says in the upper left corner what the curves are, where the curve
// of growth never is.
func (p panel) growthKey(g cog.Result, place *placer) {
	var words []string
	for i, n := range g.LogN {
		name := "N"
		if len(g.LogN) > 1 {
			name = "N(" + plain(value(g.Levels, i)) + ")"
		}
		words = append(words, "log "+name+" "+printLog(n).marked())
	}
	words = append(words, "b "+printNumber(g.B, 1, 2).marked()+" km s^{−1}")
	sty := letters(textSize, ink, text.XLeft, text.YTop)
	x, y := p.Min.X+vg.Points(7), p.Max.Y-vg.Points(6)
	wide := vg.Length(0)
	for i, w := range words {
		shift := vg.Length(0)
		switch {
		case i == len(words)-1:
			p.StrokeLine2(stroke(blue, bold), x, y-vg.Points(4), x+vg.Points(swatchWide), y-vg.Points(4))
			shift = vg.Points(swatchWide + 3)
		case len(g.LogN) > 1:
			p.DrawGlyph(draw.GlyphStyle{Color: columnColours[i%len(columnColours)], Radius: vg.Points(1.9), Shape: columnShapes[i%len(columnShapes)]},
				vg.Point{X: x + vg.Points(swatchWide/2), Y: y - vg.Points(4)})
			shift = vg.Points(swatchWide + 3)
		}
		p.FillText(sty, vg.Point{X: x + shift, Y: y}, w)
		wide = max(wide, shift+width(sty, w))
		y -= vg.Points(10)
	}
	place.taken = append(place.taken, vg.Rectangle{Min: vg.Point{X: x, Y: y}, Max: vg.Point{X: x + wide, Y: p.Max.Y}})
}

func drawResiduals(c draw.Canvas, area vg.Rectangle, x axis, ps []growthPoint) {
	p := newPanel(c, area, x, axis{})
	top := 2.0
	for _, q := range ps {
		if !q.limit && finite(q.residual) {
			top = math.Max(top, math.Abs(q.residual)+1)
		}
	}
	top = math.Ceil(top) + 0.3
	step, m, exp := niceBelow(0.9 * top)
	label := number(float64(m)*math.Pow(10, float64(exp)), max(0, -exp))
	p.Y = axis{Lo: -top, Hi: top, Ticks: []tick{{-step, "−" + label}, {0, "0"}, {step, label}}}
	p.horizontal(stroke(midGrey, hair, 1, 1.5), 1)
	p.horizontal(stroke(midGrey, hair, 1, 1.5), -1)
	p.horizontal(stroke(midGrey, fine), 0)
	for _, q := range ps {
		if !q.limit && finite(q.residual) {
			col := columnColours[q.column%len(columnColours)]
			p.curve(stroke(col, medium), []float64{q.x, q.x}, []float64{q.residual - 1, q.residual + 1})
			p.DrawGlyph(draw.GlyphStyle{Color: col, Radius: vg.Points(1.9), Shape: columnShapes[q.column%len(columnShapes)]}, p.at(q.x, q.residual))
		}
	}
	p.frame(true, true)
	side := letters(textSize, ink, text.XCenter, text.YTop)
	side.Rotation = math.Pi / 2
	p.FillText(side, vg.Point{X: area.Min.X - vg.Points(31), Y: p.Center().Y}, "ΔW / σ")
	p.FillText(letters(textSize, ink, text.XCenter, text.YTop), vg.Point{X: p.Center().X, Y: area.Min.Y - vg.Points(12)}, "log (N f λ), N in cm^{−2}, λ in Å")
}

func growthCaption(sightline string, g cog.Result, ps []growthPoint) string {
	var b strings.Builder
	fmt.Fprintf(&b, "Curve of growth of %s towards %s at the fitted column. Solid: curve for b = %s km/s; dashed: b ± 1σ; dotted: weak-line relation; "+
		"arrows: limits; below: residuals in units of σ. Right: Δχ² contours. χ² = %.1f for %d degrees of freedom.",
		plain(g.Species), plain(sightline), printNumber(g.B, 1, 2).text(), g.Chi2, g.DOF)
	if missing := len(g.Lines) - len(ps); missing > 0 {
		fmt.Fprintf(&b, " Not drawn: %s without a place on the axes.", count(missing, "line"))
	}
	return b.String()
}
