package report

import (
	"fmt"
	"math"
	"sort"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"lacuna/cog"
)

// drawContours draws the curves of equal Δχ² of the first column and b, and the
// best fit with its errors.
func drawContours(c draw.Canvas, area vg.Rectangle, g cog.Result) {
	xs, ys := []float64{}, []float64{}
	for _, k := range g.Contours {
		xs, ys = append(xs, k.LogN...), append(ys, k.B...)
	}
	n := g.LogN[0]
	xs, ys = append(xs, n.X), append(ys, g.B.X)
	p := newPanel(c, area, spread(xs), spread(ys))
	for i, k := range g.Contours {
		s := stroke(blue, bold)
		if i > 0 {
			s = stroke(vermilion, medium, 4, 2)
		}
		p.curve(s, k.LogN, k.B)
	}
	cross := stroke(ink, medium)
	if n.Kind() == "value" && g.B.Kind() == "value" {
		lo, hi := math.Max(n.X-n.ErrLo(), p.X.Lo), math.Min(n.X+n.ErrUp(), p.X.Hi)
		p.curve(cross, []float64{lo, hi}, []float64{g.B.X, g.B.X})
		lo, hi = math.Max(g.B.X-g.B.ErrLo(), p.Y.Lo), math.Min(g.B.X+g.B.ErrUp(), p.Y.Hi)
		p.curve(cross, []float64{n.X, n.X}, []float64{lo, hi})
	}
	p.DrawGlyph(draw.GlyphStyle{Color: ink, Radius: vg.Points(1.9), Shape: draw.CircleGlyph{}}, p.at(n.X, g.B.X))
	var key []keyEntry
	for i, k := range g.Contours {
		s := stroke(blue, bold)
		if i > 0 {
			s = stroke(vermilion, medium, 4, 2)
		}
		words := fmt.Sprintf("Δχ^{2} = %.2f", k.Delta)
		if k.Open != "" {
			words += ", open in " + plain(k.Open)
		}
		key = append(key, keyEntry{words, lineSwatch(s)})
	}
	key = append(key, keyEntry{"best fit, 1σ of each", lineSwatch(cross)})
	// above the panel, where it can cover nothing
	wide := vg.Length(0)
	for _, e := range key {
		wide += keyWidth(e)
	}
	x := max(c.Center().X+vg.Points(4), area.Max.X-wide+vg.Points(9))
	drawKey(c, [][]keyEntry{key}, vg.Point{X: x, Y: area.Max.Y + vg.Points(13)})
	p.frame(true, true)
	species := plain(g.Species)
	if len(g.Levels) > 0 && g.Levels[0] != "" {
		species = plain(g.Levels[0])
	}
	side := letters(textSize, ink, text.XCenter, text.YTop)
	side.Rotation = math.Pi / 2
	p.FillText(side, vg.Point{X: area.Min.X - vg.Points(31), Y: p.Center().Y}, "b (km s^{−1})")
	p.FillText(letters(textSize, ink, text.XCenter, text.YTop), vg.Point{X: p.Center().X, Y: area.Min.Y - vg.Points(12)}, "log N("+species+"), N in cm^{−2}")
}

// spread is an axis that holds all points with some room.
func spread(xs []float64) axis {
	var ok []float64
	for _, x := range xs {
		if finite(x) {
			ok = append(ok, x)
		}
	}
	if len(ok) == 0 {
		ok = []float64{0, 1}
	}
	sort.Float64s(ok)
	lo, hi := ok[0], ok[len(ok)-1]
	pad := 0.08 * (hi - lo)
	if !(pad > 0) {
		pad = math.Max(0.1, 0.05*math.Abs(hi))
	}
	a := axis{Lo: lo - pad, Hi: hi + pad}
	a.Ticks = ticks(a.Lo, a.Hi, 6, 0)
	return a
}
