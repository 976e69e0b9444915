package report

import (
	"fmt"

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

func (s *stack) sheet() sheet {
	return sheet{title: s.title, note: s.note, xLabel: s.xLabel, key: s.key, cols: s.cols, rows: s.rows, blocks: len(s.blocks),
		top: s.top(), height: s.blockHeight(), wide: s.wide,
		yLabels: []string{"F / F_{c}; below: N_{a}(v) in cm^{−2} (km s^{−1})^{−1}", "F / F_{c}; below: N_{a}(v)"}}
}

func (s *stack) size() (w, h vg.Length) { return s.sheet().size() }

func (s *stack) draw(c draw.Canvas) {
	s.sheet().draw(c, func(i int, at vg.Point, lowest bool) { s.drawBlock(c, s.blocks[i], at, lowest) })
}
