package clouds

import (
	"math"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
)

// An objective is a Fitter as lsq sees it.
type objective Fitter

// Points returns the number of residuals.
func (f *objective) Points() int {
	if f.hold != nil {
		return f.rows + 1
	}
	return f.rows
}

// Eval sets the residuals and their derivatives at x.
func (o *objective) Eval(x, r []float64, jac *mat.Dense) {
	f := (*Fitter)(o)
	for i := range f.comps {
		f.comps[i].set(x)
	}
	raw := jac.RawMatrix()
	n := len(x)
	at := 0
	for _, w := range f.wins {
		w.absorption(f.comps, x, true)
		rows := w.rows()
		if !w.project(r[at : at+rows]) {
			r[at] = math.NaN()
			return
		}
		w.derivatives()
		if w.k > 0 {
			w.proj.Jacobian(w.d)
		}
		src := w.d.RawMatrix()
		for i := range rows {
			dst := raw.Data[(at+i)*raw.Stride : (at+i)*raw.Stride+n]
			clear(dst)
			row := src.Data[i*src.Stride:]
			for k, j := range w.cols {
				dst[j] = row[k]
			}
		}
		at += rows
	}
	for i, p := range f.priors {
		r[at+i] = (p.mean - p.value.at(x)) / p.sigma
		dst := raw.Data[(at+i)*raw.Stride : (at+i)*raw.Stride+n]
		clear(dst)
		for _, t := range p.value.terms {
			dst[t.j] -= t.k / p.sigma
		}
	}
	if h := f.hold; h != nil {
		i := f.rows
		r[i] = h.weight * (f.value(h.of, x, h.grad) - h.at)
		dst := raw.Data[i*raw.Stride : i*raw.Stride+n]
		for j, g := range h.grad {
			dst[j] = h.weight * g
		}
	}
}

// absorption computes the transmission on the sub-grid and after the instrument,
// and with slopes the derivatives of the optical depth.
func (w *window) absorption(comps []comp, x []float64, slopes bool) {
	clear(w.tau)
	for i := range w.slope {
		w.slope[i].lo, w.slope[i].hi = 0, 0
	}
	if w.width >= 0 {
		w.grid.set(x[w.cols[w.width]])
	}
	w.place(x)
	for i := range w.absorb {
		a := &w.absorb[i]
		w.line(a, &comps[a.comp], slopes)
	}
	for j, t := range w.tau {
		switch {
		case t == 0:
			w.trans[j] = 1
		default:
			w.trans[j] = math.Exp(-t)
		}
	}
	if w.factor != nil {
		floats.Mul(w.trans, w.factor)
	}
	for i, wt := range w.grid.weight {
		first := w.grid.first[i]
		w.flux[i] = floats.Dot(wt, w.trans[first:first+len(wt)])
	}
}

// place sets the velocity zero point.
func (w *window) place(x []float64) {
	w.shift = 0
	for _, t := range w.zeroAt {
		w.shift += t.k * x[t.j]
	}
}
