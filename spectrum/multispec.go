package spectrum

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"lacuna/spectrum/fits"
	"lacuna/spectrum/frame"
)

// isMultispec recognises the IRAF multispec layout.
func (r *reader) isMultispec(h *fits.HDU) bool {
	wat, _ := watText(&h.Header, 0)
	return h.Kind == fits.Image && (strings.Contains(wat, "system=multispec") || sameText(h.Str("CTYPE1"), "MULTISPE"))
}

// watPiece is how many characters of a WAT string one card holds.
const watPiece = 68

// watText joins the cards WATn_001, WATn_002 … of an IRAF header into one text.
// They are pieces of exactly 68 characters, whose trailing blanks FITS does not
// keep: all but the last are filled up again. A piece that is missing, or stands
// there twice with different texts, is an error.
func watText(h *fits.Header, axis int) (string, error) {
	prefix := fmt.Sprintf("WAT%d_", axis)
	pieces := map[int]string{}
	last := 0
	for _, c := range h.Cards {
		digits, ok := strings.CutPrefix(c.Key, prefix)
		if !ok {
			continue
		}
		n, err := strconv.Atoi(digits)
		if err != nil || n < 1 || n > 999 || !c.Quoted {
			return "", fmt.Errorf("card %s is damaged", c.Key)
		}
		text := c.Value
		if strings.Contains(text, "'") { // '' in the card counts as two characters of the piece
			text += strings.Repeat(" ", max(0, watPiece-len(text)-strings.Count(text, "'")))
		} else {
			text += strings.Repeat(" ", max(0, watPiece-len(text)))
		}
		if old, dup := pieces[n]; dup && old != text {
			return "", fmt.Errorf("%s%03d stands there twice with different texts", prefix, n)
		}
		pieces[n] = text
		last = max(last, n)
	}
	var b strings.Builder
	for n := 1; n <= last; n++ {
		text, ok := pieces[n]
		if !ok {
			where := ""
			if n > 1 {
				next := n + 1
				for pieces[next] == "" {
					next++
				}
				where = fmt.Sprintf(" between %s%03d and %s%03d", prefix, n-1, prefix, next)
			}
			return "", fmt.Errorf("%s%03d is missing%s", prefix, n, where)
		}
		b.WriteString(text)
	}
	return strings.TrimRight(b.String(), " "), nil
}

// wat is watText for hints that may be absent.
func (r *reader) wat(h *fits.HDU, axis int) string {
	text, err := watText(&h.Header, axis)
	if err != nil {
		return ""
	}
	return text
}

// watEntries takes the text of WAT2 apart: key = value or key = "text".
func watEntries(text string) (map[string]string, error) {
	out := map[string]string{}
	for rest := strings.TrimLeft(text, " "); rest != ""; rest = strings.TrimLeft(rest, " ") {
		key, after, ok := strings.Cut(rest, "=")
		key = strings.TrimRight(key, " ")
		if !ok || key == "" || strings.ContainsAny(key, ` "`) {
			return nil, fmt.Errorf("'%.30s' is not key = value", rest)
		}
		after = strings.TrimLeft(after, " ")
		var value string
		if quoted, isQuoted := strings.CutPrefix(after, `"`); isQuoted {
			if value, rest, ok = strings.Cut(quoted, `"`); !ok {
				return nil, fmt.Errorf("the text of %s does not end", key)
			}
		} else {
			value, rest, _ = strings.Cut(after, " ")
		}
		if _, dup := out[key]; dup {
			return nil, fmt.Errorf("%s stands there twice", key)
		}
		out[key] = value
	}
	return out, nil
}

