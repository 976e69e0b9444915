package report

import (
	"math"
	"sort"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"

	"lacuna/atomic"
	"lacuna/measure"
)

// A mark is one blend of a panel: its tick, its name, and the row of the name.
type mark struct {
	name   string
	v      float64    // km/s in the scale of the panel's line
	reach  [2]float64 // km/s in which it may absorb
	row    int        // 0 nearest the spectrum; −1: no room for the name
	centre vg.Length  // of the name, from the panel's left edge
}

const (
	rowHeight  = 8.5 // points, a name of a blend
	tickLength = 5.0
	maxRows    = 3
)

// placeMarks gives each blend that touches lo..hi (km/s about wave, Å) a place in
// a panel of the given width, so that no name lies on another name or on
// another's tick. Names that find no room keep their tick.
func placeMarks(features []measure.Feature, wave, lo, hi float64, wide vg.Length) (marks []mark, rows int) {
	for _, f := range features {
		v := atomic.C * (f.Wave/wave - 1)
		m := mark{name: plain(f.Name), v: v, reach: [2]float64{v + f.Range[0], v + f.Range[1]}}
		if !finite(m.v, m.reach[0], m.reach[1]) || m.reach[1] < lo || m.reach[0] > hi {
			continue
		}
		m.reach[0], m.reach[1] = math.Max(m.reach[0], lo), math.Min(m.reach[1], hi)
		if m.v < lo || m.v > hi { // its wing comes in from outside
			m.v = (m.reach[0] + m.reach[1]) / 2
		}
		marks = append(marks, m)
	}
	sort.SliceStable(marks, func(i, j int) bool { return marks[i].v < marks[j].v })
	sty := letters(textSize, purpleInk, text.XCenter, text.YBottom)
	const gap = 6
	for i := range marks {
		m := &marks[i]
		half := width(sty, m.name)/2 + gap/2
		tick := vg.Length((m.v-lo)/(hi-lo)) * wide
		m.centre = min(max(tick, half), wide-half)
		m.row = -1
		for row := 0; row < maxRows && m.row < 0 && 2*half <= wide; row++ {
			free := true
			for _, o := range marks[:i] {
				oHalf := width(sty, o.name)/2 + gap/2
				oTick := vg.Length((o.v-lo)/(hi-lo)) * wide
				switch {
				case o.row == row && m.centre-half < o.centre+oHalf && o.centre-oHalf < m.centre+half,
					o.row >= 0 && o.row < row && math.Abs(float64(tick-o.centre)) < float64(oHalf),
					o.row > row && math.Abs(float64(oTick-m.centre)) < float64(half):
					free = false
				}
			}
			if free {
				m.row = row
			}
		}
		rows = max(rows, m.row+1)
	}
	return marks, rows
}

// drawMarks puts the ticks and names of blends above the spectrum.
func (p panel) drawMarks(marks []mark, rows int) {
	if len(marks) == 0 {
		return
	}
	sty := letters(textSize, purpleInk, text.XCenter, text.YBottom)
	base := p.Max.Y - vg.Points(1.5+rowHeight*float64(rows)) // lower edge of row 0
	line := stroke(purpleInk, medium)
	for _, m := range marks {
		foot := base - vg.Points(tickLength-1.5*float64(min(max(m.row, 0), 2)))
		head := base + vg.Points(rowHeight*float64(max(m.row, 0)))
		p.StrokeLine2(line, p.px(m.v), foot, p.px(m.v), head)
		if m.reach[1] > m.reach[0] {
			p.StrokeLine2(stroke(purpleInk, hair), p.px(m.reach[0]), foot, p.px(m.reach[1]), foot)
		}
		if m.row >= 0 {
			p.FillText(sty, vg.Point{X: p.Min.X + m.centre, Y: head}, m.name)
		}
	}
}
