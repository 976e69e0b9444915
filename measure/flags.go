package measure

import (
	"fmt"
	"math"
	"strconv"

	"lacuna/budget"
)

// depths fills in the deepest point.
func (w *work) depths(cover []float64) {
	for i, c := range cover {
		if c > 0 {
			w.out.Depth = max(w.out.Depth, 1-w.f[i])
		}
	}
}

// flags brings what was found about the line to all numbers made from it.
func (w *work) flags() {
	o := &w.out
	if o.Saturated != "" {
		o.Saturate(o.Saturated)
	}
	if w.p.Line.Missing != "" {
		o.Flag |= budget.NoStructure
		w.note("%s is not in the table; it matters where b is below 2 km/s", w.p.Line.Missing)
	}
	o.Flag |= o.W.Flag
	carry := o.Flag & (budget.Blended | budget.InTelluric | budget.InStellar | budget.Filled | budget.NoStructure)
	for _, n := range []*budget.Number{&o.W, &o.V, &o.AOD, &o.AODV, &o.AODB, &o.Linear} {
		n.Flag |= carry
		n.From = w.from()
	}
}

// Saturate makes the columns of a line lower limits, for the reason why unless
// there is one already.
func (o *Width) Saturate(why string) {
	if o.Saturated == "" {
		o.Saturated = why
	}
	o.Flag |= budget.Saturated
	for _, n := range []*budget.Number{&o.AOD, &o.Linear} {
		n.Flag |= budget.Saturated
		if n.Flag&budget.Upper == 0 && !math.IsNaN(n.X) {
			n.Flag |= budget.Lower
		}
	}
}

func (w *work) from() []budget.Ref {
	return []budget.Ref{
		{Kind: "spectrum", Key: w.p.File, Note: fmt.Sprintf("order %d", w.p.Order)},
		{Kind: "line", Key: w.p.Line.Name, Note: fmt.Sprintf("f = %g (%s)", w.p.Line.F, w.p.Line.FSource)},
	}
}

// profile keeps what a figure needs: the window and as much again on either side,
// to five digits.
func (w *work) profile(cover []float64) {
	a, b := w.n, -1
	for i, c := range cover {
		if c > 0 {
			a, b = min(a, i), max(b, i)
		}
	}
	side := max(b-a, 30)
	a, b = max(0, a-side), min(w.n-1, b+side)
	na := w.out.Profile.Na
	p := Profile{}
	m := w.p.Continuum
	basis := make([]float64, len(m.Coef))
	for i := a; i <= b; i++ {
		c := w.cont[i]
		p.V = append(p.V, digits(w.v[i]))
		p.Flux = append(p.Flux, digits(finite(w.p.Flux[i]/c)))
		p.Err = append(p.Err, digits(finite(m.Sigma[i]/c)))
		n := 0.0
		if na != nil {
			n = digits(na[i])
		}
		p.Na = append(p.Na, n)
		m.Basis(basis, w.p.Wave[i])
		v, lo, hi := 0.0, c, c
		for k := range basis {
			for l := range basis {
				v += basis[k] * basis[l] * m.Cov[k*len(basis)+l]
			}
		}
		for _, alt := range w.alt {
			lo, hi = min(lo, alt[i]), max(hi, alt[i])
		}
		p.Placement = append(p.Placement, digits(finite(math.Hypot(math.Sqrt(max(v, 0)), (hi-lo)/2)/c)))
		p.Used = append(p.Used, m.Pixels != nil && m.Pixels[i])
		p.Bad = append(p.Bad, w.bad[i])
	}
	w.out.Profile = p
}

// finite turns what JSON and plots cannot take into 0; such pixels are Bad.
func finite(x float64) float64 {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return 0
	}
	return x
}

// digits rounds to five significant ones.
func digits(x float64) float64 {
	y, err := strconv.ParseFloat(strconv.FormatFloat(x, 'g', 5, 64), 64)
	if err != nil {
		return 0
	}
	return y
}
