package report

import (
	"math"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// A sheet is a page of blocks of equal height in one or two columns, under a title
// and a key, with one velocity axis below each column.
type sheet struct {
	title, note, xLabel string
	yLabels             []string // the first that fits is written beside each column
	key                 [][]keyEntry
	cols, rows, blocks  int
	top, height         float64   // points: of title and key, of a block
	wide                vg.Length // of a data area
}

func (s sheet) size() (w, h vg.Length) {
	w = oneColumn
	if s.cols == 2 {
		w = twoColumn
	}
	return w, vg.Points(s.top + float64(s.rows)*s.height + axisBelow)
}

// draw writes what the blocks share and calls block for each, with the upper left
// corner of its data area and whether it is the lowest of its column.
func (s sheet) draw(c draw.Canvas, block func(i int, at vg.Point, lowest bool)) {
	y := c.Max.Y - vg.Points(4)
	left := c.Min.X + vg.Points(marginRight)
	heading := heavy(letters(titleSize, ink, text.XLeft, text.YTop))
	c.FillText(heading, vg.Point{X: left, Y: y}, s.title)
	sty := letters(textSize, ink, text.XRight, text.YTop)
	if width(heading, s.title)+width(sty, s.note)+vg.Points(12) < c.Max.X-c.Min.X-vg.Points(2*marginRight) {
		c.FillText(sty, vg.Point{X: c.Max.X - vg.Points(marginRight), Y: y - vg.Points(1)}, s.note)
	}
	drawKey(c, s.key, vg.Point{X: left, Y: y - vg.Points(titleSize+5)})
	column := (c.Max.X - c.Min.X) / vg.Length(s.cols)
	top := c.Max.Y - vg.Points(s.top)
	for k := range s.cols {
		first, last := k*s.rows, min((k+1)*s.rows, s.blocks)
		if first >= last {
			break
		}
		x := c.Min.X + vg.Length(k)*column
		for i := first; i < last; i++ {
			block(i, vg.Point{X: x + vg.Points(marginLeft), Y: top - vg.Points(float64(i-first)*s.height)}, i == last-1)
		}
		below := top - vg.Points(float64(last-first)*s.height-blockGap)
		c.FillText(letters(textSize, ink, text.XCenter, text.YTop),
			vg.Point{X: x + vg.Points(marginLeft) + s.wide/2, Y: below - vg.Points(11)}, s.xLabel)
		side := letters(textSize, ink, text.XCenter, text.YTop)
		side.Rotation = math.Pi / 2
		words := ""
		for _, words = range s.yLabels {
			if width(side, words) <= top-below {
				break
			}
		}
		c.FillText(side, vg.Point{X: x + vg.Points(2), Y: (top + below) / 2}, words)
	}
}
