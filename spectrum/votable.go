package spectrum

import (
	"encoding/xml"
	"fmt"
	"io"
	"strconv"
	"strings"

	"lacuna/spectrum/fits"
)

// maxVOTable is the largest VOTable that is read, in bytes.
const maxVOTable = 256 << 20

// A votField is one column of a VOTable.
type votField struct {
	name, id, ucd, utype, unit string
	kind                       string // datatype
	size                       int    // values a cell; −1 any number
	array                      bool   // arraysize is given
	null                       *int64 // of whole numbers

	values []float64 // of all rows
	ends   []int     // of arrays of any length: index after each row's values
}

// A votTable is one TABLE with what stands around it.
type votTable struct {
	name   string
	fields []votField
	rows   int
	said   int // nrows, −1 where not given
	params map[string]string
	fits   []byte // a FITS stream, in place of rows
}

// votable reads an IVOA VOTable with a spectrum: TABLEDATA, BINARY, BINARY2 or a
// FITS stream, its columns told apart by utype, UCD or name.
//
// Sources: VOTable 1.4 and 1.5, Spectrum Data Model 1.2 (IVOA Recommendations).
func (r *reader) votable() error {
	if r.c.Size > maxVOTable {
		return r.fail(0, "cut out what you need", "a VOTable of %d bytes is no spectrum (limit %d)", r.c.Size, maxVOTable)
	}
	v := &votReader{r: r, d: xml.NewDecoder(io.NewSectionReader(r.c, 0, r.c.Size)), params: map[string]string{}}
	v.d.CharsetReader = latinReader
	if err := v.document(); err != nil {
		return err
	}
	var names []string
	for k := range v.tables {
		t := &v.tables[k]
		names = append(names, fmt.Sprintf("%d (%s)", k, t.describe()))
		if r.o.HDU != "" && r.o.HDU != strconv.Itoa(k) && !strings.EqualFold(r.o.HDU, t.name) {
			continue
		}
		if t.fits != nil {
			return r.votFITS(t)
		}
		p, err := t.pick(r.o, func(what, fix string) error { return r.fail(0, fix, "%s", what) })
		if err != nil {
			return err
		}
		if p.wave < 0 || p.flux < 0 {
			continue
		}
		return r.votSpectrum(t, p)
	}
	if len(v.tables) == 0 {
		return r.fail(0, "fetch the file again", "a VOTable without a table")
	}
	return r.fail(0, "name the table by its number from 0 (hdu) and its columns = {wave = …, flux = …}", "no table with a wavelength and a flux column is recognised: %s", strings.Join(names, "; "))
}

// votFITS reads a spectrum that stands as FITS inside a VOTable.
func (r *reader) votFITS(t *votTable) error {
	o := r.o
	o.HDU = ""
	c := fits.FromBytes(r.c.Name, t.fits)
	inner := &reader{o: o, c: c, s: r.s}
	if err := inner.fits(); err != nil {
		return err
	}
	r.s.Layout = layoutVOTable + ", " + r.s.Layout
	return nil
}

func (t *votTable) describe() string {
	var names []string
	for i, f := range t.fields {
		if i == 12 {
			names = append(names, "…")
			break
		}
		names = append(names, f.name)
	}
	return fmt.Sprintf("%s: %d rows, columns %s", t.name, t.rows, strings.Join(names, ", "))
}

// pick chooses columns by the user's word, utype, UCD and name, in that order.
func (t *votTable) pick(o Options, fail func(what, fix string) error) (picked, error) {
	names := make([]string, len(t.fields))
	for i, f := range t.fields {
		names[i] = f.name
	}
	p, err := pick(names, o, fail)
	if err != nil {
		return p, err
	}
	match := func(user string, into *int, utypes []string, ucds []string) bool {
		if user != "" {
			return false
		}
		for _, end := range utypes {
			for i, f := range t.fields {
				if strings.HasSuffix(strings.ToLower(f.utype), end) {
					*into = i
					return true
				}
			}
		}
		for _, start := range ucds {
			for i, f := range t.fields {
				if u := strings.ToLower(f.ucd); u == start || strings.HasPrefix(u, start+";") {
					*into = i
					return true
				}
			}
		}
		return false
	}
	if match(o.WaveCol, &p.wave, []string{"data.spectralaxis.value", "spectralaxis.value"}, []string{"em.wl", "em.freq", "em.energy", "em.wavenumber"}) {
		p.log10, p.nameUnit = false, ""
	}
	match(o.FluxCol, &p.flux, []string{"data.fluxaxis.value", "fluxaxis.value"}, []string{"phot.flux.density", "phot.flux", "phot.count", "arith.ratio;phot.flux.density"})
	if match(o.ErrCol, &p.err, []string{"fluxaxis.accuracy.staterror"}, []string{"stat.error;phot.flux.density", "stat.error;phot.flux"}) {
		p.errKind = ""
	}
	if match(o.MaskCol, &p.mask, []string{"fluxaxis.quality", "fluxaxis.accuracy.qualitystatus"}, []string{"meta.code.qual"}) {
		p.goodIsZero = true
	}
	match(o.ContinuumCol, &p.cont, []string{"backgroundmodel.continuum"}, []string{"phot.flux.density;spect.continuum"})
	return p, nil
}

