package report

import "gonum.org/v1/plot/vg"

// A placer finds room for labels beside points, so that no label covers another
// label or a point.
type placer struct {
	area  vg.Rectangle
	taken []vg.Rectangle
}

// block keeps a square of the given half-width about a point free.
func (p *placer) block(at vg.Point, half vg.Length) {
	p.taken = append(p.taken, vg.Rectangle{Min: vg.Point{X: at.X - half, Y: at.Y - half}, Max: vg.Point{X: at.X + half, Y: at.Y + half}})
}

// place returns the lower left corner of a box of the given size near a point,
// whether it lies so far off that it needs a leader, and false where every place
// about the point is taken.
func (p *placer) place(at vg.Point, w, h, gap vg.Length) (corner vg.Point, leader, ok bool) {
	for _, far := range []vg.Length{1, 2.2, 3.6} {
		g := gap * far
		for _, c := range []vg.Point{
			{X: at.X + g, Y: at.Y - h - g/2}, {X: at.X - w - g, Y: at.Y + g/2}, // right below, left above
			{X: at.X + g, Y: at.Y - h/2}, {X: at.X - w - g, Y: at.Y - h/2}, // right, left
			{X: at.X - w/2, Y: at.Y - h - g}, {X: at.X - w/2, Y: at.Y + g}, // below, above
			{X: at.X + g, Y: at.Y + g/2}, {X: at.X - w - g, Y: at.Y - h - g/2}, // right above, left below
		} {
			box := vg.Rectangle{Min: c, Max: vg.Point{X: c.X + w, Y: c.Y + h}}
			if box.Min.X < p.area.Min.X || box.Max.X > p.area.Max.X || box.Min.Y < p.area.Min.Y || box.Max.Y > p.area.Max.Y || p.hits(box) {
				continue
			}
			const room = 1.5 // between labels
			p.taken = append(p.taken, vg.Rectangle{Min: vg.Point{X: c.X - room, Y: c.Y - room}, Max: vg.Point{X: box.Max.X + room, Y: box.Max.Y + room}})
			return c, far > 1, true
		}
	}
	return vg.Point{}, false, false
}

func (p *placer) hits(box vg.Rectangle) bool {
	for _, t := range p.taken {
		if box.Min.X < t.Max.X && t.Min.X < box.Max.X && box.Min.Y < t.Max.Y && t.Min.Y < box.Max.Y {
			return true
		}
	}
	return false
}