// multispec reads every line of an IRAF multispec image: one segment an aperture,
// each with its own dispersion. Bands of a third axis are told apart by BANDIDn.
func (r *reader) multispec(h *fits.HDU) error {
	all := r.headers(h)
	r.describe(all)
	r.s.Layout = layoutMultispec
	broken := func(err error) error {
		return h.Fail(fmt.Sprintf("%v: the wavelength solution cannot be read", err), "fetch the file again")
	}
	text, err := watText(&h.Header, 2)
	if err != nil {
		return broken(err)
	}
	specs, err := watEntries(text)
	if err != nil {
		return broken(fmt.Errorf("WAT2: %w", err))
	}
	unit, unitNote, err := r.watWaveUnit(h)
	if err != nil {
		return err
	}
	if len(h.Axes) > 3 {
		return h.Fail(fmt.Sprintf("a multispec image of %d axes", len(h.Axes)), "cut out two axes")
	}
	px, err := readMapping(h, 1)
	if err != nil {
		return err
	}
	ln, err := readMapping(h, 2)
	if err != nil {
		return err
	}
	plan, err := r.apertures(h, all)
	if err != nil {
		return err
	}
	solutions := make([]*dispersion, len(plan))
	for i, l := range plan {
		line := ln.physical(float64(l.aperture + 1))
		key := fmt.Sprintf("spec%d", int(math.Round(line)))
		if math.Abs(line-math.Round(line)) > 1e-3 {
			return h.Fail(fmt.Sprintf("line %d is line %g of the image that was extracted (LTV2, LTM2_2): no single aperture", l.aperture+1, line), "use the image as it was extracted")
		}
		text, ok := specs[key]
		if !ok {
			return broken(fmt.Errorf("WAT2 has no %s, for image line %d", key, l.aperture+1))
		}
		if solutions[i], err = parseDispersion(text); err != nil {
			return broken(fmt.Errorf("%s: %w", key, err))
		}
	}
	if i := slices.IndexFunc(solutions, func(d *dispersion) bool { return d.z != solutions[0].z }); i >= 0 {
		r.s.Notes = append(r.s.Notes, fmt.Sprintf("the Doppler factors of the apertures differ: z = %g of aperture %d, %g of aperture %d",
			solutions[0].z, solutions[0].aperture, solutions[i].z, solutions[i].aperture))
	}
	beams := uniqueBeams(solutions)
	for i, l := range plan {
		if r.o.Row > 0 && l.aperture != int64(r.o.Row)-1 {
			continue
		}
		d := solutions[i]
		s := Segment{Order: d.aperture, Label: fmt.Sprintf("aperture %d", d.aperture), Unit: all.str("BUNIT"), Source: Source{File: r.c.Name, HDU: h.Index, Row: int(l.flux) + 1}}
		if beams {
			s.Order, s.Label = d.beam, fmt.Sprintf("order %d (aperture %d)", d.beam, d.aperture)
		}
		if d.kind == -1 {
			r.s.Notes = append(r.s.Notes, s.Label+" is not calibrated (dtype -1) and was left out")
			continue
		}
		if unitNote != "" {
			s.note("%s", unitNote)
		}
		if err := r.aperture(h, all, s, l, d, px, unit); err != nil {
			return err
		}
	}
	if r.o.Row > 0 && int64(r.o.Row) > h.Lines() {
		return h.Fail(fmt.Sprintf("there is no image line %d; it has %d", r.o.Row, h.Lines()), "choose another row")
	}
	return nil
}

// aperture reads one line with its dispersion.
func (r *reader) aperture(h *fits.HDU, all cards, s Segment, l aline, d *dispersion, m mapping, unit waveUnit) error {
	flux, err := h.Line(l.flux)
	if err != nil {
		return err
	}
	var sigma []float64
	if l.err >= 0 {
		if sigma, err = h.Line(l.err); err != nil {
			return err
		}
		s.note("the error is band %s", l.by)
	}
	// Pixels beyond nw hold nothing.
	px := pixels{}
	first := -1
	for i := range flux {
		p := m.physical(float64(i + 1))
		if p < 0.5 || p > d.nw+0.5 {
			continue
		}
		if first < 0 {
			first = i
		}
		px.wave, px.flux = append(px.wave, unit.angstrom(d.at(p))), append(px.flux, flux[i])
		if sigma != nil {
			px.err = append(px.err, sigma[i])
		}
	}
	if len(px.wave) < 2 {
		return h.Fail(fmt.Sprintf("%s: %d of %d pixels lie within the nw = %g valid ones", s.Label, len(px.wave), len(flux), d.nw), "the header is damaged")
	}
	if n := len(flux) - len(px.wave); n > 0 {
		s.note("%s beyond the nw = %g valid ones left out", count(n, "pixel"), d.nw)
	}
	px.place = func(i int) string { return fmt.Sprintf("pixel %d", first+i+1) }
	s.compareRough(d)
	r.decide(&s, all, clue{z: d.z}, firstFinite(px.wave))
	return r.finish(s, px)
}

