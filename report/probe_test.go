package report

import (
	"fmt"
	"image"
	"image/color"
	"math"

	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// A probe is a canvas that notes what is drawn and where, in page coordinates.
type probe struct {
	now   matrix
	saved []matrix
	texts []probedText
	paths vg.Rectangle // of all paths
	bad   []string
}

type probedText struct {
	text string
	box  vg.Rectangle
	size float64
}

// A matrix maps (x, y) to (a x + c y + e, b x + d y + f).
type matrix struct{ a, b, c, d, e, f float64 }

func (m matrix) of(p vg.Point) vg.Point {
	x, y := float64(p.X), float64(p.Y)
	return vg.Point{X: vg.Length(m.a*x + m.c*y + m.e), Y: vg.Length(m.b*x + m.d*y + m.f)}
}

func (m matrix) then(n matrix) matrix { // n inside m
	return matrix{m.a*n.a + m.c*n.b, m.b*n.a + m.d*n.b, m.a*n.c + m.c*n.d, m.b*n.c + m.d*n.d, m.a*n.e + m.c*n.f + m.e, m.b*n.e + m.d*n.f + m.f}
}

// probed draws a figure on a probe.
func probed(f Figure) *probe {
	p := &probe{now: matrix{a: 1, d: 1}, paths: vg.Rectangle{Min: vg.Point{X: vg.Length(math.Inf(1)), Y: vg.Length(math.Inf(1))}, Max: vg.Point{X: vg.Length(math.Inf(-1)), Y: vg.Length(math.Inf(-1))}}}
	f.draw(draw.NewCanvas(p, f.Width, f.Height))
	return p
}

func (p *probe) SetLineWidth(vg.Length)             {}
func (p *probe) SetLineDash([]vg.Length, vg.Length) {}
func (p *probe) SetColor(color.Color)               {}
func (p *probe) Rotate(r float64) {
	s, c := math.Sincos(r)
	p.now = p.now.then(matrix{a: c, b: s, c: -s, d: c})
}
func (p *probe) Translate(t vg.Point) {
	p.now = p.now.then(matrix{a: 1, d: 1, e: float64(t.X), f: float64(t.Y)})
}
func (p *probe) Scale(x, y float64)  { p.now = p.now.then(matrix{a: x, d: y}) }
func (p *probe) Push()               { p.saved = append(p.saved, p.now) }
func (p *probe) Pop()                { p.now, p.saved = p.saved[len(p.saved)-1], p.saved[:len(p.saved)-1] }
func (p *probe) Stroke(path vg.Path) { p.path(path) }
func (p *probe) Fill(path vg.Path)   { p.path(path) }
func (p *probe) path(path vg.Path) {
	for _, c := range path {
		if c.Type == vg.CloseComp {
			continue
		}
		at := p.now.of(c.Pos)
		if !finite(float64(at.X), float64(at.Y)) {
			p.bad = append(p.bad, fmt.Sprintf("a path goes to %v", at))
			continue
		}
		p.paths = union(p.paths, vg.Rectangle{Min: at, Max: at})
	}
}
func (p *probe) FillString(f font.Face, at vg.Point, s string) {
	size := f.Font.Size
	wide := f.Width(s)
	var box vg.Rectangle
	for i, c := range []vg.Point{{X: at.X, Y: at.Y - 0.2*size}, {X: at.X + wide, Y: at.Y - 0.2*size}, {X: at.X, Y: at.Y + 0.72*size}, {X: at.X + wide, Y: at.Y + 0.72*size}} {
		q := p.now.of(c)
		if !finite(float64(q.X), float64(q.Y)) {
			p.bad = append(p.bad, fmt.Sprintf("text %q at %v", s, q))
			return
		}
		if i == 0 {
			box = vg.Rectangle{Min: q, Max: q}
		}
		box = union(box, vg.Rectangle{Min: q, Max: q})
	}
	p.texts = append(p.texts, probedText{s, box, float64(size)})
}
func (p *probe) DrawImage(vg.Rectangle, image.Image) { p.bad = append(p.bad, "an image") }

func union(a, b vg.Rectangle) vg.Rectangle {
	return vg.Rectangle{Min: vg.Point{X: min(a.Min.X, b.Min.X), Y: min(a.Min.Y, b.Min.Y)}, Max: vg.Point{X: max(a.Max.X, b.Max.X), Y: max(a.Max.Y, b.Max.Y)}}
}
