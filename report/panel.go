package report

import (
	"image/color"
	"math"
	"strconv"
	"strings"

	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// An axis is a linear scale from Lo to Hi.
type axis struct {
	Lo, Hi float64
	Ticks  []tick
}

type tick struct {
	At    float64
	Label string // "" for a minor tick
}

// A panel is one data area, placed exactly, with its two scales.
type panel struct {
	draw.Canvas // its rectangle is the data area
	X, Y        axis
}

func newPanel(c draw.Canvas, area vg.Rectangle, x, y axis) panel {
	return panel{Canvas: draw.Canvas{Canvas: c.Canvas, Rectangle: area}, X: x, Y: y}
}

func (p panel) px(x float64) vg.Length { return p.Canvas.X((x - p.X.Lo) / (p.X.Hi - p.X.Lo)) }
func (p panel) py(y float64) vg.Length { return p.Canvas.Y((y - p.Y.Lo) / (p.Y.Hi - p.Y.Lo)) }
func (p panel) at(x, y float64) vg.Point {
	return vg.Point{X: p.px(x), Y: p.py(y)}
}

func finite(xs ...float64) bool {
	for _, x := range xs {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return false
		}
	}
	return true
}

// curve strokes a line through data points, broken where one is not finite and
// cut at the frame.
func (p panel) curve(s draw.LineStyle, x, y []float64) {
	var pts []vg.Point
	flush := func() {
		if len(pts) > 1 {
			p.StrokeLines(s, p.ClipLinesXY(pts)...)
		}
		pts = nil
	}
	for i := range x {
		if !finite(x[i], y[i]) {
			flush()
			continue
		}
		pts = append(pts, p.at(x[i], p.reach(y[i])))
	}
	flush()
}

// reach keeps a value within a few heights of the panel, so that a wild pixel
// does not spoil the drawing's coordinates.
func (p panel) reach(y float64) float64 {
	h := p.Y.Hi - p.Y.Lo
	return math.Max(p.Y.Lo-3*h, math.Min(p.Y.Hi+3*h, y))
}

// region fills the polygon through data points, cut at the frame.
func (p panel) region(c color.Color, x, y []float64) {
	pts := make([]vg.Point, 0, len(x))
	for i := range x {
		if !finite(x[i], y[i]) {
			return
		}
		pts = append(pts, p.at(x[i], p.reach(y[i])))
	}
	if pts = p.ClipPolygonXY(pts); len(pts) > 2 {
		p.FillPolygon(c, pts)
	}
}

// column fills lo..hi in x over the full height.
func (p panel) column(c color.Color, lo, hi float64) {
	lo, hi = math.Max(lo, p.X.Lo), math.Min(hi, p.X.Hi)
	if lo < hi {
		p.region(c, []float64{lo, hi, hi, lo}, []float64{p.Y.Lo, p.Y.Lo, p.Y.Hi, p.Y.Hi})
	}
}

func (p panel) horizontal(s draw.LineStyle, y float64) {
	p.curve(s, []float64{p.X.Lo, p.X.Hi}, []float64{y, y})
}

func (p panel) vertical(s draw.LineStyle, x float64) {
	if x >= p.X.Lo && x <= p.X.Hi {
		p.curve(s, []float64{x, x}, []float64{p.Y.Lo, p.Y.Hi})
	}
}

// frame draws all four sides with ticks inward, and the labels below and left.
// Labels of x are left out of all but the lowest of stacked panels.
func (p panel) frame(labelX, labelY bool) {
	path := make(vg.Path, 0, 8+4*(len(p.X.Ticks)+len(p.Y.Ticks)))
	for i, c := range corners(p.Rectangle) {
		if i == 0 {
			path.Move(c)
		} else {
			path.Line(c)
		}
	}
	path.Close()
	mark := func(x, y, dx, dy vg.Length) {
		path.Move(vg.Point{X: x, Y: y})
		path.Line(vg.Point{X: x + dx, Y: y + dy})
	}
	long := func(t tick) vg.Length {
		if t.Label == "" {
			return vg.Points(1.5)
		}
		return vg.Points(3)
	}
	for _, t := range p.X.Ticks {
		x := p.px(t.At)
		mark(x, p.Min.Y, 0, long(t))
		mark(x, p.Max.Y, 0, -long(t))
	}
	for _, t := range p.Y.Ticks {
		y := p.py(t.At)
		mark(p.Min.X, y, long(t), 0)
		mark(p.Max.X, y, -long(t), 0)
	}
	p.SetLineStyle(stroke(ink, fine))
	p.Stroke(path)
	for _, t := range p.X.Ticks {
		if labelX && t.Label != "" {
			p.FillText(letters(textSize, ink, text.XCenter, text.YTop), vg.Point{X: p.px(t.At), Y: p.Min.Y - vg.Points(2)}, t.Label)
		}
	}
	for _, t := range p.Y.Ticks {
		if labelY && t.Label != "" {
			p.FillText(letters(textSize, ink, text.XRight, text.YCenter), vg.Point{X: p.Min.X - vg.Points(2.5), Y: p.py(t.At)}, t.Label)
		}
	}
}

// ticks returns major ticks at 1, 2 or 5 times a power of ten, at most n of
// them, and minor ones between. margin is the part of the range at either end
// in which no tick is labelled, so that labels of neighbours do not meet.
func ticks(lo, hi float64, n int, margin float64) []tick {
	if !finite(lo, hi) || !(hi > lo) {
		return nil
	}
	step, mantissa, exp := niceStep((hi - lo) / float64(max(n, 1)))
	minor := 5
	if mantissa == 2 {
		minor = 4
	}
	var out []tick
	small := step / float64(minor)
	edge := margin * (hi - lo)
	for i := math.Ceil(lo/small - 1e-9); i*small <= hi+1e-9*small; i++ {
		t := tick{At: i * small}
		if int(i)%minor == 0 && t.At >= lo+edge-1e-9*small && t.At <= hi-edge+1e-9*small {
			t.Label = number(t.At, max(0, -exp))
		}
		out = append(out, t)
	}
	return out
}

// labelled counts the ticks with a label.
func labelled(ts []tick) int {
	n := 0
	for _, t := range ts {
		if t.Label != "" {
			n++
		}
	}
	return n
}

// niceStep returns the smallest step of 1, 2 or 5 times 10ᵉˣᵖ that is not below s.
func niceStep(s float64) (step float64, mantissa, exp int) {
	exp = int(math.Floor(math.Log10(s)))
	for {
		for _, m := range []int{1, 2, 5} {
			if step = float64(m) * math.Pow(10, float64(exp)); step >= s*(1-1e-9) {
				return step, m, exp
			}
		}
		exp++
	}
}

// niceBelow returns the largest of 1, 2, 5 times 10ᵉˣᵖ that is not above s.
func niceBelow(s float64) (x float64, mantissa, exp int) {
	exp = int(math.Floor(math.Log10(s))) + 1
	for {
		for _, m := range []int{5, 2, 1} {
			if x = float64(m) * math.Pow(10, float64(exp)); x <= s*(1+1e-9) {
				return x, m, exp
			}
		}
		exp--
	}
}

// number prints x with d decimals and a true minus sign; never "−0".
func number(x float64, d int) string {
	s := strconv.FormatFloat(x, 'f', d, 64)
	if digits, ok := strings.CutPrefix(s, "-"); ok {
		if strings.Trim(digits, "0.") == "" {
			return digits
		}
		return "−" + digits
	}
	return s
}
