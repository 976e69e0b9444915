package spectrum

import (
	"fmt"
	"io"
	"math"
	"path/filepath"
	"strings"

	"lacuna/internal/disk"
	"lacuna/internal/oops"
	"lacuna/spectrum/fits"
	"lacuna/spectrum/frame"
)

// A Card is a header entry to write beside what the spectrum itself says.
type Card = fits.Entry

// Write writes a spectrum in the layout that the name ends in, complete or not
// at all: .fits a binary table with one row of array cells a segment, .ecsv or
// .csv text. Read gives back wavelengths, flux, error, continuum, mask, medium,
// frame and corrections. All segments must share medium and frame. cards go into
// the FITS primary header, or into the comments of text.
func Write(path string, s *Spectrum, cards ...Card) error {
	if err := writable(path, s); err != nil {
		return err
	}
	switch ext := strings.ToLower(filepath.Ext(path)); ext {
	case ".fits", ".fit":
		return disk.AtomicWrite(path, func(w io.Writer) error { return s.writeTable(w, cards) })
	case ".ecsv":
		return disk.AtomicWrite(path, func(w io.Writer) error { return s.writeText(w, cards, true) })
	case ".csv":
		return disk.AtomicWrite(path, func(w io.Writer) error { return s.writeText(w, cards, false) })
	default:
		return oops.Input(path, "", fmt.Sprintf("there is no layout for names in '%s'", ext), "end the name in .fits, .ecsv or .csv")
	}
}

// WriteImage writes the only segment of a spectrum as a FITS image with a linear
// axis: one line of flux, or two of flux and 1σ error. Masked pixels become NaN.
// The steps must be equal to a thousandth of their mean.
func WriteImage(path string, s *Spectrum, cards ...Card) error {
	if err := writable(path, s); err != nil {
		return err
	}
	if len(s.Segments) != 1 {
		return fmt.Errorf("writing %s: an image holds one segment, not %d", path, len(s.Segments))
	}
	g := &s.Segments[0]
	n := len(g.Wave)
	if n < 2 {
		return fmt.Errorf("writing %s: an image needs 2 pixels", path)
	}
	step := (g.Wave[n-1] - g.Wave[0]) / float64(n-1)
	for i, w := range g.Wave {
		if !(math.Abs(w-g.Wave[0]-float64(i)*step) <= 1e-3*step) {
			return fmt.Errorf("writing %s: the wavelengths are not evenly spaced at pixel %d: write a table", path, i+1)
		}
	}
	flux := make([]float64, n)
	lines := [][]float64{flux}
	for i := range flux {
		if flux[i] = g.Flux[i]; g.Mask[i].Bad() {
			flux[i] = math.NaN()
		}
	}
	ctype := map[frame.Medium]string{frame.Air: "AWAV", frame.Vacuum: "WAVE", frame.UnknownMedium: "LINEAR"}[g.Medium]
	head := []Card{{Key: "CTYPE1", Value: ctype}, {Key: "CUNIT1", Value: "Angstrom"}, {Key: "CRPIX1", Value: 1.0}, {Key: "CRVAL1", Value: g.Wave[0]}, {Key: "CDELT1", Value: step}}
	if g.Err != nil {
		lines = append(lines, g.Err)
		head = append(head, Card{Key: "CTYPE2", Value: "LINEAR"}, Card{Key: "CRPIX2", Value: 1.0}, Card{Key: "CRVAL2", Value: 1.0}, Card{Key: "CDELT2", Value: 1.0},
			Card{Key: "COMMENT", Comment: "row 1 = flux, row 2 = 1-sigma error"})
	}
	if g.Unit != "" {
		head = append(head, Card{Key: "BUNIT", Value: standardUnit(g.Unit)})
	}
	head = append(append(head, s.cards()...), cards...)
	return disk.AtomicWrite(path, func(w io.Writer) error { return fits.WriteImage(w, lines, head) })
}

// writable checks what every layout needs.
func writable(path string, s *Spectrum) error {
	if len(s.Segments) == 0 {
		return fmt.Errorf("writing %s: no segments", path)
	}
	for i := range s.Segments {
		g := &s.Segments[i]
		if err := g.Check(); err != nil {
			return fmt.Errorf("writing %s: %w", path, err)
		}
		if first := &s.Segments[0]; g.Medium != first.Medium || g.Frame != first.Frame {
			return fmt.Errorf("writing %s: segments differ in medium or frame (%s %s, %s %s)", path, first.Medium, first.Frame, g.Medium, g.Frame)
		}
	}
	return nil
}

// correction returns the one between observer and Sun that is written.
func (s *Segment) correction() (frame.Applied, bool) {
	for _, a := range s.Shift {
		if solar(a.To) {
			return a, true
		}
	}
	return frame.Applied{}, false
}

