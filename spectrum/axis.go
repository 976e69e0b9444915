package spectrum

import (
	"fmt"
	"math"
	"strings"

	"lacuna/spectrum/fits"
	"lacuna/spectrum/frame"
)

// plainTypes are spellings of CTYPE1 that mean no more than "wavelength".
var plainTypes = []string{"", "LINEAR", "LAMBDA", "WAVELENGTH", "WAVELEN", "WAVE", "AWAV", "WAVELENGTHS", "SPECTRUM"}

// axis reads the spectral axis of an image: CRVAL1, CDELT1 or CD1_1, CRPIX1,
// CTYPE1, CUNIT1 and DC-FLAG, by FITS paper III (Greisen et al. 2006, A&A 446,
// 747) and the conventions of IRAF.
func (r *reader) axis(h *fits.HDU, c cards, n int64) (law, error) {
	var w law
	num := func(key string, def float64) (x float64, err error) { return c.number(key, def) }
	crval, err := num("CRVAL1", math.NaN())
	if err != nil {
		return w, err
	}
	crpix, err := num("CRPIX1", 1)
	if err != nil {
		return w, err
	}
	if !c.has("CRPIX1") {
		w.notes = append(w.notes, "CRPIX1 is missing: 1 is taken, as is usual")
	}
	step, stepName, err := r.step(c, &w)
	if err != nil {
		return w, err
	}
	ctype := c.str("CTYPE1")
	w.ctype = ctype
	flag := strings.TrimSuffix(c.str("DC-FLAG"), ".0")
	log10 := flag == "1"
	flagBy := "DC-FLAG=1"
	if c.has("COEFF0") && c.has("COEFF1") && !c.has("DC-FLAG") {
		c0, err0 := num("COEFF0", 0)
		c1, err1 := num("COEFF1", 0)
		if err0 != nil || err1 != nil {
			return w, h.Fail("COEFF0 or COEFF1 is not a number", "correct the card")
		}
		if !c.has("CRVAL1") || crval == c0 {
			crval, step, stepName, crpix, log10, flagBy = c0, c1, "COEFF1", 1, true, "COEFF0"
		}
	}
	ln := strings.HasSuffix(strings.ToUpper(ctype), "-LOG")
	switch r.o.Layout {
	case "":
	case "linear":
		log10, ln = false, false
	case "log10":
		log10, ln, flagBy = true, false, "layout"
	case "ln":
		log10, ln = false, true
	default:
		return w, h.Fail(fmt.Sprintf("layout '%s' is not known", r.o.Layout), `say "linear", "log10" or "ln"`)
	}
	if !finite(crval) {
		return w, h.Fail("no CRVAL1", "give the wavelengths in another way")
	}
	if step == 0 || !finite(step) {
		what := fmt.Sprintf("%s=%g", stepName, step)
		if stepName == "CDELT1" && !c.has("CD1_1") {
			what += " (no CD1_1)"
		}
		return w, h.Fail(fmt.Sprintf("%s: all pixels would have wavelength %g %s", what, crval, c.str("CUNIT1")), "correct the card")
	}
	if log10 {
		end := math.Max(crval+step*(1-crpix), crval+step*(float64(n)-crpix))
		if crval >= 8 || !(end < 8) {
			return w, h.Fail(fmt.Sprintf("%s says log10 wavelengths but CRVAL1=%g: 10^%g is not a wavelength", flagBy, crval, crval), `is the axis linear? Say layout = "linear"`)
		}
	}
	if strings.HasSuffix(strings.ToUpper(ctype), "-TAB") {
		return r.tabAxis(h, c, w, func(p float64) float64 { return crval + step*(p-crpix) })
	}
	unit, conv, err := r.axisUnit(h, c, ctype, crval, crval+step*(float64(n)-1), log10, &w)
	if err != nil {
		return w, err
	}
	switch {
	case log10:
		w.kind = "log-linear"
		w.at = func(p float64) float64 { return unit.angstrom(math.Pow(10, crval+step*(p-crpix))) }
	case ln: // the step is the one at the reference pixel
		w.kind = "WAVE-LOG"
		w.at = func(p float64) float64 { return unit.angstrom(crval * math.Exp(step*(p-crpix)/crval)) }
	default:
		w.kind = "linear"
		w.at = func(p float64) float64 { return unit.angstrom(crval + step*(p-crpix)) }
	}
	if conv != nil {
		inner := w.at
		w.at = func(p float64) float64 { return conv(inner(p)) }
	}
	return w, nil
}

// step returns the step of the axis: CD1_1, else CDELT1·PC1_1.
func (r *reader) step(c cards, w *law) (float64, string, error) {
	cdelt, err := c.number("CDELT1", math.NaN())
	if err != nil {
		return 0, "", err
	}
	pc, err := c.number("PC1_1", 1)
	if err != nil {
		return 0, "", err
	}
	cd, err := c.number("CD1_1", math.NaN())
	if err != nil {
		return 0, "", err
	}
	if math.IsNaN(cd) || cd == 0 && cdelt != 0 && finite(cdelt) {
		return cdelt * pc, "CDELT1", nil
	}
	if finite(cdelt) && math.Abs(cdelt-cd) > 1e-6*math.Abs(cd) {
		w.notes = append(w.notes, fmt.Sprintf("CD1_1 = %g and CDELT1 = %g differ: CD1_1 is taken", cd, cdelt))
	}
	return cd, "CD1_1", nil
}

