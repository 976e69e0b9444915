package report

import (
	"fmt"
	"math"
	"slices"
	"sort"
	"strings"

	"gonum.org/v1/gonum/interp"
	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"lacuna/atomic"
	"lacuna/config"
	"lacuna/survey"
)

// CloudFigures draws each fit of a sightline: for every line the data in steps, the
// model, each cloud alone where it is deeper than 0.5 %, the clouds' places with their
// numbers, and below the residuals in σ with ±1. Up to 12 lines share a figure.
func CloudFigures(r survey.Record) []Figure {
	var out []Figure
	for _, f := range r.Result.Fits {
		all := fitBlocks(f)
		pages := (len(all) + 2*rowsAPage - 1) / (2 * rowsAPage)
		for k := range pages {
			bs := all[k*len(all)/pages : (k+1)*len(all)/pages]
			s := newCloudStack(f, bs, velocityLabel(r.Result.Frame))
			s.title = plain(r.Name) + ": " + plain(f.Name)
			fig := Figure{Name: figureName(r.Name, "clouds-"+config.Slug(f.Name)), Title: s.title, Caption: cloudCaption(r, f)}
			if pages > 1 {
				fig.Title += fmt.Sprintf(" (%d of %d)", k+1, pages)
				s.title = fig.Title
				if k > 0 {
					fig.Name += fmt.Sprintf("-%d", k+1)
				}
			}
			s.note = fitNote(f)
			fig.Width, fig.Height = s.size()
			fig.draw = s.draw
			out = append(out, fig)
		}
	}
	return out
}

// fitNote is what stands at the right of the title.
func fitNote(f survey.Fit) string {
	r := f.Result
	return fmt.Sprintf("χ² = %s for %d", number(r.Chi2, 1), r.DOF)
}

func cloudCaption(r survey.Record, f survey.Fit) string {
	var b strings.Builder
	fmt.Fprintf(&b, "Clouds fitted to %s towards %s. %s. Steps: flux over the fitted continuum (grey: not used); thick line: model after the instrument's profile, drawn through the pixels; "+
		"thin lines: each cloud alone, where it is deeper than 0.5 %% (less in shallow lines); numbered ticks: clouds; lower panels: residuals in σ, dashed lines ±1; dotted vertical lines: where the lines may absorb. ",
		plain(strings.Join(f.Lines, ", ")), plain(r.Name), velocityLabel(r.Result.Frame))
	if p := resolvingPower(r.Result.Spectra); p != "" {
		fmt.Fprintf(&b, "Resolving power %s. ", p)
	}
	fmt.Fprintf(&b, "χ² = %s for %d degrees of freedom.", number(f.Result.Chi2, 1), f.Result.DOF)
	for i, c := range f.Result.Clouds {
		fmt.Fprintf(&b, " Cloud %d: v = %s km/s", i+1, printNumber(c.V, 1, 2).text())
		for _, s := range c.Species {
			fmt.Fprintf(&b, ", %s log N %s, b %s km/s", plain(s.Carrier), plain(printLog(s.LogN).marked()), plain(printNumber(s.B, 1, 2).marked()))
		}
		b.WriteString(".")
	}
	return b.String()
}

// A fitBlock is one line in one window.
type fitBlock struct {
	w     survey.FitWindow
	line  survey.FitLine
	v     []float64 // km/s about the line
	name  string
	right string // its column
	marks []mark
}

// fitBlocks lists the lines of a fit in the order of its lines, then of windows.
func fitBlocks(f survey.Fit) []fitBlock {
	times := map[string]int{}
	for _, w := range f.Windows {
		for _, l := range w.Lines {
			times[l.Name]++
		}
	}
	var out []fitBlock
	for _, name := range f.Lines {
		for _, w := range f.Windows {
			for _, l := range w.Lines {
				if l.Name != name {
					continue
				}
				b := fitBlock{w: w, line: l, name: plain(l.Name)}
				if times[l.Name] > 1 {
					b.name += fmt.Sprintf(", order %d", w.Order)
				}
				for _, x := range w.Wave {
					b.v = append(b.v, atomic.C*(x/l.Wave-1))
				}
				for _, t := range f.Result.Totals {
					if t.Carrier == l.Carrier {
						b.right = "log N(" + plain(t.Carrier) + ") " + printLog(t.LogN).marked()
					}
				}
				out = append(out, b)
			}
		}
	}
	return out
}

// Sizes of the residuals' strip, in points, and its range in σ.
const (
	strip      = 24.0
	stripSigma = 4.5
	least      = 0.005 // absorption from which a cloud alone is drawn, less in a shallow line
)

