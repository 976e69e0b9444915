package report

import (
	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"lacuna/measure"
)

// A keyEntry explains one sign of a figure: a swatch 14 × 6 points, and words.
type keyEntry struct {
	words  string
	swatch func(c draw.Canvas, r vg.Rectangle)
}

const (
	swatchWide = 13.0
	swatchHigh = 6.0
)

// layKey breaks entries into rows no wider than wide.
func layKey(entries []keyEntry, wide vg.Length) [][]keyEntry {
	var rows [][]keyEntry
	used := vg.Length(0)
	for _, e := range entries {
		w := keyWidth(e)
		if len(rows) == 0 || used+w > wide {
			rows, used = append(rows, nil), 0
		}
		rows[len(rows)-1] = append(rows[len(rows)-1], e)
		used += w
	}
	return rows
}

func keyWidth(e keyEntry) vg.Length {
	return vg.Points(swatchWide+3+9) + width(letters(textSize, ink, 0, 0), e.words)
}

// drawKey draws rows of entries from the upper left corner pt.
func drawKey(c draw.Canvas, rows [][]keyEntry, pt vg.Point) {
	sty := letters(textSize, ink, text.XLeft, text.YCenter)
	for _, row := range rows {
		x, mid := pt.X, pt.Y-vg.Points(keyRow/2)
		for _, e := range row {
			e.swatch(c, vg.Rectangle{Min: vg.Point{X: x, Y: mid - vg.Points(swatchHigh/2)}, Max: vg.Point{X: x + vg.Points(swatchWide), Y: mid + vg.Points(swatchHigh/2)}})
			c.FillText(sty, vg.Point{X: x + vg.Points(swatchWide+3), Y: mid}, e.words)
			x += keyWidth(e)
		}
		pt.Y -= vg.Points(keyRow)
	}
}

func lineSwatch(s draw.LineStyle) func(draw.Canvas, vg.Rectangle) {
	return func(c draw.Canvas, r vg.Rectangle) {
		y := (r.Min.Y + r.Max.Y) / 2
		c.StrokeLine2(s, r.Min.X, y, r.Max.X, y)
	}
}

// stackKey lists the signs that occur in a velocity stack.
func stackKey(ws []measure.Width, blocks []block) []keyEntry {
	var masked, used, placed, level, blends bool
	for i, w := range ws {
		for _, b := range w.Profile.Bad {
			masked = masked || b
		}
		for _, u := range w.Profile.Used {
			used = used || u
		}
		placed = placed || len(w.Profile.Placement) > 0
		level = level || w.Zero.Level != 0
		blends = blends || len(blocks[i].marks) > 0
	}
	out := []keyEntry{{"data", func(c draw.Canvas, r vg.Rectangle) {
		a, b, m := r.Min.Y+vg.Points(1), r.Max.Y-vg.Points(1), (r.Min.X+r.Max.X)/2
		c.StrokeLines(stroke(ink, medium), []vg.Point{{X: r.Min.X, Y: b}, {X: m - 3, Y: b}, {X: m - 3, Y: a}, {X: m + 3, Y: a}, {X: m + 3, Y: b}, {X: r.Max.X, Y: b}})
	}}}
	words := "continuum"
	if placed {
		words = "continuum, placement error"
	}
	out = append(out, keyEntry{words, func(c draw.Canvas, r vg.Rectangle) {
		if placed {
			c.FillPolygon(paleOrange, corners(r))
		}
		lineSwatch(stroke(vermilion, fine, 3, 1.5))(c, r)
	}})
	out = append(out, keyEntry{"integration range", func(c draw.Canvas, r vg.Rectangle) {
		c.FillPolygon(paleBlue, corners(r))
		s := stroke(blue, hair, 2, 1.2)
		c.StrokeLine2(s, r.Min.X, r.Min.Y, r.Min.X, r.Max.Y)
		c.StrokeLine2(s, r.Max.X, r.Min.Y, r.Max.X, r.Max.Y)
	}})
	if used {
		out = append(out, keyEntry{"continuum pixels", lineSwatch(stroke(green, 1.6))})
	}
	if level {
		out = append(out, keyEntry{"zero level", lineSwatch(stroke(green, fine, 5, 1.5, 1, 1.5))})
	}
	if masked {
		out = append(out, keyEntry{"masked", func(c draw.Canvas, r vg.Rectangle) { c.FillPolygon(paleGrey, corners(r)) }})
	}
	if blends {
		out = append(out, keyEntry{"blend", func(c draw.Canvas, r vg.Rectangle) {
			m := (r.Min.X + r.Max.X) / 2
			s := stroke(purpleInk, medium)
			c.StrokeLine2(s, m, r.Min.Y, m, r.Max.Y)
			c.StrokeLine2(s, m-4, r.Min.Y, m+4, r.Min.Y)
		}})
	}
	return out
}
