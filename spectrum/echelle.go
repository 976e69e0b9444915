package spectrum

import (
	"fmt"
	"slices"
	"strings"

	"lacuna/spectrum/fits"
	"lacuna/spectrum/frame"
)

// polynomial evaluates Σ c[k] xᵏ.
func polynomial(c []float64, x float64) float64 {
	sum := 0.0
	for k := len(c) - 1; k >= 0; k-- {
		sum = sum*x + c[k]
	}
	return sum
}

// drsCoefficients returns the prefix of the keywords of an e2ds file of the
// fibre-fed DRS family, "ESO DRS CAL TH" or another observatory's, "" for any
// other file.
func drsCoefficients(h *fits.HDU) string {
	if h.Kind != fits.Image || len(h.Axes) != 2 || h.Axes[1] < 2 {
		return ""
	}
	c := cards{&h.Header}
	key := c.match(func(k string) bool { return strings.HasSuffix(k, " DRS CAL TH COEFF LL0") })
	return strings.TrimSuffix(key, " COEFF LL0")
}

// e2ds reads the extracted orders of the DRS family. Line o of the image is an
// order with
//
//	λ(i) = Σ_k LL[o (deg+1) + k] iᵏ,
//
// i counting from 0, in Å of air at the telescope; the blaze is not removed.
// Orders whose coefficients are all zero are not calibrated.
func (r *reader) e2ds(h *fits.HDU, prefix string) error {
	r.describe(r.headers(h))
	deg, err := h.Int(prefix+" DEG LL", 0)
	if err != nil {
		return err
	}
	if deg < 1 || deg > 20 {
		return h.Fail(fmt.Sprintf("%s DEG LL = %s is not the degree of a polynomial", prefix, h.Str(prefix+" DEG LL")), "the header is damaged")
	}
	if h.Axes[1] > 10000 {
		return h.Fail(fmt.Sprintf("%d orders", h.Axes[1]), "cut out what you need")
	}
	coef := func(o int64) ([]float64, error) {
		c := make([]float64, deg+1)
		for k := range c {
			key := fmt.Sprintf("%s COEFF LL%d", prefix, o*(deg+1)+int64(k))
			if !h.Has(key) {
				return nil, h.Fail(fmt.Sprintf("%s is missing: order %d has no wavelengths", key, o+1), "fetch the file again")
			}
			if c[k], err = h.Float(key, 0); err != nil {
				return nil, err
			}
		}
		return c, nil
	}
	return r.polynomials(h, coef, func(p float64) float64 { return p - 1 })
}

// isKOA recognises the extracted images of the Keck archive for HIRES.
func isKOA(h *fits.HDU) bool { return h.Kind == fits.Image && h.Has("WV_0_01") }

// koa reads such an image. Line n is an order; the cards WV_0_nn and WV_4_nn hold
// four coefficients each of
//
//	λ = Σ_k c_k xᵏ,  x = CRVAL1 + CDELT1 (p − CRPIX1)
//
// in vacuum Å of the heliocentre; x is a column of the detector.
func (r *reader) koa(h *fits.HDU) error {
	r.describe(r.headers(h))
	var axis [3]float64
	for i, key := range []string{"CRVAL1", "CDELT1", "CRPIX1"} {
		var err error
		if axis[i], err = h.Float(key, 1); err != nil {
			return err
		}
	}
	if axis[1] == 0 {
		return h.Fail("CDELT1=0: all pixels would have one wavelength", "correct the card")
	}
	coef := func(o int64) ([]float64, error) {
		var c []float64
		for _, part := range []int{0, 4} {
			key := fmt.Sprintf("WV_%d_%02d", part, o+1)
			words := strings.Fields(strings.ReplaceAll(h.Str(key), ",", " "))
			if len(words) != 4 {
				return nil, h.Fail(fmt.Sprintf("%s holds %d numbers, not 4: order %d has no wavelengths", key, len(words), o+1), "fetch the file again")
			}
			for _, w := range words {
				x, ok := fits.ParseNumber(w)
				if !ok {
					return nil, h.Fail(fmt.Sprintf("%s: '%s' is not a number", key, w), "correct the card")
				}
				c = append(c, x)
			}
		}
		return c, nil
	}
	return r.polynomials(h, coef, func(p float64) float64 { return axis[0] + axis[1]*(p-axis[2]) })
}

