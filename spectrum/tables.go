package spectrum

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/spectrum/fits"
	"lacuna/spectrum/frame"
)

// tables recognises a table HDU.
func (r *reader) tables(h *fits.HDU) (string, func() error) {
	if h.Kind != fits.Binary && h.Kind != fits.Ascii || h.Rows == 0 || r.isLookup(h) {
		return "", nil
	}
	as := func(layout string, read func(*fits.HDU) error) (string, func() error) {
		return layout, func() error { return read(h) }
	}
	vectors := 0
	for _, c := range h.Cols {
		if c.Variable || c.Repeat > 1 && c.Type != 'A' && c.Type != 'X' {
			vectors++
		}
	}
	vectorWave := false
	if i := h.Col("WAVELENGTH"); i >= 0 {
		vectorWave = h.Cols[i].Variable || h.Cols[i].Repeat > 1
	}
	switch {
	case utype(h, "data.spectralaxis.value", "") >= 0 || strings.HasPrefix(strings.ToUpper(h.Str("VOCLASS")), "SPECTRUM"):
		return as(layoutSDP, r.sdp)
	case vectorWave && (h.Col("SPORDER") >= 0 || h.Col("SEGMENT") >= 0 || h.Col("NELEM") >= 0):
		return layoutX1D, r.x1dAll
	case h.Col("loglam") >= 0 && vectors == 0:
		return as(layoutLogLam, r.rows)
	case vectors >= 2:
		return as(layoutVector, r.vectors)
	case vectors == 0 && h.Rows > 1:
		p, err := pick(columnNames(h), r.o, h.Fail)
		if err != nil {
			return layoutRows, func() error { return err }
		}
		if p.wave >= 0 && p.flux >= 0 || r.o.HDU != "" {
			return as(layoutRows, r.rows)
		}
	}
	return "", nil
}

func columnNames(h *fits.HDU) []string {
	names := make([]string, len(h.Cols))
	for i, c := range h.Cols {
		names[i] = c.Name
	}
	return names
}

// utype finds a column whose TUTYP ends so; of several the one with the prefix
// spec: before eso:, then the one whose TUCD ends in meta.main.
func utype(h *fits.HDU, end, prefix string) int {
	best, rank := -1, -1
	for i, c := range h.Cols {
		u := strings.ToLower(c.Utype)
		if !strings.HasSuffix(u, end) || prefix != "" && utypePrefix(u) != prefix {
			continue
		}
		k := 0
		if p := utypePrefix(u); p == "spec" || p == "spectrum" {
			k = 2
		}
		if strings.HasSuffix(strings.ToLower(c.UCD), "meta.main") {
			k++
		}
		if k > rank {
			best, rank = i, k
		}
	}
	return best
}

func utypePrefix(u string) string {
	if i := strings.IndexAny(u, ":."); i >= 0 {
		return strings.ToLower(u[:i])
	}
	return ""
}

// sdp reads an ESO science data product: each row is a spectrum in array cells,
// its columns told apart by TUTYPn.
func (r *reader) sdp(h *fits.HDU) error {
	p, err := pick(columnNames(h), r.o, h.Fail)
	if err != nil {
		return err
	}
	if i := utype(h, "data.spectralaxis.value", ""); i >= 0 && r.o.WaveCol == "" {
		p.wave = i
	}
	if i := utype(h, "data.fluxaxis.value", ""); i >= 0 && r.o.FluxCol == "" {
		p.flux = i
		prefix := utypePrefix(strings.ToLower(h.Cols[i].Utype))
		if k := utype(h, "data.fluxaxis.accuracy.staterror", prefix); k >= 0 && r.o.ErrCol == "" {
			p.err, p.errKind = k, ""
		}
	}
	if i := utype(h, "accuracy.qualitystatus", ""); i >= 0 && r.o.MaskCol == "" {
		p.mask, p.goodIsZero = i, true
	}
	return r.cells(h, p)
}

