package spectrum

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"lacuna/spectrum/fits"
)

// partners are names of image extensions that belong to a flux image.
var partners = map[string]string{"ERR": "error", "ERROR": "error", "SIGMA": "error", "ERRDATA": "error", "STAT": "variance", "VAR": "variance", "VARIANCE": "variance", "IVAR": "inverse variance",
	"DQ": "mask", "QUAL": "mask", "QUALITY": "mask", "MASK": "mask", "FLAGS": "mask", "QUALDATA": "mask", "CONTINUUM": "continuum", "CONT": "continuum"}

// images reads every image HDU with a spectral axis, each as its own segments;
// extensions of errors and flags join the flux image of the same EXTVER. It
// reports whether there was any.
func (r *reader) images(hdus []*fits.HDU) (bool, error) {
	done := false
	for _, h := range hdus {
		if h.Kind != fits.Image || h.Err != nil || partners[strings.ToUpper(h.Name())] != "" && r.o.HDU == "" {
			continue
		}
		if isWaveImage(h) && r.o.HDU == "" {
			continue
		}
		if g, k := waveImage(h, r.file.HDUs); g != nil {
			if r.o.HDU == "" && !isFluxName(h) && slices.ContainsFunc(hdus, func(f *fits.HDU) bool { return isFluxName(f) && slices.Equal(f.Axes, h.Axes) }) {
				continue // steps, contamination …: the flux has its own image
			}
			done = true
			if err := r.withWaves(h, g, k); err != nil {
				return true, err
			}
			continue
		}
		if !r.hasAxis(h) {
			continue
		}
		done = true
		if err := r.image(h); err != nil {
			return true, err
		}
	}
	return done, nil
}

// hasAxis reports whether a header describes a spectral axis, well or badly.
func (r *reader) hasAxis(h *fits.HDU) bool {
	if _, n := squeeze(h); n < 0 {
		return false
	}
	c := cards{&h.Header}
	return c.has("CRVAL1") && (c.has("CDELT1") || c.has("CD1_1")) || c.has("COEFF0") && c.has("COEFF1")
}

// squeeze returns the pixels of a line and the number of lines; −1 where the
// first axis has one pixel or none.
func squeeze(h *fits.HDU) (pixels, lines int64) {
	if len(h.Axes) == 0 || h.Axes[0] < 2 {
		return 0, -1
	}
	return h.Axes[0], h.Lines()
}

// A law turns the FITS pixel number p (from 1) into a wavelength in Å.
type law struct {
	at    func(p float64) float64
	ctype string
	kind  string
	notes []string

	guessed bool // the unit
}

// image reads one flux image with a spectral axis, and what belongs to it.
func (r *reader) image(h *fits.HDU) error {
	c := cards{&h.Header}
	all := r.headers(h)
	r.describe(all)
	n, lines := squeeze(h)
	w, err := r.axis(h, c, n)
	if err != nil {
		return err
	}
	r.s.Layout = w.kind + " image"
	plan, err := r.lines(h, all, lines)
	if err != nil {
		return err
	}
	if n, _ := orderInTitle(h.Str("OBJECT")); n > 0 && len(plan) == 1 && plan[0].label == "" { // one HDU an order
		plan[0].order, plan[0].label = n, fmt.Sprintf("order %d", n)
	}
	return r.imageLines(h, plan, clue{ctype: w.ctype}, func(_ aline, s *Segment) ([]float64, error) {
		s.UnitGuessed = w.guessed
		wave := make([]float64, n)
		for i := range wave {
			wave[i] = w.at(float64(i + 1))
			if !finite(wave[i]) || wave[i] <= 0 {
				return nil, h.Fail(fmt.Sprintf("the spectral axis gives wavelength %g at pixel %d", wave[i], i+1), "correct CRVAL1 and CDELT1, or give layout and unit")
			}
		}
		return wave, nil
	}, w.notes...)
}

// imageLines makes a segment of each line of plan. waves gives its wavelengths in
// Å, nil where the line has none and is to be left out.
func (r *reader) imageLines(h *fits.HDU, plan []aline, k clue, waves func(l aline, s *Segment) ([]float64, error), notes ...string) error {
	all := r.headers(h)
	_, lines := squeeze(h)
	for _, l := range plan {
		if r.o.Row > 0 && l.row() != int64(r.o.Row)-1 {
			continue
		}
		label := l.label
		if label == "" {
			label = "image"
			if h.Name() != "" {
				label = h.Name()
			}
			if h.Index > 0 && (h.Name() == "" || r.sameNames(h)) {
				label = fmt.Sprintf("%s (HDU %d)", label, h.Index)
			}
		}
		s := Segment{Order: len(r.s.Segments) + 1, Label: label, Unit: all.str("BUNIT"), Source: Source{File: r.c.Name, HDU: h.Index, Row: int(l.flux) + 1}, Notes: slices.Clone(notes)}
		if l.order != 0 {
			s.Order = l.order
		}
		if h.Compression != "" {
			s.note("unpacked from tiles (%s)", h.Compression)
		}
		var px pixels
		var err error
		if px.wave, err = waves(l, &s); err != nil {
			return err
		}
		if px.wave == nil {
			continue
		}
		if px.flux, err = h.Line(l.flux); err != nil {
			return err
		}
		if l.err >= 0 {
			if px.err, err = h.Line(l.err); err != nil {
				return err
			}
			px.err = picked{errKind: l.errKind}.sigma(px.err, px.flux)
			s.note("line %d of the image is the error (%s)", l.err+1, l.by)
		} else if err := r.partner(h, l.flux, &s, &px); err != nil {
			return err
		}
		r.decide(&s, all, k, firstFinite(px.wave))
		if err := r.finish(s, px); err != nil {
			return err
		}
	}
	if r.o.Row > 0 && int64(r.o.Row) > lines {
		return h.Fail(fmt.Sprintf("there is no image line %d; it has %d", r.o.Row, lines), "choose another row")
	}
	return nil
}

