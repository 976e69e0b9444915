package report

import (
	"image/color"

	xfont "golang.org/x/image/font"
	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// Colours that people with any colour vision tell apart: Okabe M., Ito K. 2008,
// Color Universal Design, https://jfly.uni-koeln.de/color/ (from memory). The
// tints are opaque, so that they print alike everywhere.
var (
	ink       = color.NRGBA{A: 255}
	blue      = color.NRGBA{0x00, 0x72, 0xB2, 255}
	vermilion = color.NRGBA{0xD5, 0x5E, 0x00, 255}
	green     = color.NRGBA{0x00, 0x9E, 0x73, 255}
	purpleInk = color.NRGBA{0x8A, 0x3A, 0x68, 255} // reddish purple, dark enough for letters

	paleBlue   = color.NRGBA{0xE3, 0xEE, 0xF6, 255} // integration range
	midBlue    = color.NRGBA{0xB5, 0xD3, 0xE8, 255} // area under N_a(v)
	paleOrange = color.NRGBA{0xF9, 0xE3, 0xB4, 255} // placement of the continuum
	paleGrey   = color.NRGBA{0xCA, 0xCA, 0xCA, 255} // masked pixels
	palePurple = color.NRGBA{0xEF, 0xE1, 0xEA, 255} // lines of the air
	midGrey    = color.NRGBA{0x80, 0x80, 0x80, 255}
)

// Sizes of letters and widths of lines, in points.
const (
	textSize  = 7.0
	titleSize = 8.0
	hair      = 0.4
	fine      = 0.6
	medium    = 0.8
	bold      = 1.2
)

func stroke(c color.Color, width float64, dashes ...float64) draw.LineStyle {
	s := draw.LineStyle{Color: c, Width: vg.Points(width)}
	for _, d := range dashes {
		s.Dashes = append(s.Dashes, vg.Points(d))
	}
	return s
}

func letters(size float64, c color.Color, x text.XAlignment, y text.YAlignment) text.Style {
	return text.Style{Color: c, Font: sans(size, xfont.WeightNormal), XAlign: x, YAlign: y, Handler: markup{}}
}

func heavy(s text.Style) text.Style {
	s.Font.Weight = xfont.WeightBold
	return s
}

// width returns how wide marked text is drawn.
func width(s text.Style, marked string) vg.Length {
	w, _, _ := markup{}.Box(marked, s.Font)
	return w
}