// A cloudStack is one page of panels of a fit.
type cloudStack struct {
	title, note string
	fit         survey.Fit
	blocks      []fitBlock
	x           axis
	xLabel      string
	cols, rows  int
	nameRows    int
	wide        vg.Length
	key         [][]keyEntry
}

func newCloudStack(f survey.Fit, bs []fitBlock, label string) *cloudStack {
	s := &cloudStack{fit: f, blocks: bs, cols: 1, rows: len(bs)}
	total := oneColumn
	if len(bs) > oneColLines {
		s.cols, s.rows, total = 2, (len(bs)+1)/2, twoColumn
	}
	s.wide = total/vg.Length(s.cols) - vg.Points(marginLeft+marginRight)
	lo, hi := fitRange(f, bs)
	s.x = axis{Lo: lo, Hi: hi, Ticks: ticks(lo, hi, 6, 0)}
	s.xLabel = label + " (km s^{−1})"
	for i := range s.blocks {
		b := &s.blocks[i]
		var rows int
		b.marks, rows = s.place(*b)
		s.nameRows = max(s.nameRows, rows)
	}
	s.key = layKey(cloudKey(s), total-vg.Points(2*marginRight))
	return s
}

// fitRange is where the lines may absorb, and on either side half as much again,
// or, where clouds lie in a small part of that, what is about them.
func fitRange(f survey.Fit, bs []fitBlock) (lo, hi float64) {
	lo, hi = math.Inf(1), math.Inf(-1)
	first, last := math.Inf(1), math.Inf(-1)
	for _, b := range bs {
		lo, hi = min(lo, b.line.Window[0]), max(hi, b.line.Window[1])
		if n := len(b.v); n > 0 {
			first, last = min(first, b.v[0]), max(last, b.v[n-1])
		}
	}
	if !(hi > lo) {
		return -50, 50
	}
	pad := max(0.3*(hi-lo), 10)
	lo, hi = lo-pad, hi+pad
	if first < hi && last > lo {
		lo, hi = max(lo, first), min(hi, last)
	}
	return lo, hi
}

// place finds the clouds' ticks in a panel, with their numbers, and where other lines of
// the fit fall into it.
func (s *cloudStack) place(b fitBlock) ([]mark, int) {
	var marks []mark
	for i, c := range s.fit.Result.Clouds {
		for _, sp := range c.Species {
			if sp.Carrier == b.line.Carrier && finite(sp.V.X) {
				if sp.V.X > s.x.Lo && sp.V.X < s.x.Hi {
					marks = append(marks, mark{name: fmt.Sprint(i + 1), v: sp.V.X})
				}
			}
		}
	}
	for _, l := range b.w.Lines {
		if l.Name == b.line.Name {
			continue
		}
		shift := atomic.C * (l.Wave/b.line.Wave - 1)
		at := math.NaN()
		for _, c := range s.fit.Result.Clouds {
			for _, sp := range c.Species {
				if v := sp.V.X + shift; sp.Carrier == l.Carrier && v > s.x.Lo && v < s.x.Hi {
					if math.IsNaN(at) {
						at = v
						marks = append(marks, mark{name: plain(withoutSpecies(l.Name, b.line.Carrier)), v: v, reach: [2]float64{v, v}})
					} else {
						marks = append(marks, mark{name: "", v: v})
					}
				}
			}
		}
	}
	sort.SliceStable(marks, func(i, j int) bool { return marks[i].v < marks[j].v })
	sty := letters(textSize, ink, text.XCenter, text.YBottom)
	rows := 0
	for i := range marks {
		marks[i].half = width(sty, marks[i].name)/2 + 1
		marks[i].tick = vg.Length((marks[i].v-s.x.Lo)/(s.x.Hi-s.x.Lo)) * s.wide
		marks[i].row = -1
	}
	for i := range marks {
		m := &marks[i]
		if m.name == "" {
			continue
		}
		m.find(marks[:i], []vg.Length{0, -m.half, m.half}, s.wide)
		rows = max(rows, m.row+1)
	}
	return marks, rows
}

func (s *cloudStack) top() float64 { return 4 + titleSize + 5 + keyRow*float64(len(s.key)) + 3 }

func (s *cloudStack) flux() float64 {
	tall := 1.15
	switch s.rows {
	case 1:
		tall = 2
	case 2:
		tall = 1.5
	}
	return fluxHeight*tall + rowHeight*float64(s.nameRows) + tickLength
}

func (s *cloudStack) blockHeight() float64 { return headRow + s.flux() + strip + blockGap }

func (s *cloudStack) sheet() sheet {
	return sheet{title: s.title, note: s.note, xLabel: s.xLabel, key: s.key, cols: s.cols, rows: s.rows, blocks: len(s.blocks),
		top: s.top(), height: s.blockHeight(), wide: s.wide, yLabels: []string{"F / F_{c}; below: residuals in σ"}}
}