func (r *reader) sameNames(h *fits.HDU) bool {
	return slices.ContainsFunc(r.file.HDUs, func(g *fits.HDU) bool { return g != h && g.Kind == fits.Image && g.Name() == h.Name() })
}

// partner attaches the error, mask and continuum extensions of equal EXTVER and size.
func (r *reader) partner(h *fits.HDU, line int64, s *Segment, px *pixels) error {
	for _, g := range r.file.HDUs {
		what := partners[strings.ToUpper(g.Name())]
		if g == h || g.Kind != fits.Image || g.Err != nil || what == "" || !slices.Equal(g.Axes, h.Axes) || g.Str("EXTVER") != h.Str("EXTVER") {
			continue
		}
		v, err := g.Line(line)
		if err != nil {
			return err
		}
		switch what {
		case "mask":
			px.bad = picked{goodIsZero: true}.flags(v)
		case "continuum":
			px.cont = v
		default:
			px.err = picked{errKind: what}.sigma(v, px.flux)
		}
		s.note("%s from %s", what, g.Where())
	}
	return nil
}

// aline is one segment's lines in an image.
type aline struct {
	flux, err   int64 // from 0; err −1 none
	aperture    int64 // line inside the plane of the flux, if inPlane
	inPlane     bool
	errKind, by string
	label       string
	order       int
}

// row is the line that a user counts: of the plane of the flux.
func (l aline) row() int64 {
	if l.inPlane {
		return l.aperture
	}
	return l.flux
}

// lines decides what the lines of an image are.
func (r *reader) lines(h *fits.HDU, c cards, n int64) ([]aline, error) {
	if r.o.FluxCol != "" || r.o.ErrCol != "" && n > 1 {
		return r.userLines(h, n)
	}
	switch {
	case n == 1:
		return []aline{{flux: 0, err: -1}}, nil
	case strings.Contains(r.wat(h, 0), "system=equispec"):
		return r.apertures(h, c)
	case n == 2:
		l := aline{flux: 0, err: 1, by: "line 2 of two is taken for it"}
		if kind, by := rowWords(h, 2); by != "" {
			l.errKind, l.by = kind, by
			return []aline{l}, nil
		}
		return []aline{l}, r.looksLikeError(h)
	}
	return nil, h.Fail(fmt.Sprintf("the image has %d lines and nothing says what they are", n), "say which: columns = {flux = …, err = …}, line numbers from 1")
}

func (r *reader) userLines(h *fits.HDU, n int64) ([]aline, error) {
	l := aline{flux: 0, err: -1, by: "user"}
	for _, w := range []struct {
		word string
		into *int64
	}{{r.o.FluxCol, &l.flux}, {r.o.ErrCol, &l.err}} {
		if w.word == "" || strings.EqualFold(w.word, "none") {
			continue
		}
		k, err := strconv.ParseInt(w.word, 10, 64)
		if err != nil || k < 1 || k > n {
			return nil, h.Fail(fmt.Sprintf("'%s' is no line of an image of %d lines", w.word, n), "give a number from 1")
		}
		*w.into = k - 1
	}
	return []aline{l}, nil
}

// rowWords looks for what cards and comments say of an image line: BANDIDn,
// ARRAYn, ROWn, or "row 2 = 1-sigma error".
func rowWords(h *fits.HDU, n int) (kind, by string) {
	for _, c := range h.Cards {
		text := strings.ToLower(c.Value)
		if c.Key == "COMMENT" || c.Key == "HISTORY" {
			text = strings.ToLower(c.Comment)
			i := strings.Index(text, fmt.Sprintf("row %d", n))
			if i < 0 {
				continue
			}
			text = text[i:]
		} else if c.Key != fmt.Sprintf("BANDID%d", n) && c.Key != fmt.Sprintf("ARRAY%d", n) && c.Key != fmt.Sprintf("ROW%d", n) {
			continue
		}
		switch {
		case strings.Contains(text, "inverse variance"), strings.Contains(text, "ivar"):
			return "inverse variance", c.Key
		case strings.Contains(text, "variance"):
			return "variance", c.Key
		case strings.Contains(text, "sigma"), strings.Contains(text, "error"), strings.Contains(text, "uncertainty"):
			return "", c.Key
		}
	}
	return "", ""
}

// looksLikeError refuses to take the second of two unnamed lines for an error
// where it is about as large as the first.
func (r *reader) looksLikeError(h *fits.HDU) error {
	a, err := h.Line(0)
	if err != nil {
		return err
	}
	b, err := h.Line(1)
	if err != nil {
		return err
	}
	if ma, mb := median(a), median(b); ma > 0 && mb > 0.5*ma {
		return h.Fail(fmt.Sprintf("the image has two lines of medians %.3g and %.3g: the second may be an error or another spectrum", ma, mb),
			`say which: columns = {flux = 1, err = 2}, or err = "none"`)
	}
	return nil
}

func median(v []float64) float64 {
	v = slices.DeleteFunc(slices.Clone(v), func(x float64) bool { return !finite(x) })
	if len(v) == 0 {
		return math.NaN()
	}
	slices.Sort(v)
	return v[len(v)/2]
}
