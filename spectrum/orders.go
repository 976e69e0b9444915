package spectrum

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"lacuna/spectrum/fits"
)

// byOrders is the user's word that a table lists orders one after another.
const byOrders = "orders"

// Columns that number orders, and columns that number the pixels of an order.
var (
	orderNames = []string{"ORDER", "ORD", "SPORDER", "SEGMENT", "ECHELLEORDER"}
	pixelNames = []string{"COL", "PIXEL", "PIX"}
)

// A run is one order of a list: entries from ≤ i < to.
type run struct {
	from, to int
	name     string // of the order, "" where the list does not number them
}

// runs finds where one order of a list ends and the next begins: where the
// number of the order changes, else where the pixel number starts again, or, on
// the user's word, where the wavelength turns back. Anything else is one run, in
// which a wavelength that turns back is an error: nobody can tell there whether
// orders overlap or lines were swapped.
func runs(n int, order func(i int) string, pixel, wave []float64, user bool) []run {
	var out []run
	cut := func(starts func(i int) bool) []run {
		from := 0
		for i := 1; i <= n; i++ {
			if i < n && !starts(i) {
				continue
			}
			r := run{from: from, to: i}
			if order != nil {
				r.name = order(from)
			}
			out = append(out, r)
			from = i
		}
		return out
	}
	turns := func(v []float64) func(i int) bool {
		up := len(v) > 1 && v[1] > v[0]
		return func(i int) bool { return v[i] != v[i-1] && v[i] > v[i-1] != up }
	}
	switch {
	case order != nil:
		return cut(func(i int) bool { return order(i) != order(i-1) })
	case user:
		return cut(turns(wave))
	case pixel != nil:
		if found := cut(turns(pixel)); len(found)*8 <= n {
			return found
		}
	}
	return []run{{0, n, ""}}
}

// number returns the order number of run k, and a label.
func (r run) number(k int) (int, string) {
	if r.name == "" {
		return k + 1, fmt.Sprintf("order %d", k+1)
	}
	if n, err := strconv.Atoi(strings.TrimSpace(r.name)); err == nil {
		return n, "order " + strings.TrimSpace(r.name)
	}
	return k + 1, strings.TrimSpace(r.name)
}

// among returns the first column with one of these names, −1 for none.
func among(columns, names []string, not ...int) int {
	for _, want := range names {
		for i, c := range columns {
			if name, _ := columnName(c); name == want && !slices.Contains(not, i) {
				return i
			}
		}
	}
	return -1
}

// tableRuns finds the orders in a FITS table of one row a pixel.
func (r *reader) tableRuns(h *fits.HDU, p picked, wave []float64) ([]run, error) {
	names := columnNames(h)
	var pixel []float64
	var order func(i int) string
	if i := among(names, orderNames, p.wave, p.flux, p.err); i >= 0 && h.Cols[i].Repeat == 1 && strings.IndexByte("BIJKL", h.Cols[i].Type) >= 0 {
		v, err := h.Column(i)
		if err != nil {
			return nil, err
		}
		order = func(i int) string { return strconv.FormatFloat(v[i], 'f', -1, 64) }
	} else if i >= 0 && h.Cols[i].Type == 'A' && !h.Cols[i].Variable {
		v := make([]string, h.Rows)
		for row := range v {
			var err error
			if v[row], err = h.Text(i, int64(row)); err != nil {
				return nil, err
			}
		}
		order = func(i int) string { return v[i] }
	} else if i := among(names, pixelNames, p.wave, p.flux, p.err); i >= 0 && h.Cols[i].Repeat == 1 && h.Cols[i].Type != 'A' {
		v, err := h.Column(i)
		if err != nil {
			return nil, err
		}
		pixel = v
	}
	return runs(len(wave), order, pixel, wave, r.o.Layout == byOrders), nil
}

// slice returns the pixels of a run.
func (p pixels) slice(r run) pixels {
	for _, v := range []*[]float64{&p.wave, &p.flux, &p.err, &p.errLow, &p.cont} {
		if *v != nil {
			*v = (*v)[r.from:r.to]
		}
	}
	if p.bad != nil {
		p.bad = p.bad[r.from:r.to]
	}
	if place := p.place; place != nil {
		p.place = func(i int) string { return place(r.from + i) }
	}
	return p
}
