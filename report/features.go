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
	name    string
	v       float64    // km/s in the scale of the panel's line
	reach   [2]float64 // km/s in which it may absorb
	row     int        // 0 nearest the spectrum; −1: without a name
	shared  bool       // a neighbour of the same name bears it
	outside bool       // its centre is beyond the panel; v is the nearer edge
	tick    vg.Length  // from the panel's left edge
	centre  vg.Length  // of the name, likewise
	half    vg.Length  // half the room that the name takes
}

const (
	rowHeight  = 8.5 // points, a name of a blend
	tickLength = 5.0
	maxRows    = 3
	nameGap    = 6.0 // between names
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
		switch { // it comes in from outside
		case m.v < lo:
			m.v, m.name, m.outside = lo, "← "+m.name, true
		case m.v > hi:
			m.v, m.name, m.outside = hi, m.name+" →", true
		}
		marks = append(marks, m)
	}
	sort.SliceStable(marks, func(i, j int) bool { return marks[i].v < marks[j].v })
	sty := letters(textSize, purpleInk, text.XCenter, text.YBottom)
	for i := range marks {
		marks[i].half = width(sty, marks[i].name)/2 + nameGap/2
		marks[i].tick = vg.Length((marks[i].v-lo)/(hi-lo)) * wide
		marks[i].row = -1
	}
	for i := range marks {
		m := &marks[i]
		for _, o := range marks[:i] { // two lines of one name, side by side: one name does
			m.shared = m.shared || o.name == m.name && o.row >= 0 && m.tick-o.tick < 12
		}
		if m.shared || 2*m.half > wide {
			continue
		}
		// beside its tick where the next tick would run into a centred name
		shifts := []vg.Length{0, -m.half + nameGap, m.half - nameGap}
		if i+1 < len(marks) && marks[i+1].name != m.name && marks[i+1].tick-m.tick < m.half {
			shifts[0], shifts[1] = shifts[1], shifts[0]
		}
		m.find(marks[:i], shifts, wide)
		rows = max(rows, m.row+1)
	}
	return marks, rows
}

// find gives a mark the lowest row and the first shift of its name at which it is
// clear of the others.
func (m *mark) find(others []mark, shifts []vg.Length, wide vg.Length) {
	for row := range maxRows {
		for _, s := range shifts {
			at := min(max(m.tick+s, m.half), wide-m.half)
			free := true
			for _, o := range others {
				switch {
				case o.row == row && at-m.half < o.centre+o.half && o.centre-o.half < at+m.half,
					o.row >= 0 && o.row < row && !m.outside && m.tick > o.centre-o.half && m.tick < o.centre+o.half,
					o.row > row && !o.outside && o.tick > at-m.half && o.tick < at+m.half:
					free = false
				}
			}
			if free {
				m.row, m.centre = row, at
				return
			}
		}
	}
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
		if !m.outside {
			p.StrokeLine2(line, p.px(m.v), foot, p.px(m.v), head)
		}
		// how far it reaches, unless that is most of the panel
		if r := m.reach[1] - m.reach[0]; r > 0 && r < 0.6*(p.X.Hi-p.X.Lo) {
			p.StrokeLine2(stroke(purpleInk, hair), p.px(m.reach[0]), foot, p.px(m.reach[1]), foot)
		}
		if m.row >= 0 {
			p.FillText(sty, vg.Point{X: p.Min.X + m.centre, Y: head}, m.name)
		}
	}
}
