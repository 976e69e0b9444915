package report

import (
	"fmt"
	"math"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"lacuna/measure"
	"lacuna/spectrum/frame"
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
