package spectrum

import (
	"fmt"
	"math"

	"lacuna/spectrum/fits"
)

// x1dAll reads every SCI table of an HST x1d file.
func (r *reader) x1dAll() error {
	for _, h := range r.file.HDUs {
		if r.o.HDU != "" {
			if chosen, err := r.chosen(); err != nil || chosen != h {
				continue
			}
		}
		if h.Err != nil {
			return h.Err
		}
		if layout, _ := r.tables(h); layout == layoutX1D {
			if err := r.x1d(h); err != nil {
				return err
			}
		}
	}
	return nil
}

// x1d reads one order or detector segment a row. Only the first NELEM values of
// a cell count; a pixel is bad where DQ and SDQFLAGS share a bit or DQ_WGT is 0.
func (r *reader) x1d(h *fits.HDU) error {
	o := r.o
	if o.MaskCol == "" {
		o.MaskCol = "none" // DQ is a set of bits, read below
	}
	p, err := pick(columnNames(h), o, h.Fail)
	if err != nil {
		return err
	}
	if p.flux < 0 {
		return h.Fail("no FLUX column", "name it: columns = {flux = …}")
	}
	c := r.headers(h)
	r.describe(c)
	serious, err := c.number("SDQFLAGS", 31743)
	if err != nil {
		return err
	}
	for row := int64(0); row < h.Rows; row++ {
		if r.o.Row > 0 && int64(r.o.Row) != row+1 {
			continue
		}
		s := Segment{Order: int(row) + 1, Label: fmt.Sprintf("row %d", row+1), Source: Source{File: r.c.Name, HDU: h.Index, Row: int(row) + 1}, Unit: h.Cols[p.flux].Unit}
		if i := h.Col("SEGMENT"); i >= 0 {
			if t, err := h.Text(i, row); err == nil && t != "" {
				s.Label = t
			}
		}
		if i := h.Col("SPORDER"); i >= 0 && h.Col("SEGMENT") < 0 {
			v, err := h.Cell(i, row)
			if err != nil {
				return err
			}
			if len(v) == 1 && math.Abs(v[0]) < 1e6 {
				s.Order = int(v[0])
				s.Label = fmt.Sprintf("order %d", s.Order)
			}
		}
		px, err := r.x1dRow(h, p, row, int64(serious))
		if err != nil {
			return err
		}
		if len(px.wave) == 0 {
			r.s.Notes = append(r.s.Notes, s.Label+" has no pixels (NELEM = 0) and was left out")
			continue
		}
		if px.errLow != nil {
			s.note("two errors: ERROR is the upper one, ERROR_LOWER the lower")
		}
		if err := r.add(h, &s, px, p); err != nil {
			return err
		}
	}
	return r.rowThere(h)
}

// x1dRow reads the cells of a row.
func (r *reader) x1dRow(h *fits.HDU, p picked, row, serious int64) (px pixels, err error) {
	read := func(i int) []float64 {
		if i < 0 || err != nil {
			return nil
		}
		var v []float64
		v, err = h.Cell(i, row)
		return v
	}
	px.wave, px.flux, px.err = read(p.wave), read(p.flux), read(p.err)
	px.errLow = read(p.low)
	dq, weight, elems := read(h.Col("DQ")), read(h.Col("DQ_WGT")), read(h.Col("NELEM"))
	var user []float64
	if p.mask >= 0 {
		user = read(p.mask)
	}
	if err != nil {
		return px, err
	}
	n := len(px.wave)
	if len(elems) == 1 {
		if !(elems[0] >= 0) || elems[0] > float64(n) {
			return px, h.Fail(fmt.Sprintf("row %d: NELEM = %g, but cells have %d values", row+1, elems[0], n), "the table is damaged")
		}
		n = int(elems[0])
	}
	for _, v := range []*[]float64{&px.wave, &px.flux, &px.err, &px.errLow, &dq, &weight, &user} {
		if *v == nil {
			continue
		}
		if len(*v) < n {
			return px, h.Fail(fmt.Sprintf("row %d: a cell has %d values, %d are needed", row+1, len(*v), n), "the table is damaged")
		}
		*v = (*v)[:n]
	}
	px.bad = make([]bool, n)
	for i := range px.bad {
		px.bad[i] = dq != nil && int64(dq[i])&serious != 0 || weight != nil && !(weight[i] > 0)
	}
	if user != nil {
		px.bad = p.flags(user)
	}
	if px.err != nil {
		px.err = p.sigma(px.err, px.flux)
	}
	return px, nil
}
