package spectrum

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/spectrum/fits"
)

// tabAxis reads an axis whose wavelengths stand in a table (CTYPE1 = WAVE-TAB):
// PS1_0 names the extension, PS1_1 the column of wavelengths, PS1_2, where there
// is one, that of their indices. Between entries lies a straight line, which goes
// on half an entry beyond the ends. Source: FITS paper III (Greisen et al. 2006,
// A&A 446, 747), section 6.
func (r *reader) tabAxis(h *fits.HDU, c cards, w law, psi func(p float64) float64) (law, error) {
	ext, column := c.str("PS1_0"), c.str("PS1_1")
	if ext == "" || column == "" {
		return w, h.Fail(fmt.Sprintf("CTYPE1='%s' needs PS1_0 and PS1_1, the extension and column of the wavelengths", w.ctype), "correct the header")
	}
	if axis, ok := c.maybe("PV1_3"); ok && axis != 1 {
		return w, h.Fail(fmt.Sprintf("CTYPE1='%s' with a table of %g axes is not read", w.ctype, axis), "save the spectrum as a table")
	}
	version := "1"
	if v, ok := c.maybe("PV1_1"); ok {
		version = fmt.Sprint(v)
	}
	at := slices.IndexFunc(r.file.HDUs, func(g *fits.HDU) bool {
		return g.Kind == fits.Binary && strings.EqualFold(g.Name(), ext) && (g.Str("EXTVER") == version || g.Str("EXTVER") == "" && version == "1")
	})
	if at < 0 {
		return w, h.Fail(fmt.Sprintf("PS1_0='%s': there is no such table (version %s)", ext, version), "fetch the whole file")
	}
	g := r.file.HDUs[at]
	read := func(name string) ([]float64, string, error) {
		i := g.Col(name)
		if i < 0 {
			return nil, "", g.Fail(fmt.Sprintf("there is no column %s, which HDU %d names", name, h.Index), "correct the header")
		}
		if g.Rows > 1 && g.Cols[i].Repeat == 1 {
			v, err := g.Column(i)
			return v, g.Cols[i].Unit, err
		}
		v, err := g.Cell(i, 0)
		return v, g.Cols[i].Unit, err
	}
	wave, unit, err := read(column)
	if err != nil {
		return w, err
	}
	if len(wave) < 2 {
		return w, g.Fail(fmt.Sprintf("column %s has %d wavelengths", column, len(wave)), "fetch the file again")
	}
	index := make([]float64, len(wave))
	for i := range index {
		index[i] = float64(i + 1)
	}
	if name := c.str("PS1_2"); name != "" {
		if index, _, err = read(name); err != nil {
			return w, err
		}
		if len(index) != len(wave) {
			return w, g.Fail(fmt.Sprintf("%d wavelengths and %d indices", len(wave), len(index)), "the table is damaged")
		}
	}
	if index[0] > index[len(index)-1] {
		slices.Reverse(index)
		slices.Reverse(wave)
	}
	for i := range index {
		if !finite(index[i]) || !finite(wave[i]) || i > 0 && !(index[i] > index[i-1]) {
			return w, g.Fail(fmt.Sprintf("entry %d of the wavelength table: index %g, wavelength %g", i+1, index[i], wave[i]), "the table is damaged")
		}
	}
	name := r.o.WaveUnit
	for _, n := range []string{c.str("CUNIT1"), unit} {
		if name == "" {
			name = n
		}
	}
	u, ok := parseWaveUnit(name)
	if !ok {
		return w, h.Fail(fmt.Sprintf("CTYPE1='%s', CUNIT1='%s': '%s' is not a unit of wavelength", w.ctype, c.str("CUNIT1"), name), `give it: unit = "Angstrom", "nm", "um", …`)
	}
	w.kind = "lookup-table"
	table := curve{kind: sampled, x: index, c: wave}
	n := len(index)
	lo, hi := index[0]-0.5*(index[1]-index[0]), index[n-1]+0.5*(index[n-1]-index[n-2])
	w.at = func(p float64) float64 {
		x := psi(p)
		if x < lo || x > hi {
			return math.NaN()
		}
		return u.angstrom(table.between(x))
	}
	return w, nil
}

// isLookup reports whether a table holds the wavelengths of an image.
func (r *reader) isLookup(h *fits.HDU) bool {
	return h.Name() != "" && slices.ContainsFunc(r.file.HDUs, func(g *fits.HDU) bool {
		return g.Kind == fits.Image && strings.HasSuffix(strings.ToUpper(g.Str("CTYPE1")), "-TAB") && strings.EqualFold(g.Str("PS1_0"), h.Name())
	})
}