// axisUnit finds the unit of the axis and, for velocity axes, the conversion.
func (r *reader) axisUnit(h *fits.HDU, c cards, ctype string, first, last float64, log10 bool, w *law) (waveUnit, func(float64) float64, error) {
	code, algorithm, _ := strings.Cut(strings.ToUpper(ctype), "-")
	code, bracket := columnNameUpper(code)
	cunit := c.str("CUNIT1")
	known := strings.Join([]string{"WAVE", "AWAV", "FREQ", "ENER", "WAVN", "VRAD", "VOPT", "ZOPT", "VELO", "LINEAR", "LAMBDA"}, ", ")
	_, typeIsUnit := parseWaveUnit(ctype)
	switch {
	case code == "PIXEL":
		return waveUnit{}, nil, h.Fail("CTYPE1='"+ctype+"': the axis has no wavelength calibration", "calibrate it first")
	case sameText(code, "FREQ", "ENER", "WAVN") || sameText(code, plainTypes...) || typeIsUnit || r.o.WaveUnit != "":
	case sameText(code, "VRAD", "VOPT", "ZOPT", "VELO"):
		conv, err := velocityAxis(h, c, code, cunit)
		return waveUnit{wavelength, 1}, conv, err
	default:
		return waveUnit{}, nil, h.Fail(fmt.Sprintf("CTYPE1='%s', CUNIT1='%s': not a spectral axis that is known (%s)", ctype, cunit, known), "give unit and medium by hand: unit, medium")
	}
	if algorithm != "" && algorithm != "LOG" && sameText(code, "WAVE", "AWAV", "FREQ", "ENER", "WAVN") {
		return waveUnit{}, nil, h.Fail(fmt.Sprintf("CTYPE1='%s': algorithm %s is not read yet", ctype, algorithm), "save the spectrum on a linear axis or as a table")
	}
	card, _ := h.Lookup("CTYPE1")
	for _, name := range []string{r.o.WaveUnit, cunit, watUnit(r.wat(h, 1)), bracket, ctype, card.Comment} {
		if name == "" {
			continue
		}
		if u, ok := parseWaveUnit(name); ok {
			return u, nil, nil
		}
		if name == cunit || name == r.o.WaveUnit {
			return waveUnit{}, nil, h.Fail(fmt.Sprintf("CTYPE1='%s', CUNIT1='%s': '%s' is not a unit of wavelength", ctype, cunit, name), `give it: unit = "Angstrom", "nm", "um", …`)
		}
	}
	switch code { // the units of the standard where CUNIT1 is absent
	case "FREQ":
		return waveUnit{frequency, 1}, nil, nil
	case "ENER":
		return waveUnit{energy, 1 / 1.602176634e-19}, nil, nil // joule
	case "WAVN":
		return waveUnit{wavenumber, 0.01}, nil, nil // per metre
	case "WAVE", "AWAV":
		if first > 5e-8 && first < 1e-5 {
			w.notes = append(w.notes, "CUNIT1 is missing: metres, as the standard says")
			return waveUnit{wavelength, 1e10}, nil, nil
		}
	}
	if log10 {
		first, last = math.Pow(10, first), math.Pow(10, last)
	}
	if u, name, ok := unitBySize(first, last); ok {
		w.guessed = true
		w.notes = append(w.notes, "the axis has no unit: taken for "+name+" by its size")
		return u, nil, nil
	}
	return waveUnit{}, nil, h.Fail(fmt.Sprintf("wavelengths from %g to %g have no unit (no CUNIT1)", first, last), `give it: unit = "Angstrom", "nm", "um", …`)
}

// columnNameUpper takes "WAVELENGTH [ANG]" apart.
func columnNameUpper(s string) (name, unit string) {
	s = strings.TrimSpace(s)
	if i := strings.IndexByte(s, '['); i > 0 && strings.HasSuffix(s, "]") {
		return strings.TrimSpace(s[:i]), strings.TrimSpace(s[i+1 : len(s)-1])
	}
	return s, ""
}

// watUnit reads units= of a WAT string.
func watUnit(wat string) string {
	_, rest, ok := strings.Cut(wat, "units=")
	if !ok {
		return ""
	}
	return strings.Trim(firstPart(rest, " "), `"`)
}

// velocityAxis converts the velocity axes of FITS paper III to wavelengths, with
// λ₀ of RESTWAV (m) or c/RESTFRQ (Hz).
func velocityAxis(h *fits.HDU, c cards, code, cunit string) (func(float64) float64, error) {
	rest, err := c.number("RESTWAV", math.NaN())
	if err != nil {
		return nil, err
	}
	rest *= 1e10
	if math.IsNaN(rest) {
		f, err := c.number("RESTFRQ", math.NaN())
		if err != nil {
			return nil, err
		}
		rest = frame.C * 1e13 / f
	}
	if !(rest > 0) || math.IsInf(rest, 1) {
		return nil, h.Fail("CTYPE1='"+code+"' needs RESTWAV or RESTFRQ", "add the card, in metres or hertz")
	}
	scale := 1 / (1e3 * frame.C) // m/s, the standard's unit, to v/c
	switch {
	case code == "ZOPT":
		scale = 1
	case cunit == "km/s" || cunit == "km s-1" || cunit == "km.s**-1":
		scale = 1 / frame.C
	case cunit != "" && cunit != "m/s" && cunit != "m s-1":
		return nil, h.Fail(fmt.Sprintf("CTYPE1='%s', CUNIT1='%s': the unit must be m/s or km/s", code, cunit), "correct the card")
	}
	switch code {
	case "VRAD":
		return func(x float64) float64 { return rest / (1 - x*scale) }, nil
	case "VELO":
		return func(x float64) float64 { return rest * math.Sqrt((1+x*scale)/(1-x*scale)) }, nil
	}
	return func(x float64) float64 { return rest * (1 + x*scale) }, nil // VOPT, ZOPT
}