// cards are what the first segment and the object say, in the keywords that the
// reader knows: the correction is applied where SPECSYS says so.
func (s *Spectrum) cards() []Card {
	g := &s.Segments[0]
	var out []Card
	if s.Object != "" {
		out = append(out, Card{Key: "OBJECT", Value: s.Object})
	}
	coord := s.Coord
	if coord == nil {
		coord = g.Coord
	}
	if coord != nil {
		out = append(out, Card{Key: "RA", Value: coord.RA, Comment: "deg, ICRS"}, Card{Key: "DEC", Value: coord.Dec, Comment: "deg, ICRS"})
	}
	if g.Frame != frame.Unknown {
		out = append(out, Card{Key: "SPECSYS", Value: string(g.Frame), Comment: "frame of the wavelengths"})
	}
	if a, ok := g.correction(); ok {
		key := "VHELIO"
		if a.To == frame.Barycentric {
			key = "BARYCORR"
		}
		out = append(out, Card{Key: key, Value: a.V, Comment: "km/s, applied if SPECSYS says so"})
	}
	if g.Resolution > 0 {
		out = append(out, Card{Key: "SPEC_RES", Value: g.Resolution, Comment: "wavelength over FWHM"})
	}
	return append(out, Card{Key: "CONTNORM", Value: g.Normalised, Comment: "T if the continuum is 1"})
}

// writeTable writes one row of array cells a segment. Cells of shorter segments
// are filled up with NaN; NELEM counts what is real.
func (s *Spectrum) writeTable(w io.Writer, extra []Card) error {
	longest := 0
	for i := range s.Segments {
		longest = max(longest, len(s.Segments[i].Wave))
	}
	errors, lower, continuum := s.has()
	var order, nelem, label = fits.Vector{Name: "ORDER", Type: 'J'}, fits.Vector{Name: "NELEM", Type: 'J'}, fits.Vector{Name: "LABEL", Type: 'A'}
	first := &s.Segments[0]
	unit := standardUnit(first.Unit)
	ucd := map[frame.Medium]string{frame.Air: "em.wl;obs.atmos", frame.Vacuum: "em.wl", frame.UnknownMedium: ""}[first.Medium]
	wave := fits.Vector{Name: "WAVE", Unit: "Angstrom", UCD: ucd, Utype: "Spectrum.Data.SpectralAxis.Value", Type: 'D'}
	flux := fits.Vector{Name: "FLUX", Unit: unit, UCD: "phot.flux.density;em.wl;meta.main", Utype: "Spectrum.Data.FluxAxis.Value", Type: 'D'}
	sigma := fits.Vector{Name: "ERR", Unit: unit, UCD: "stat.error;phot.flux.density;em.wl;meta.main", Utype: "Spectrum.Data.FluxAxis.Accuracy.StatError", Type: 'D'}
	low := fits.Vector{Name: "ERR_LOW", Unit: unit, UCD: "stat.error;phot.flux.density;em.wl;stat.min", Utype: "Spectrum.Data.FluxAxis.Accuracy.StatErrLow", Type: 'D'}
	qual := fits.Vector{Name: "QUAL", UCD: "meta.code.qual;meta.main", Utype: "Spectrum.Data.FluxAxis.Accuracy.QualityStatus", Type: 'J'}
	cont := fits.Vector{Name: "CONTINUUM", Unit: unit, UCD: "phot.flux.density;em.wl;spect.continuum", Utype: "Spectrum.Data.BackgroundModel.Continuum", Type: 'D'}
	fill := func(v []float64) []float64 {
		out := make([]float64, longest)
		for i := copy(out, v); i < longest; i++ {
			out[i] = math.NaN()
		}
		return out
	}
	for i := range s.Segments {
		g := &s.Segments[i]
		order.Rows = append(order.Rows, []float64{float64(g.Order)})
		nelem.Rows = append(nelem.Rows, []float64{float64(len(g.Wave))})
		label.Text = append(label.Text, g.Label)
		wave.Rows, flux.Rows = append(wave.Rows, fill(g.Wave)), append(flux.Rows, fill(g.Flux))
		q := make([]float64, longest)
		for j, m := range g.Mask {
			if m.Bad() {
				q[j] = 1
			}
		}
		qual.Rows = append(qual.Rows, q)
		if errors {
			sigma.Rows = append(sigma.Rows, fill(g.Err))
		}
		if lower {
			low.Rows = append(low.Rows, fill(g.ErrLow))
		}
		if continuum {
			cont.Rows = append(cont.Rows, fill(g.Continuum))
		}
	}
	cols := []fits.Vector{order, label, nelem, wave, flux}
	if errors {
		cols = append(cols, sigma)
	}
	if lower {
		cols = append(cols, low)
	}
	cols = append(cols, qual)
	if continuum {
		cols = append(cols, cont)
	}
	head := append(s.cards(), extra...)
	return fits.WriteTable(w, head, "SPECTRUM", cols, []Card{{Key: "VOCLASS", Value: "SPECTRUM V2.0"}})
}

// has reports which columns any segment has; those without are filled with NaN.
func (s *Spectrum) has() (errors, lower, continuum bool) {
	for i := range s.Segments {
		g := &s.Segments[i]
		errors, lower, continuum = errors || g.Err != nil, lower || g.ErrLow != nil, continuum || g.Continuum != nil
	}
	return errors, lower, continuum
}

// value is NaN where there is no column.
func value(v []float64, i int) float64 {
	if v == nil {
		return math.NaN()
	}
	return v[i]
}
