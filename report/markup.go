package report

import (
	"math"
	"strings"
	"sync"

	"codeberg.org/go-fonts/liberation/liberationsansbold"
	"codeberg.org/go-fonts/liberation/liberationsansregular"
	xfont "golang.org/x/image/font"
	"golang.org/x/image/font/opentype"
	"golang.org/x/image/font/sfnt"
	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
)

// Text of figures is set in Liberation Sans (metrics of Arial and Helvetica),
// which lacks superscript minus and plus, ☉ and others: a glyph that a font
// lacks vanishes without a word, and "s⁻¹" would read "s¹". So powers and
// indices are marked ^{…} and _{…} and drawn smaller, raised or lowered.
const (
	sansFace = "Liberation"
	small    = 0.72 // size of sub- and superscripts
	raise    = 0.36 // of the full size
	lower    = 0.18
	apartBy  = 0.09 // what a power above an index is raised, and the index lowered, besides
)

// fonts returns the two faces in use; the first call parses them.
var fonts = sync.OnceValue(func() *font.Cache {
	var all font.Collection
	for _, f := range []struct {
		weight xfont.Weight
		ttf    []byte
	}{
		{xfont.WeightNormal, liberationsansregular.TTF},
		{xfont.WeightBold, liberationsansbold.TTF},
	} {
		face, err := opentype.Parse(f.ttf)
		if err != nil {
			panic("report: the built-in font does not parse: " + err.Error())
		}
		all = append(all, font.Face{Font: sans(0, f.weight), Face: face})
	}
	return font.NewCache(all)
})

// sans describes a face of the figures; size in points.
func sans(size float64, weight xfont.Weight) font.Font {
	return font.Font{Typeface: sansFace, Variant: "Sans", Weight: weight, Size: vg.Points(size)}
}

// hasGlyph reports whether the font of the figures can draw r.
func hasGlyph(r rune) bool {
	face := fonts().Lookup(sans(7, xfont.WeightNormal), vg.Points(7))
	var buf sfnt.Buffer
	i, err := face.Face.GlyphIndex(&buf, r)
	return err == nil && i != 0
}

// plain makes any text (a star's name, a note) safe to draw: braces after ^ and
// _ lose their meaning, and what the font lacks becomes "?", never nothing.
func plain(s string) string {
	var b strings.Builder
	for _, r := range s {
		switch {
		case r == '{':
			b.WriteString(`\{`)
		case r == '\t' || r == '\n' || r == '\r':
			b.WriteByte(' ')
		case !hasGlyph(r):
			b.WriteByte('?')
		default:
			b.WriteRune(r)
		}
	}
	return b.String()
}

// A run is a piece of text at one level: 0 on the line, 1 raised, −1 lowered.
type run struct {
	text  string
	level int
}

// runs splits marked text. A brace that does not follow ^ or _ is itself, and so
// is \{; an unclosed group ends with the text.
func runs(s string) []run {
	var out []run
	add := func(t string, level int) {
		t = strings.ReplaceAll(t, `\{`, "{")
		if t != "" {
			out = append(out, run{t, level})
		}
	}
	for {
		i := strings.IndexAny(s, "^_")
		for i >= 0 && !strings.HasPrefix(s[i+1:], "{") {
			j := strings.IndexAny(s[i+1:], "^_")
			if j < 0 {
				i = -1
				break
			}
			i += 1 + j
		}
		if i < 0 {
			add(s, 0)
			return out
		}
		level := 1
		if s[i] == '_' {
			level = -1
		}
		add(s[:i], 0)
		s = s[i+2:]
		end := strings.IndexByte(s, '}')
		if end < 0 {
			end = len(s)
		}
		add(s[:end], level)
		s = s[min(end+1, len(s)):]
	}
}

// markup draws marked text on any canvas; it is a text.Handler of gonum/plot.
type markup struct{}

var _ text.Handler = markup{}

func (markup) Cache() *font.Cache { return fonts() }

func (markup) Extents(f font.Font) font.Extents {
	face := fonts().Lookup(f, f.Size)
	return face.Extents()
}

func (markup) Lines(s string) []string { return strings.Split(strings.TrimRight(s, "\n"), "\n") }

// at returns the face of a level and how far it is raised.
func (r run) at(f font.Font) (font.Face, vg.Length) {
	switch r.level {
	case 1:
		return fonts().Lookup(f, f.Size*small), f.Size * raise
	case -1:
		return fonts().Lookup(f, f.Size*small), -f.Size * lower
	}
	return fonts().Lookup(f, f.Size), 0
}

// A placed run stands at x from the start of its line.
type placed struct {
	run
	face font.Face
	x    vg.Length
	up   vg.Length
}

// set places the runs of one line and returns its width. An index right after a
// power stands below it: 11.84^{+0.03}_{−0.02}.
func set(s string, f font.Font) (out []placed, width vg.Length) {
	start := vg.Length(0)
	before := 0
	for _, r := range runs(s) {
		face, up := r.at(f)
		x := width
		if before*r.level == -1 {
			x = start
			before = 0
			apart := f.Size * apartBy * vg.Length(r.level) // the two must not touch
			out[len(out)-1].up -= apart
			up += apart
		} else {
			before = r.level
		}
		out = append(out, placed{r, face, x, up})
		start = x
		width = max(width, x+face.Width(r.text))
	}
	return out, width
}

func (m markup) Box(s string, f font.Font) (width, height, depth vg.Length) {
	_, width = set(s, f)
	e := m.Extents(f)
	return width, e.Ascent, e.Descent
}

// Draw puts one or more lines at pt. YAlign refers to the box from descent to
// ascent of all lines.
func (m markup) Draw(c vg.Canvas, s string, sty text.Style, pt vg.Point) {
	lines := m.Lines(s)
	e := m.Extents(sty.Font)
	c.SetColor(sty.Color)
	c.Push()
	defer c.Pop()
	if sty.Rotation != 0 {
		c.Rotate(sty.Rotation)
		sin, cos := math.Sincos(sty.Rotation)
		x, y := float64(pt.X), float64(pt.Y)
		pt = vg.Point{X: vg.Length(x*cos + y*sin), Y: vg.Length(y*cos - x*sin)}
	}
	step := e.Ascent + e.Descent
	bottom := pt.Y + vg.Length(sty.YAlign)*step*vg.Length(len(lines))
	for i, line := range lines {
		all, width := set(line, sty.Font)
		x := pt.X + vg.Length(sty.XAlign)*width
		y := bottom + step*vg.Length(len(lines)-1-i) + e.Descent
		for _, r := range all {
			c.FillString(r.face, vg.Point{X: x + r.x, Y: y + r.up}, r.text)
		}
	}
}