// vectors reads any other table whose cells are arrays.
func (r *reader) vectors(h *fits.HDU) error {
	p, err := pick(columnNames(h), r.o, h.Fail)
	if err != nil {
		return err
	}
	return r.cells(h, p)
}

// cells reads one segment a row.
func (r *reader) cells(h *fits.HDU, p picked) error {
	if p.wave < 0 || p.flux < 0 {
		return h.Fail("no column of wavelength and flux is recognised; its columns: "+strings.Join(columnNames(h), ", "), "name them: columns = {wave = …, flux = …}")
	}
	r.describe(r.headers(h))
	for row := int64(0); row < h.Rows; row++ {
		if r.o.Row > 0 && int64(r.o.Row) != row+1 {
			continue
		}
		s := Segment{Order: int(row) + 1, Label: fmt.Sprintf("row %d", row+1), Source: Source{File: r.c.Name, HDU: h.Index, Row: int(row) + 1}, Unit: h.Cols[p.flux].Unit}
		if i := h.Col("ORDER"); i >= 0 && h.Cols[i].Repeat == 1 {
			if v, err := h.Cell(i, row); err == nil && finite(v[0]) && math.Abs(v[0]) < 1e6 {
				s.Order = int(v[0])
				s.Label = fmt.Sprintf("order %d", s.Order)
			}
		}
		if i := h.Col("LABEL"); i >= 0 {
			if t, err := h.Text(i, row); err == nil && t != "" {
				s.Label = t
			}
		}
		var px pixels
		for _, col := range []struct {
			index int
			into  *[]float64
		}{{p.wave, &px.wave}, {p.flux, &px.flux}, {p.err, &px.err}, {p.low, &px.errLow}, {p.cont, &px.cont}} {
			if col.index < 0 {
				continue
			}
			v, err := h.Cell(col.index, row)
			if err != nil {
				return err
			}
			if len(px.wave) > 0 && len(v) != len(px.wave) {
				return h.Fail(fmt.Sprintf("row %d: column %s has %d values, %s has %d", row+1, h.Cols[col.index].Name, len(v), h.Cols[p.wave].Name, len(px.wave)), "name columns that belong together")
			}
			*col.into = v
		}
		if px.err != nil {
			px.err = p.sigma(px.err, px.flux)
		}
		if p.mask >= 0 {
			v, err := h.Cell(p.mask, row)
			if err != nil {
				return err
			}
			if len(v) != len(px.wave) {
				return h.Fail(fmt.Sprintf("row %d: column %s has %d values, the spectrum %d", row+1, h.Cols[p.mask].Name, len(v), len(px.wave)), "name another mask column, or none")
			}
			px.bad = p.flags(v)
			s.note("%s", p.polarity(h.Cols[p.mask].Name))
		}
		if err := r.trim(h, row, &px); err != nil {
			return err
		}
		if err := r.add(h, &s, px, p); err != nil {
			return err
		}
	}
	return r.rowThere(h)
}

// trim keeps the first NELEM values where the table has a column that counts
// them; the rest is filler.
func (r *reader) trim(h *fits.HDU, row int64, px *pixels) error {
	i := h.Col("NELEM")
	if i < 0 || h.Cols[i].Repeat != 1 {
		return nil
	}
	v, err := h.Cell(i, row)
	if err != nil {
		return err
	}
	if len(v) != 1 || !(v[0] >= 1) || v[0] > float64(len(px.wave)) {
		return h.Fail(fmt.Sprintf("row %d: NELEM = %v, but cells have %d values", row+1, v, len(px.wave)), "the table is damaged")
	}
	n := int(v[0])
	*px = px.slice(run{to: n})
	return nil
}

// add converts, decides and keeps a segment of a table.
func (r *reader) add(h *fits.HDU, s *Segment, px pixels, p picked) error {
	col := h.Cols[p.wave]
	if err := r.toWave(s, px.wave, col.Unit, p.nameUnit, p.log10); err != nil {
		return err
	}
	k := clue{ucd: col.UCD, column: col.Name}
	if sameText(col.Name, "wavelength") && h.Col("wavelength_air") >= 0 {
		k.medium, k.by = frame.Vacuum, "column wavelength beside wavelength_air"
	}
	r.decide(s, r.headers(h), k, firstFinite(px.wave))
	return r.finish(*s, px)
}

