package spectrum

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/spectrum/fits"
)

// isMultispec recognises the IRAF multispec layout.
func (r *reader) isMultispec(h *fits.HDU) bool {
	wat, _ := watText(&h.Header, 0)
	return h.Kind == fits.Image && (strings.Contains(wat, "system=multispec") || sameText(h.Str("CTYPE1"), "MULTISPE"))
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
