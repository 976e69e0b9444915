package report

import (
	"bytes"
	"fmt"
	"html"
	"image/color"
	"io"
	"regexp"
	"strconv"
	"strings"

	xfont "golang.org/x/image/font"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
	"gonum.org/v1/plot/vg/vgimg"
	"gonum.org/v1/plot/vg/vgsvg"
)

// A Figure is one drawing, ready to be written in any format.
type Figure struct {
	Name          string    // file stem, without extension
	Title         string    // what it shows, in a few words
	Caption       string    // what a caption must say: symbols, resolving power, scale
	Width, Height vg.Length // points

	draw func(c draw.Canvas)
}

// The widths of one and two columns of a journal's page.
const (
	oneColumn = 88 * vg.Millimeter
	twoColumn = 180 * vg.Millimeter
)

// WriteSVG writes the figure as SVG. Letters stay letters in Liberation Sans;
// readers without it fall back to Arial or Helvetica, which have its metrics, and
// each run of text states its length, so that nothing overlaps with other fonts.
func (f Figure) WriteSVG(w io.Writer) error {
	c := vgsvg.New(f.Width, f.Height)
	f.paint(draw.New(c))
	var b bytes.Buffer
	if _, err := c.WriteTo(&b); err != nil {
		return err
	}
	_, err := w.Write(f.finish(b.Bytes()))
	return err
}

// WritePNG writes the figure as PNG with the given dots per inch.
func (f Figure) WritePNG(w io.Writer, dpi int) error {
	c := vgimg.NewWith(vgimg.UseWH(f.Width, f.Height), vgimg.UseDPI(dpi))
	f.paint(draw.New(c))
	_, err := vgimg.PngCanvas{Canvas: c}.WriteTo(w)
	return err
}

// paint lays white paper under the drawing: a figure must be legible on a dark page.
func (f Figure) paint(c draw.Canvas) {
	c.FillPolygon(color.White, corners(c.Rectangle))
	f.draw(c)
}

var (
	svgText  = regexp.MustCompile(`(?s)^<text x="([^"]*)" y="([^"]*)" transform="scale\(1, -1\)"\s+style="([^"]*)">(.*)</text>$`)
	svgSize  = regexp.MustCompile(`font-size:([0-9.]+)px`)
	svgStart = regexp.MustCompile(`(?s)^<\?xml version="1\.0"\?>\n<!--.*?-->\n(<svg [^>]*)>\n`)
)

// finish adds what the SVG writer of gonum/plot leaves out: fallback fonts, the
// length of each run of text, and a title and description for readers who do
// not see.
func (f Figure) finish(svg []byte) []byte {
	head := fmt.Sprintf(`<?xml version="1.0" encoding="UTF-8"?>
$1 role="img">
<title>%s</title>
<desc>%s</desc>
`, dollar(html.EscapeString(unmark(f.Title))), dollar(html.EscapeString(unmark(f.Caption))))
	svg = svgStart.ReplaceAll(svg, []byte(head))
	var out bytes.Buffer
	out.Grow(len(svg) + len(svg)/8)
	const start, end = "<text ", "</text>"
	for { // the pattern only ever sees one text: it is slow on a whole file
		i := bytes.Index(svg, []byte(start))
		if i < 0 {
			break
		}
		j := i + bytes.Index(svg[i:], []byte(end)) + len(end)
		out.Write(svg[:i])
		out.Write(finishText(svg[i:j]))
		svg = svg[j:]
	}
	out.Write(svg)
	return out.Bytes()
}

// finishText is finish for one text element.
func finishText(m []byte) []byte {
	part := svgText.FindSubmatch(m)
	if part == nil {
		panic("report: the SVG writer's text has another form: " + string(m))
	}
	style, words := string(part[3]), string(part[4])
	size, weight := 0.0, xfont.WeightNormal
	if s := svgSize.FindStringSubmatch(style); s != nil {
		size, _ = strconv.ParseFloat(s[1], 64) // the pattern admits numbers only
	}
	more := "" // the usual weight and black need no word
	if strings.Contains(style, "font-weight:bold") {
		weight, more = xfont.WeightBold, ` font-weight="bold"`
	}
	if i := strings.Index(style, "fill:"); i >= 0 {
		more += fmt.Sprintf(` fill="%s"`, strings.SplitN(style[i+5:], ";", 2)[0])
	}
	face := fonts().Lookup(sans(size, weight), vg.Points(size))
	long := face.Width(html.UnescapeString(words)).Points()
	return fmt.Appendf(nil, `<text x="%s" y="%s" transform="scale(1,-1)" xml:space="preserve" font-family="Liberation Sans,Arial,Helvetica,sans-serif" font-size="%gpx"%s textLength="%.2f">%s</text>`,
		part[1], part[2], size, more, long, words)
}

// dollar keeps $ from being read as a group of the pattern.
func dollar(s string) string { return strings.ReplaceAll(s, "$", "$$") }

// unmark takes the markup out of text.
func unmark(s string) string {
	var b strings.Builder
	for _, r := range runs(s) {
		b.WriteString(r.text)
	}
	return b.String()
}

// corners returns the outline of a rectangle.
func corners(r vg.Rectangle) []vg.Point {
	return []vg.Point{r.Min, {X: r.Max.X, Y: r.Min.Y}, r.Max, {X: r.Min.X, Y: r.Max.Y}}
}