// rowThere is the error where the user's row is none of the table's.
func (r *reader) rowThere(h *fits.HDU) error {
	if r.o.Row > 0 && int64(r.o.Row) > h.Rows {
		return h.Fail(fmt.Sprintf("there is no row %d; the table has %d", r.o.Row, h.Rows), "choose another row")
	}
	return nil
}

// rows reads a table of one row a pixel.
func (r *reader) rows(h *fits.HDU) error {
	p, err := pick(columnNames(h), r.o, h.Fail)
	if err != nil {
		return err
	}
	if p.wave < 0 || p.flux < 0 {
		return h.Fail("no column of wavelength and flux is recognised; its columns: "+strings.Join(columnNames(h), ", "), "name them: columns = {wave = …, flux = …}")
	}
	c := r.headers(h)
	r.describe(c)
	label := h.Name()
	if label == "" {
		label = fmt.Sprintf("HDU %d", h.Index)
	}
	s := Segment{Order: 1, Label: label, Source: Source{File: r.c.Name, HDU: h.Index}, Unit: h.Cols[p.flux].Unit}
	if s.Unit == "" {
		s.Unit = c.str("BUNIT")
	}
	// FUSE fills gaps with flux and error 0, and its QUALITY is 0 where bad.
	px := pixels{place: func(i int) string { return fmt.Sprintf("row %d", i+1) }, gaps: strings.HasPrefix(strings.ToUpper(c.str("TELESCOP")), "FUSE")}
	for _, col := range []struct {
		index int
		into  *[]float64
	}{{p.wave, &px.wave}, {p.flux, &px.flux}, {p.err, &px.err}, {p.low, &px.errLow}, {p.cont, &px.cont}} {
		if col.index >= 0 {
			if *col.into, err = h.Column(col.index); err != nil {
				return err
			}
		}
	}
	if px.err != nil {
		px.err = p.sigma(px.err, px.flux)
	}
	if p.mask >= 0 {
		v, err := h.Column(p.mask)
		if err != nil {
			return err
		}
		if name, _ := columnName(h.Cols[p.mask].Name); name == "QUALITY" && px.gaps {
			p.goodIsZero = false
		}
		px.bad = p.flags(v)
		s.note("%s", p.polarity(h.Cols[p.mask].Name))
	}
	if p.log10 {
		r.exactLogLam(&s, c, px.wave)
	}
	parts, err := r.tableRuns(h, p, px.wave)
	if err != nil {
		return err
	}
	if len(parts) > 1 {
		r.s.Layout = layoutOrders
	}
	for k, part := range parts {
		if r.o.Row > 0 && r.o.Row != k+1 && len(parts) > 1 {
			continue
		}
		g := s
		g.Notes = slices.Clone(s.Notes)
		if len(parts) > 1 {
			g.Order, g.Label = part.number(k)
		}
		if err := r.add(h, &g, px.slice(part), p); err != nil {
			return err
		}
	}
	if r.o.Row > len(parts) {
		return h.Fail(fmt.Sprintf("there is no order %d in the list; it has %d", r.o.Row, len(parts)), "choose another row")
	}
	return nil
}

// exactLogLam replaces log10 wavelengths in single precision (0.08 km/s) by
// COEFF0 + COEFF1·i where both agree.
func (r *reader) exactLogLam(s *Segment, c cards, v []float64) {
	c0, ok0 := c.maybe("COEFF0")
	c1, ok1 := c.maybe("COEFF1")
	if !ok0 || !ok1 {
		return
	}
	for i, x := range v {
		if !(math.Abs(c0+c1*float64(i)-x) <= 3e-7) {
			return
		}
	}
	for i := range v {
		v[i] = c0 + c1*float64(i)
	}
	s.note("wavelengths from COEFF0 and COEFF1, with which column loglam agrees in single precision")
}