func (s *cloudStack) size() (w, h vg.Length) { return s.sheet().size() }

func (s *cloudStack) draw(c draw.Canvas) {
	s.sheet().draw(c, func(i int, at vg.Point, lowest bool) { s.drawBlock(c, s.blocks[i], at, lowest) })
}

func (s *cloudStack) drawBlock(c draw.Canvas, b fitBlock, pt vg.Point, lowest bool) {
	sty := letters(textSize, ink, text.XLeft, text.YBottom)
	base := pt.Y - vg.Points(headRow-1.5)
	c.FillText(heavy(sty), vg.Point{X: pt.X, Y: base}, b.name)
	right := sty
	right.XAlign = text.XRight
	if width(heavy(sty), b.name)+width(sty, b.right)+vg.Points(8) < s.wide {
		c.FillText(right, vg.Point{X: pt.X + s.wide, Y: base}, b.right)
	}
	top := pt.Y - vg.Points(headRow)
	split := top - vg.Points(s.flux())
	bottom := split - vg.Points(strip)
	s.drawFlux(newPanel(c, vg.Rectangle{Min: vg.Point{X: pt.X, Y: split}, Max: vg.Point{X: pt.X + s.wide, Y: top}}, s.x, axis{}), b)
	s.drawResiduals(newPanel(c, vg.Rectangle{Min: vg.Point{X: pt.X, Y: bottom}, Max: vg.Point{X: pt.X + s.wide, Y: split}}, s.x, axis{}), b, lowest)
}

// fitFluxRange is that of the data that are shown: from zero where the line is deep.
func (s *cloudStack) fitFluxRange(b fitBlock) (lo, hi float64) {
	deepest := 0.0
	var sigmas []float64
	for i, v := range b.v {
		if v < s.x.Lo || v > s.x.Hi || !value(b.w.Used, i) {
			continue
		}
		deepest = max(deepest, 1-value(b.w.Flux, i), 1-value(b.w.Model, i))
		sigmas = append(sigmas, value(b.w.Err, i))
	}
	sigma := 0.02
	if len(sigmas) > 0 {
		slices.Sort(sigmas)
		sigma = min(sigmas[len(sigmas)/2], 0.3)
	}
	if deepest > 0.45 {
		return min(-0.08, -3*sigma), 1 + max(0.06, 3.5*sigma)
	}
	return 1 - max(1.15*deepest, 5*sigma), 1 + max(0.1*deepest, 4.5*sigma)
}

func (s *cloudStack) drawFlux(p panel, b fitBlock) {
	lo, hi := s.fitFluxRange(b)
	room := rowHeight*float64(s.nameRows) + tickLength
	p.Y = axis{Lo: lo, Hi: lo + (hi-lo)*s.flux()/(s.flux()-room)}
	for n := 4; n < 8 && labelled(p.Y.Ticks) < 2; n++ {
		p.Y.Ticks = ticks(lo, hi, n, 0.05)
	}
	s.shade(p, b)
	if lo < 0 {
		p.horizontal(stroke(midGrey, hair, 1, 1.5), 0)
	}
	p.horizontal(stroke(midGrey, fine, 3, 1.5), 1)
	unused := func(i int) bool { return !value(b.w.Used, i) && value(b.w.Err, i) > 0 }
	x, y := outline(b.v, b.w.Flux, unused)
	p.curve(stroke(midGrey, fine), x, y)
	x, y = outline(b.v, b.w.Flux, func(i int) bool { return value(b.w.Used, i) })
	p.curve(stroke(ink, fine), x, y)
	if len(s.fit.Result.Clouds) > 1 {
		for _, c := range b.w.Clouds {
			from, to := min(c.From, len(b.v)), min(c.From+len(c.Flux), len(b.v))
			x, y := smooth(b.v[from:to], c.Flux[:to-from])
			p.curve(stroke(blue, fine), x, shallow(y, min(least, 0.02*(hi-lo))))
		}
	}
	x, y = smooth(b.v, b.w.Model)
	p.curve(stroke(vermilion, bold), x, y)
	p.drawTicks(b.marks, s.nameRows)
	p.frame(false, true)
}

// smooth draws a curve through the pixels of a model (Akima's spline, which does not
// overshoot a flat continuum), five points a pixel.
func smooth(x, y []float64) (sx, sy []float64) {
	var a interp.AkimaSpline
	if len(x) < 5 || a.Fit(x, y) != nil {
		return x, y
	}
	const steps = 5
	for i := range x[1:] {
		for k := range steps {
			at := x[i] + float64(k)/steps*(x[i+1]-x[i])
			sx, sy = append(sx, at), append(sy, a.Predict(at))
		}
	}
	return append(sx, x[len(x)-1]), append(sy, y[len(y)-1])
}