// compareRough sets a function against w1 and dw, which describe its ends: where
// they disagree a number in the header is wrong.
func (s *Segment) compareRough(d *dispersion) {
	if d.kind != 2 || d.dw == 0 {
		return
	}
	for i := range d.parts {
		if k := d.parts[i].curve.bentAt(d.dw); k >= 0 {
			s.note("entry %d of the dispersion, %g, is out of line with those beside it: the header may be damaged", k+1, d.parts[i].curve.c[k])
		}
	}
	lo, hi := d.at(1)*(1+d.z), d.at(d.nw)*(1+d.z)
	tol := roughPixels * math.Abs(d.dw)
	if a, b := d.w1, d.w1+d.dw*(d.nw-1); math.Abs(lo-a) > tol || math.Abs(hi-b) > tol {
		s.note("the dispersion function runs from %.3f to %.3f, but w1, dw and nw of the header say %.3f to %.3f: one of them is wrong", lo, hi, a, b)
	}
}

// roughPixels is how far w1 and dw may lie from the function. Those of TRES and
// UCLES spectra agree to 1e-9 of a pixel; others may have rounded them.
const roughPixels = 0.1

// bentAt looks for entries of a table, or knots of a linear spline, that lie off
// the cubic through the two entries on either side by more than a part of a pixel
// (step, in the unit of the table) and ten times what is usual in it; −1 for none.
func (f *curve) bentAt(step float64) int {
	n := len(f.c)
	if n < 9 || f.kind < linearSpline {
		return -1
	}
	x := func(k int) float64 {
		if f.kind == linearSpline {
			return f.lo + (f.hi-f.lo)*float64(k)/float64(n-1)
		}
		return f.pixel(k)
	}
	off := make([]float64, 0, n)
	for k := 2; k+2 < n; k++ {
		sum := 0.0 // Lagrange
		for _, i := range []int{k - 2, k - 1, k + 1, k + 2} {
			w := 1.0
			for _, j := range []int{k - 2, k - 1, k + 1, k + 2} {
				if j != i {
					w *= (x(k) - x(j)) / (x(i) - x(j))
				}
			}
			sum += w * f.c[i]
		}
		off = append(off, math.Abs(f.c[k]-sum))
	}
	usual := slices.Clone(off)
	slices.Sort(usual)
	worst := 0
	for i := range off {
		if off[i] > off[worst] {
			worst = i
		}
	}
	if off[worst] > bentPixels*math.Abs(step) && off[worst] > 10*usual[len(usual)/4] {
		return worst + 2
	}
	return -1
}

// bentPixels is how far a table entry may lie off its neighbours.
const bentPixels = 0.3

// uniqueBeams reports whether beams are orders: positive, and each there once.
func uniqueBeams(d []*dispersion) bool {
	seen := map[int]bool{}
	for _, x := range d {
		if x.beam <= 0 || seen[x.beam] {
			return false
		}
		seen[x.beam] = true
	}
	return true
}

// watWaveUnit finds the unit of the wavelengths of a multispec image.
func (r *reader) watWaveUnit(h *fits.HDU) (u waveUnit, note string, err error) {
	for _, name := range []string{r.o.WaveUnit, watUnit(r.wat(h, 1)), h.Str("CUNIT1")} {
		if name == "" {
			continue
		}
		if u, ok := parseWaveUnit(name); ok {
			return u, "", nil
		}
		return u, "", h.Fail(fmt.Sprintf("'%s' is not a unit of wavelength (WAT1)", name), `give it: unit = "Angstrom", "nm", "um", …`)
	}
	return waveUnit{wavelength, 1}, "WAT1 gives no unit: Angstrom is taken, as is usual in this layout", nil
}

// A mapping takes image pixels to pixels of the image that was extracted,
// P = (p − LTV)/LTM: it differs where a part was cut out or pixels were summed.
type mapping struct{ ltv, ltm float64 }

func (m mapping) physical(p float64) float64 { return (p - m.ltv) / m.ltm }

func readMapping(h *fits.HDU, axis int) (m mapping, err error) {
	if m.ltv, err = h.Float(fmt.Sprintf("LTV%d", axis), 0); err != nil {
		return m, err
	}
	key := fmt.Sprintf("LTM%d_%d", axis, axis)
	if m.ltm, err = h.Float(key, 1); err != nil {
		return m, err
	}
	if m.ltm == 0 {
		return m, h.Fail(key+" = 0", "the header is damaged")
	}
	other := fmt.Sprintf("LTM%d_%d", axis, 3-axis)
	if x, err := h.Float(other, 0); err != nil || x != 0 {
		return m, h.Fail(fmt.Sprintf("%s = %s: the axes of the image were turned", other, h.Str(other)), "use the image as it was extracted")
	}
	return m, nil
}