// votSpectrum makes segments of a table: each row of array cells is one, or all
// rows together.
func (r *reader) votSpectrum(t *votTable, p picked) error {
	r.s.Layout = layoutVOTable
	if t.rows == 0 {
		return r.fail(0, "fetch the file again", "table %s has no rows", t.name)
	}
	meta := r.votMeta(t)
	if t.fields[p.wave].array {
		for row := range t.rows {
			if r.o.Row > 0 && r.o.Row != row+1 {
				continue
			}
			if err := r.votSegment(t, p, meta, row, run{}, fmt.Sprintf("row %d", row+1), row+1); err != nil {
				return err
			}
		}
		if r.o.Row > t.rows {
			return r.fail(0, "choose another row", "there is no row %d; the table has %d", r.o.Row, t.rows)
		}
		return nil
	}
	names := make([]string, len(t.fields))
	for i, f := range t.fields {
		names[i] = f.name
	}
	var order func(i int) string
	if i := among(names, orderNames, p.wave, p.flux, p.err); i >= 0 && len(t.fields[i].values) == t.rows {
		v := t.fields[i].values
		order = func(i int) string { return strconv.FormatFloat(v[i], 'f', -1, 64) }
	}
	wave := t.fields[p.wave].values
	if len(wave) != t.rows {
		return r.fail(0, "name another: columns = {wave = …}", "column %s does not hold numbers", names[p.wave])
	}
	parts := runs(t.rows, order, nil, wave, r.o.Layout == byOrders)
	for k, part := range parts {
		if r.o.Row > 0 && r.o.Row != k+1 && len(parts) > 1 {
			continue
		}
		label, number := t.name, 1
		if label == "" {
			label = "table"
		}
		if len(parts) > 1 {
			number, label = part.number(k)
		}
		if err := r.votSegment(t, p, meta, -1, part, label, number); err != nil {
			return err
		}
	}
	return nil
}

// votSegment reads the cells of one row, or a run of rows (row < 0).
func (r *reader) votSegment(t *votTable, p picked, meta map[string]string, row int, part run, label string, number int) error {
	s := Segment{Order: number, Label: label, Source: Source{File: r.c.Name, Row: max(row+1, 0)}, Unit: t.fields[p.flux].unit}
	column := func(j int) ([]float64, error) {
		if j < 0 {
			return nil, nil
		}
		f := &t.fields[j]
		var v []float64
		switch {
		case row < 0 && len(f.values) == t.rows && !f.array:
			v = f.values[part.from:part.to]
		case row >= 0 && f.array && f.size > 0 && len(f.values) == t.rows*f.size:
			v = f.values[row*f.size : (row+1)*f.size]
		case row >= 0 && f.array && len(f.ends) == t.rows:
			from := 0
			if row > 0 {
				from = f.ends[row-1]
			}
			v = f.values[from:f.ends[row]]
		default:
			return nil, r.fail(0, "name columns that belong together", "column %s (%s) does not hold numbers like %s", f.name, f.kind, t.fields[p.wave].name)
		}
		return append([]float64(nil), v...), nil
	}
	px := pixels{place: func(i int) string { return fmt.Sprintf("row %d", part.from+i+1) }}
	if row >= 0 {
		px.place = nil
	}
	var mask []float64
	for _, c := range []struct {
		index int
		into  *[]float64
	}{{p.wave, &px.wave}, {p.flux, &px.flux}, {p.err, &px.err}, {p.cont, &px.cont}, {p.mask, &mask}} {
		v, err := column(c.index)
		if err != nil {
			return err
		}
		if v != nil && len(v) != len(px.wave) && c.index != p.wave {
			return r.fail(0, "name columns that belong together", "row %d: column %s has %d values, %s has %d", row+1, t.fields[c.index].name, len(v), t.fields[p.wave].name, len(px.wave))
		}
		*c.into = v
	}
	if px.err != nil {
		px.err = p.sigma(px.err, px.flux)
	}
	if mask != nil {
		px.bad = p.flags(mask)
		s.note("%s", p.polarity(t.fields[p.mask].name))
	}
	w := &t.fields[p.wave]
	if err := r.toWave(&s, px.wave, w.unit, p.nameUnit, p.log10); err != nil {
		return err
	}
	k := clue{ucd: w.ucd, column: w.name, meta: meta}
	for _, u := range []string{"em.freq", "em.energy", "em.wavenumber"} {
		if strings.HasPrefix(strings.ToLower(w.ucd), u) {
			k.ctype = "FREQ"
		}
	}
	r.decide(&s, nil, k, firstFinite(px.wave))
	if x, ok := parseFloat(meta["resolution"]); ok && r.o.Resolution == 0 && x > 1 {
		s.Resolution = x
	}
	return r.finish(s, px)
}