// shallow leaves out where a cloud alone is not worth drawing.
func shallow(flux []float64, depth float64) []float64 {
	out := make([]float64, len(flux))
	for i, y := range flux {
		out[i] = y
		if !(1-y > depth) {
			out[i] = math.NaN()
		}
	}
	return out
}

// shade marks lines of the air, pixels that are not used inside the window, and its ends.
func (s *cloudStack) shade(p panel, b fitBlock) {
	for _, r := range b.w.Telluric {
		p.column(palePurple, atomic.C*(r[0]/b.line.Wave-1), atomic.C*(r[1]/b.line.Wave-1))
	}
	in := func(v float64) bool { return v >= b.line.Window[0] && v <= b.line.Window[1] }
	air := func(x float64) bool {
		return slices.ContainsFunc(b.w.Telluric, func(r [2]float64) bool { return x >= r[0] && x <= r[1] })
	}
	for _, sp := range spans(b.v, func(i int) bool { return !value(b.w.Used, i) && in(b.v[i]) && !air(b.w.Wave[i]) }) {
		p.column(paleGrey, sp[0], sp[1])
	}
	for _, edge := range b.line.Window {
		p.vertical(stroke(midGrey, hair, 1, 1.5), edge)
	}
}

func (s *cloudStack) drawResiduals(p panel, b fitBlock, lowest bool) {
	p.Y = axis{Lo: -stripSigma, Hi: stripSigma, Ticks: []tick{{-3, "−3"}, {0, "0"}, {3, "3"}}}
	s.shade(p, b)
	for _, y := range []float64{-1, 1} {
		p.horizontal(stroke(vermilion, hair, 3, 1.5), y)
	}
	p.horizontal(stroke(midGrey, hair, 1, 1.5), 0)
	r := make([]float64, len(b.w.Residual))
	for i, x := range b.w.Residual { // what is beyond the strip ends at its edge
		r[i] = min(max(x, -stripSigma), stripSigma)
	}
	x, y := outline(b.v, r, func(i int) bool { return value(b.w.Used, i) && i < len(r) })
	p.curve(stroke(ink, fine), x, y)
	p.frame(lowest, true)
}

// drawTicks puts clouds' ticks and numbers above the spectrum.
func (p panel) drawTicks(marks []mark, rows int) {
	sty := letters(textSize, ink, text.XCenter, text.YBottom)
	base := p.Max.Y - vg.Points(1+rowHeight*float64(rows))
	for _, m := range marks {
		line := stroke(ink, medium)
		if m.name == "" || m.reach != [2]float64{} { // of another line of the fit
			line = stroke(midGrey, medium)
		}
		head := base + vg.Points(rowHeight*float64(max(m.row, 0)))
		p.StrokeLine2(line, p.px(m.v), base-vg.Points(tickLength), p.px(m.v), head)
		if m.row >= 0 {
			p.FillText(sty, vg.Point{X: p.Min.X + m.centre, Y: head}, m.name)
		}
	}
}

// cloudKey lists the signs that occur.
func cloudKey(s *cloudStack) []keyEntry {
	out := []keyEntry{{"data", func(c draw.Canvas, r vg.Rectangle) {
		a, b, m := r.Min.Y+vg.Points(1), r.Max.Y-vg.Points(1), (r.Min.X+r.Max.X)/2
		c.StrokeLines(stroke(ink, fine), []vg.Point{{X: r.Min.X, Y: b}, {X: m - 3, Y: b}, {X: m - 3, Y: a}, {X: m + 3, Y: a}, {X: m + 3, Y: b}, {X: r.Max.X, Y: b}})
	}}, {"model", lineSwatch(stroke(vermilion, bold))}}
	if len(s.fit.Result.Clouds) > 1 {
		out = append(out, keyEntry{"each cloud alone", lineSwatch(stroke(blue, fine))})
	}
	air, unused := false, false
	for _, b := range s.blocks {
		for _, r := range b.w.Telluric {
			lo, hi := atomic.C*(r[0]/b.line.Wave-1), atomic.C*(r[1]/b.line.Wave-1)
			air = air || hi > s.x.Lo && lo < s.x.Hi
		}
		for i, v := range b.v {
			unused = unused || v > s.x.Lo && v < s.x.Hi && !value(b.w.Used, i)
		}
	}
	if unused {
		out = append(out, keyEntry{"not used", lineSwatch(stroke(midGrey, fine))})
	}
	if air {
		out = append(out, keyEntry{"lines of the air", func(c draw.Canvas, r vg.Rectangle) { c.FillPolygon(palePurple, corners(r)) }})
	}
	return append(out, keyEntry{"±1σ", lineSwatch(stroke(vermilion, hair, 3, 1.5))})
}