// polynomials reads an image whose lines are orders with a polynomial of x(p) each.
func (r *reader) polynomials(h *fits.HDU, coef func(order int64) ([]float64, error), x func(p float64) float64) error {
	n, lines := squeeze(h)
	if lines < 1 {
		return h.Fail("an image of orders with one pixel a line", "the header is damaged")
	}
	var plan []aline
	for o := range lines {
		plan = append(plan, aline{flux: o, err: -1, order: int(o) + 1, label: fmt.Sprintf("order %d", o+1)})
	}
	if r.o.FluxCol != "" {
		return h.Fail("each line of the image is an order", "choose one with row")
	}
	return r.imageLines(h, plan, clue{}, func(l aline, s *Segment) ([]float64, error) {
		c, err := coef(l.flux)
		if err != nil {
			return nil, err
		}
		zero := true
		for _, x := range c {
			zero = zero && x == 0
		}
		if zero {
			r.s.Notes = append(r.s.Notes, l.label+" is not calibrated (all coefficients are 0) and was left out")
			return nil, nil
		}
		wave := make([]float64, n)
		for i := range wave {
			wave[i] = polynomial(c, x(float64(i+1)))
			if !finite(wave[i]) || wave[i] <= 0 {
				return nil, h.Fail(fmt.Sprintf("%s: the polynomial gives wavelength %g at pixel %d", l.label, wave[i], i+1), "the header is damaged")
			}
		}
		return wave, nil
	})
}

// waveImages are names of extensions that hold the wavelength of each pixel, with
// what their names say of medium and frame; the first that is there counts.
var waveImages = []struct {
	name   string
	medium frame.Medium
	frame  frame.Kind
}{
	{"WAVEDATA_VAC_BARY", frame.Vacuum, frame.Barycentric}, {"WAVEDATA_AIR_BARY", frame.Air, frame.Barycentric},
	{"WAVEDATA_VAC", frame.Vacuum, frame.Unknown}, {"WAVEDATA_AIR", frame.Air, frame.Unknown}, {"WAVEDATA", frame.UnknownMedium, frame.Unknown},
	{"WAVELENGTH", frame.UnknownMedium, frame.Unknown}, {"WAVE", frame.UnknownMedium, frame.Unknown},
}

// waveImage finds the extension with the wavelengths of a flux image of equal
// size, as newer pipelines of the DRS family write it; k ≥ 0 is its row above.
func waveImage(h *fits.HDU, hdus []*fits.HDU) (g *fits.HDU, k int) {
	for k, w := range waveImages {
		for _, g := range hdus {
			if g != h && g.Kind == fits.Image && g.Err == nil && strings.EqualFold(g.Name(), w.name) && slices.Equal(g.Axes, h.Axes) && g.Str("EXTVER") == h.Str("EXTVER") {
				return g, k
			}
		}
	}
	return nil, -1
}

// isWaveImage reports whether an HDU only holds wavelengths of another.
func isWaveImage(h *fits.HDU) bool {
	for _, w := range waveImages {
		if strings.EqualFold(h.Name(), w.name) {
			return true
		}
	}
	return false
}

// isFluxName reports whether an image says that it is the flux.
func isFluxName(h *fits.HDU) bool {
	return h.Kind == fits.Image && sameText(h.Name(), "SCIDATA", "SCI", "FLUX", "SPEC", "SPECTRUM", "DATA")
}

// withWaves reads a flux image whose wavelengths are an image too, a segment a
// line. Lines without any wavelength are left out.
func (r *reader) withWaves(h, g *fits.HDU, k int) error {
	r.describe(r.headers(h))
	r.s.Layout = layoutWaveImage
	_, lines := squeeze(h)
	if lines > 10000 {
		return h.Fail(fmt.Sprintf("%d orders", lines), "cut out what you need")
	}
	var plan []aline
	for o := range lines {
		plan = append(plan, aline{flux: o, err: -1, order: int(o) + 1, label: fmt.Sprintf("order %d", o+1)})
	}
	name := r.o.WaveUnit
	if name == "" {
		name = g.Str("BUNIT")
	}
	w := waveImages[k]
	return r.imageLines(h, plan, clue{medium: w.medium, frame: w.frame, by: "extension " + w.name}, func(l aline, s *Segment) ([]float64, error) {
		wave, err := g.Line(l.flux)
		if err != nil {
			return nil, err
		}
		any := false
		for i, x := range wave {
			if !finite(x) || x < 0 {
				wave[i] = 0
			}
			any = any || wave[i] > 0
		}
		if !any {
			r.s.Notes = append(r.s.Notes, l.label+" has no wavelengths and was left out")
			return nil, nil
		}
		return wave, r.toWave(s, wave, name, "", false)
	}, "wavelengths from "+g.Where())
}