// apertures reads what the lines of an IRAF image are: line n of axis 2 is
// aperture n (APNUMn = "aperture beam low high"; in equispec images beam 0 is not
// the object), axis 3 the bands that BANDIDn describes: the flux begins with
// "spectrum", the error with "sigma".
func (r *reader) apertures(h *fits.HDU, c cards) ([]aline, error) {
	if len(h.Axes) < 1 || len(h.Axes) > 3 {
		return nil, h.Fail(fmt.Sprintf("an image of apertures with %d axes", len(h.Axes)), "say which lines: columns = {flux = …, err = …}")
	}
	aps, bands := int64(1), int64(1)
	if len(h.Axes) > 1 {
		aps = h.Axes[1]
	}
	if len(h.Axes) == 3 {
		bands = h.Axes[2]
	}
	if aps > 10000 || bands > 100 {
		return nil, h.Fail(fmt.Sprintf("%d apertures and %d bands", aps, bands), "cut out what you need")
	}
	flux, sigma := int64(-1), int64(-1)
	var left []string
	for b := int64(1); b <= bands; b++ {
		switch id := strings.ToLower(c.str(fmt.Sprintf("BANDID%d", b))); {
		case strings.HasPrefix(id, "spectrum") && flux < 0:
			flux = b - 1
		case strings.HasPrefix(id, "sigma") && sigma < 0:
			sigma = b - 1
		case id != "":
			left = append(left, fmt.Sprintf("%d (%s)", b, firstPart(id, " -")))
		default:
			left = append(left, strconv.FormatInt(b, 10))
		}
	}
	if flux < 0 {
		flux = 0
		left = slices.DeleteFunc(left, func(s string) bool { return firstPart(s, " ") == "1" })
	}
	if bands > 1 && len(left) > 0 {
		r.s.Notes = append(r.s.Notes, "bands left out: "+strings.Join(left, ", "))
	}
	var out []aline
	for a := int64(0); a < aps; a++ {
		l := aline{flux: flux*aps + a, err: -1, aperture: a, inPlane: true, order: int(a) + 1}
		beam := ""
		if words := strings.Fields(c.str(fmt.Sprintf("APNUM%d", a+1))); len(words) > 1 {
			if k, err := strconv.Atoi(words[0]); err == nil {
				l.order = k
			}
			beam = words[1]
		}
		if sameText(c.str(fmt.Sprintf("APID%d", a+1)), "sky") || beam == "0" && !r.isMultispec(h) {
			r.s.Notes = append(r.s.Notes, fmt.Sprintf("aperture %d is sky (APNUM%d, APID%d) and was left out", l.order, a+1, a+1))
			continue
		}
		l.label = fmt.Sprintf("aperture %d", l.order)
		if sigma >= 0 {
			l.err, l.by = sigma*aps+a, fmt.Sprintf("BANDID%d", sigma+1)
		}
		out = append(out, l)
	}
	return out, nil
}

// doppler records a velocity that was taken out of the wavelengths, and finds
// the frame that it leads to: that of a correction of the same size in the
// header, or the source's where it is more than the Earth can move.
func doppler(s *Segment, c cards, v float64, keyword, by string) (frame.Kind, string) {
	kind, why := frame.Unknown, keyword+" says that a velocity was taken out, not to which frame"
	if math.Abs(v) > 35 {
		kind, why = frame.Source, fmt.Sprintf("%s: %+.1f km/s applied, more than the Earth moves", keyword, v)
	}
	for _, key := range solarKeys {
		if w, ok := c.maybe(key.name); ok && math.Abs(w-v) < 0.05 {
			kind, why = key.to, fmt.Sprintf("%s applied the %+.3f km/s of %s", keyword, v, key.name)
		}
	}
	s.Shift = append(s.Shift, frame.Applied{Keyword: keyword, V: v, Done: true, By: by, To: kind})
	s.note("%s; the wavelengths were shifted by %+.3f km/s", why, v)
	return kind, why
}
