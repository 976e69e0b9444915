package spectrum

import (
	"bytes"
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/internal/table"
)

// ecsv reads a table whose header says names, units and more.
func (r *reader) ecsv() error {
	b, err := r.bytes()
	if err != nil {
		return err
	}
	t, err := table.ReadECSV(bytes.NewReader(b), r.c.Name)
	if err != nil {
		return err
	}
	r.s.Layout = layoutECSV
	sh := &sheet{meta: map[string]string{}, lines: t.Lines}
	for _, kv := range t.Meta {
		key := strings.ToLower(kv.Key)
		switch v := kv.Value.(type) {
		case string, float64, int, int64, bool:
			if slices.Contains(metaKeys, key) {
				sh.meta[key] = fmt.Sprint(v)
			}
		}
	}
	sh.rows = make([][]string, t.Rows())
	for i := range sh.rows {
		sh.rows[i] = make([]string, len(t.Cols))
		for j := range t.Cols {
			sh.rows[i][j] = t.Cols[j].Cells[i].Text
		}
	}
	for _, c := range t.Cols {
		sh.names, sh.units = append(sh.names, c.Name), append(sh.units, c.Unit)
	}
	if len(sh.rows) == 0 {
		return r.fail(0, "fetch the file again", "the table has no rows")
	}
	return r.fromSheet(sh)
}

// fromSheet makes segments of a text table: one, or one for each order of a list.
func (r *reader) fromSheet(sh *sheet) error {
	where := func(what, fix string) error { return r.fail(sh.nameLine, fix, "%s", what) }
	names := sh.names
	var p picked
	var err error
	if names == nil {
		for j := range sh.rows[0] {
			names = append(names, fmt.Sprintf("column %d", j+1))
		}
		p, err = r.byPosition(sh, names)
	} else {
		p, err = pick(names, r.o, where)
	}
	if err != nil {
		return err
	}
	if p.wave < 0 || p.flux < 0 {
		return where("no column of wavelength and flux is recognised; its columns: "+strings.Join(names, ", "), "name them: columns = {wave = …, flux = …}")
	}
	if sh.byPlace {
		r.s.Notes = append(r.s.Notes, "column names from a comment: "+strings.Join(names, ", "))
	}
	r.textHeader(sh)
	parts, err := r.sheetRuns(sh, p, names)
	if err != nil {
		return err
	}
	for k, part := range parts {
		if r.o.Row > 0 && r.o.Row != k+1 {
			continue
		}
		label, number := "table", 1
		if len(parts) > 1 || part.name != "" {
			number, label = part.number(k)
		}
		if err := r.textSegment(sh, p, names, part.from, part.to, label, number); err != nil {
			return err
		}
	}
	return nil
}

// sheetRuns finds the orders in a text table.
func (r *reader) sheetRuns(sh *sheet, p picked, names []string) ([]run, error) {
	column := func(j int) []float64 {
		if j < 0 {
			return nil
		}
		v := make([]float64, len(sh.rows))
		for i := range v {
			v[i], _ = cell(sh.rows[i][j]) // what is no number is an error where it is read
		}
		return v
	}
	order, pixel := -1, -1
	if sh.names != nil {
		order = among(names, orderNames, p.wave, p.flux, p.err)
		pixel = among(names, pixelNames, p.wave, p.flux, p.err)
	}
	if order < 0 {
		return runs(len(sh.rows), nil, column(pixel), column(p.wave), r.o.Layout == byOrders), nil
	}
	return runs(len(sh.rows), func(i int) string { return sh.rows[i][order] }, nil, nil, false), nil
}

// byPosition reads wave, flux, err and mask or continuum by their places.
func (r *reader) byPosition(sh *sheet, names []string) (picked, error) {
	n := len(names)
	p, err := pick(names, r.o, func(what, fix string) error { return r.fail(0, fix, "%s", what) })
	if err != nil {
		return p, err
	}
	set := func(into *int, user string, j int) {
		if user == "" && j < n {
			*into = j
		}
	}
	set(&p.wave, r.o.WaveCol, 0)
	set(&p.flux, r.o.FluxCol, 1)
	set(&p.err, r.o.ErrCol, 2)
	if n > 3 {
		whole := true
		for _, row := range sh.rows {
			if x, ok := cell(row[3]); ok && finite(x) && x != math.Trunc(x) {
				whole = false
				break
			}
		}
		if whole {
			set(&p.mask, r.o.MaskCol, 3)
		} else {
			set(&p.cont, r.o.ContinuumCol, 3)
		}
	}
	return p, nil
}

// textHeader keeps what the header says.
func (r *reader) textHeader(sh *sheet) {
	for _, key := range metaKeys {
		if v, ok := sh.meta[key]; ok {
			r.s.Header[key] = v
		}
	}
	r.s.Object = sh.meta["object"]
	ra, ok1 := angle(sh.meta["ra"], 15)
	dec, ok2 := angle(sh.meta["dec"], 1)
	if r.s.Coord == nil && ok1 && ok2 && ra >= 0 && ra < 360 && math.Abs(dec) <= 90 {
		r.s.Coord = &Coord{ra, dec}
	}
}

// textSegment reads rows a ≤ i < b.
func (r *reader) textSegment(sh *sheet, p picked, names []string, a, b int, label string, number int) error {
	s := Segment{Order: number, Label: label, Source: Source{File: r.c.Name}, Unit: sh.meta["flux_unit"]}
	if sh.units != nil && s.Unit == "" {
		s.Unit = sh.units[p.flux]
	}
	line := func(i int) int {
		if a+i < len(sh.lines) {
			return sh.lines[a+i]
		}
		return 0
	}
	px := pixels{place: func(i int) string { return fmt.Sprintf("line %d", line(i)) }}
	column := func(j int) ([]float64, error) {
		if j < 0 {
			return nil, nil
		}
		v := make([]float64, b-a)
		for i := range v {
			x, ok := cell(sh.rows[a+i][j])
			if !ok {
				return nil, r.fail(line(i), "write a number, or nan where it is missing", "column %s: '%s' is not a number", names[j], sh.rows[a+i][j])
			}
			v[i] = x
		}
		return v, nil
	}
	var mask []float64
	for _, col := range []struct {
		index int
		into  *[]float64
	}{{p.wave, &px.wave}, {p.flux, &px.flux}, {p.err, &px.err}, {p.low, &px.errLow}, {p.cont, &px.cont}, {p.mask, &mask}} {
		v, err := column(col.index)
		if err != nil {
			return err
		}
		*col.into = v
	}
	if px.err != nil {
		px.err = p.sigma(px.err, px.flux)
	}
	if mask != nil {
		px.bad = p.flags(mask)
		s.note("%s", p.polarity(names[p.mask]))
	}
	unit := ""
	if sh.units != nil {
		unit = sh.units[p.wave]
	}
	if err := r.toWave(&s, px.wave, unit, p.nameUnit, p.log10); err != nil {
		return err
	}
	r.decide(&s, nil, clue{column: names[p.wave], meta: sh.meta}, firstFinite(px.wave))
	if x, ok := parseFloat(sh.meta["resolution"]); ok && r.o.Resolution == 0 && x > 1 {
		s.Resolution = x
	}
	s.Normalised = s.Normalised || sameText(sh.meta["normalised"], "true", "yes")
	if name, _ := columnName(names[p.flux]); slices.Contains([]string{"FLUXNORM", "NORMFLUX", "NORMALISEDFLUX", "NORMALIZEDFLUX"}, name) {
		s.Normalised = true
	}
	return r.finish(s, px)
}
