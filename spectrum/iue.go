package spectrum

import (
	"fmt"
	"math"

	"lacuna/spectrum/fits"
)

// isIUE recognises the tables of extracted IUE spectra: high dispersion with one
// order a row, low dispersion with one aperture a row.
func isIUE(h *fits.HDU) string {
	if h.Kind != fits.Binary || h.Rows == 0 {
		return ""
	}
	scalarWave := false
	if i := h.Col("WAVELENGTH"); i >= 0 {
		scalarWave = h.Cols[i].Repeat == 1 && !h.Cols[i].Variable
	}
	switch {
	case !scalarWave || h.Col("DELTAW") < 0:
		return ""
	case h.Col("STARTPIX") >= 0:
		return layoutMXHI
	}
	return layoutMXLO
}

// iue reads such a table. The wavelength of pixel q (from 1) of a cell is
//
//	λ = WAVELENGTH + DELTAW (q − STARTPIX),  STARTPIX ≤ q < STARTPIX + NPOINTS,
//
// STARTPIX being 1 in low dispersion. The flux is ABS_CAL or FLUX. NOISE of high
// dispersion is in other units and no error of it; SIGMA of low dispersion is the
// error, −1 where there is none. QUALITY is negative where bad.
func (r *reader) iue(h *fits.HDU) error {
	layout := isIUE(h)
	r.s.Layout = layout
	r.describe(r.headers(h))
	o := r.o
	for _, d := range []struct {
		user *string
		name string
	}{{&o.FluxCol, "ABS_CAL"}, {&o.FluxCol, "FLUX"}, {&o.FluxCol, "NET"}, {&o.ErrCol, "SIGMA"}, {&o.MaskCol, "QUALITY"}} {
		if *d.user == "" && h.Col(d.name) >= 0 {
			*d.user = d.name
		}
	}
	o.WaveCol = "WAVELENGTH"
	p, err := pick(columnNames(h), o, h.Fail)
	if err != nil {
		return err
	}
	if p.flux < 0 {
		return h.Fail("no column ABS_CAL, FLUX or NET", "name the flux: columns = {flux = …}")
	}
	for row := range h.Rows {
		if r.o.Row > 0 && int64(r.o.Row) != row+1 {
			continue
		}
		if err := r.iueRow(h, p, row, layout); err != nil {
			return err
		}
	}
	return r.rowThere(h)
}

func (r *reader) iueRow(h *fits.HDU, p picked, row int64, layout string) error {
	s := Segment{Order: int(row) + 1, Label: fmt.Sprintf("row %d", row+1), Source: Source{File: r.c.Name, HDU: h.Index, Row: int(row) + 1}, Unit: h.Cols[p.flux].Unit}
	if i := h.Col("ORDER"); i >= 0 {
		if v, err := h.Cell(i, row); err == nil && len(v) == 1 && finite(v[0]) && math.Abs(v[0]) < 1e6 {
			s.Order = int(v[0])
			s.Label = fmt.Sprintf("order %d", s.Order)
		}
	}
	if i := h.Col("APERTURE"); i >= 0 {
		if text, err := h.Text(i, row); err == nil && text != "" {
			s.Label = "aperture " + text
		}
	}
	flux, err := h.Cell(p.flux, row)
	if err != nil {
		return err
	}
	var number [4]float64
	for i, name := range []string{"WAVELENGTH", "DELTAW", "NPOINTS", "STARTPIX"} {
		number[i] = math.NaN()
		switch col := h.Col(name); {
		case col >= 0:
			v, err := h.Cell(col, row)
			if err != nil {
				return err
			}
			if len(v) == 1 {
				number[i] = v[0]
			}
		case name == "NPOINTS":
			number[i] = float64(len(flux))
		case name == "STARTPIX":
			number[i] = 1
		}
	}
	wave, step, n, start := number[0], number[1], number[2], number[3]
	if n == 0 {
		r.s.Notes = append(r.s.Notes, s.Label+" has no pixels (NPOINTS = 0) and was left out")
		return nil
	}
	if !(start >= 1) || !(n >= 2) || start+n-1 > float64(len(flux)) || start != math.Trunc(start) || n != math.Trunc(n) {
		return h.Fail(fmt.Sprintf("row %d: STARTPIX = %g and NPOINTS = %g do not lie in cells of %d values", row+1, start, n, len(flux)), "the table is damaged")
	}
	if !(wave > 0) || !(step != 0) || !finite(wave+step*n) || wave+step*(n-1) <= 0 {
		return h.Fail(fmt.Sprintf("row %d: WAVELENGTH = %g and DELTAW = %g are no wavelength scale", row+1, wave, step), "the table is damaged")
	}
	from, to := int(start)-1, int(start+n)-1
	px := pixels{flux: flux[from:to], place: func(i int) string { return fmt.Sprintf("pixel %d", from+i+1) }}
	for i := range px.flux {
		px.wave = append(px.wave, wave+step*float64(i))
	}
	cut := func(col int, what string) ([]float64, error) {
		v, err := h.Cell(col, row)
		if err != nil {
			return nil, err
		}
		if len(v) < to {
			return nil, h.Fail(fmt.Sprintf("row %d: column %s has %d values, %d are needed", row+1, what, len(v), to), "the table is damaged")
		}
		return v[from:to], nil
	}
	if p.err >= 0 {
		if px.err, err = cut(p.err, h.Cols[p.err].Name); err != nil {
			return err
		}
		px.err = p.sigma(px.err, px.flux)
	} else if layout == layoutMXHI {
		s.note("no errors: NOISE is in flux numbers, not in the unit of the flux")
	}
	if p.mask >= 0 {
		q, err := cut(p.mask, h.Cols[p.mask].Name)
		if err != nil {
			return err
		}
		px.bad = make([]bool, len(q))
		for i, x := range q {
			px.bad[i] = !(x >= 0)
		}
		s.note("quality column %s: negative is bad", h.Cols[p.mask].Name)
	}
	if layout == layoutMXLO {
		s.note("low dispersion, 6 to 7 Å wide: no velocities finer than some 100 km/s")
	}
	q := picked{wave: p.wave, nameUnit: p.nameUnit}
	return r.add(h, &s, px, q)
}
