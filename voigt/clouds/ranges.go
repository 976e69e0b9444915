package clouds

import (
	"encoding/json"
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/voigt"
)

// A Range is a stretch of velocity (km/s) and what the clouds hold in it: sums that
// stay when the division into clouds does not.
type Range struct {
	V       [2]float64    `json:"v"`
	Columns []RangeColumn `json:"columns"` // of each carrier, in the order of Result.Totals
	Widths  []RangeWidth  `json:"widths"`  // of each line, in the order of wavelength
}

// A RangeColumn is the column of one carrier in a range,
//
//	N = Σ N_c ½ [erf((v₂ − v_c)/b_c) − erf((v₁ − v_c)/b_c)].
type RangeColumn struct {
	Carrier string        `json:"carrier"`
	N       budget.Number `json:"n"` // cm⁻²
	LogN    budget.Number `json:"log_n"`
}

// A RangeWidth is the equivalent width of one line in a range, W = ∫ 1 − e^{−τ} dλ over
// it, as it was before the instrument.
type RangeWidth struct {
	Line string        `json:"line"`
	W    budget.Number `json:"w"` // Å
}

// rangeJSON is a Range as JSON has it: null for an open end.
type rangeJSON struct {
	V       [2]*float64   `json:"v"`
	Columns []RangeColumn `json:"columns"`
	Widths  []RangeWidth  `json:"widths"`
}

// MarshalJSON writes open ends as null.
func (r Range) MarshalJSON() ([]byte, error) {
	out := rangeJSON{Columns: r.Columns, Widths: r.Widths}
	for i := range r.V {
		if finite(r.V[i]) {
			out.V[i] = &r.V[i]
		}
	}
	return json.Marshal(out)
}

// UnmarshalJSON reads what MarshalJSON writes.
func (r *Range) UnmarshalJSON(b []byte) error {
	var in rangeJSON
	if err := json.Unmarshal(b, &in); err != nil {
		return err
	}
	*r = Range{V: everything, Columns: in.Columns, Widths: in.Widths}
	for i, v := range in.V {
		if v != nil {
			r.V[i] = *v
		}
	}
	return nil
}

// Ranges works out the ranges at a result of this fitter; a limit of ±Inf is open.
func (f *Fitter) Ranges(r Result, v ...[2]float64) []Range {
	a := r.a
	for i := range f.comps {
		f.comps[i].set(r.X)
	}
	var out []Range
	for _, lim := range v {
		one := Range{V: lim}
		for _, t := range r.Totals {
			grad := make([]float64, a.n)
			sum := f.columnIn(t.Carrier, lim, grad)
			n := a.number(sum, grad).With(t.N.Flag)
			one.Columns = append(one.Columns, RangeColumn{t.Carrier, n, r.logColumn(a, n, grad, t.Carrier)})
		}
		seen := map[string]bool{}
		for _, w := range f.wins {
			for i := range w.in.Lines {
				l := &w.in.Lines[i]
				if seen[l.Name] {
					continue
				}
				seen[l.Name] = true
				x, grad := f.width(l, lim, a.n)
				n := a.number(x, grad)
				// A line of another f has another N and the same W, to first order.
				n.Shifts = slices.DeleteFunc(n.Shifts, func(s budget.Shift) bool { return s.Cause == budget.FValue })
				one.Widths = append(one.Widths, RangeWidth{l.Name, n})
			}
		}
		out = append(out, one)
	}
	return out
}

// columnIn is the column of a carrier in a range at the current point of the comps; grad,
// if not nil, is set to its gradient.
func (f *Fitter) columnIn(carrier string, lim [2]float64, grad []float64) float64 {
	clear(grad)
	sum := 0.0
	for i := range f.comps {
		c := &f.comps[i]
		if c.carrier != carrier {
			continue
		}
		p, dv, db := inside(lim, c.V, c.B)
		sum += c.N * p
		if grad == nil {
			continue
		}
		byN := p
		if !c.linear {
			byN *= c.N * math.Ln10
		}
		for _, u := range c.dn {
			grad[u.j] += u.k * byN
		}
		for _, u := range c.dv {
			grad[u.j] += c.N * dv * u.k
		}
		for _, u := range c.db {
			grad[u.j] += c.N * db * u.k
		}
	}
	return sum
}

// everything is the range without limits.
var everything = [2]float64{math.Inf(-1), math.Inf(1)}

// inside returns the part of a cloud between two velocities, and its derivatives by v
// and b.
func inside(lim [2]float64, v, b float64) (part, dv, db float64) {
	x, y := (lim[0]-v)/b, (lim[1]-v)/b
	part = 0.5 * (math.Erf(y) - math.Erf(x))
	gx, gy := math.Exp(-x*x)/math.SqrtPi, math.Exp(-y*y)/math.SqrtPi
	dv = (gx - gy) / b
	if !math.IsInf(x, 0) {
		db += x * gx / b
	}
	if !math.IsInf(y, 0) {
		db -= y * gy / b
	}
	return part, dv, db
}

// width integrates a line over a range of velocity, with its gradient. The grid is
// even with steps of a fifth of the narrowest b, on which sums of analytic profiles
// have converged; an open range ends where τ < 1e-9 of 1.
func (f *Fitter) width(l *atomic.Line, lim [2]float64, n int) (w float64, grad []float64) {
	grad = make([]float64, n)
	lo, hi, b := math.Inf(1), math.Inf(-1), math.Inf(1)
	for i := range f.comps {
		if c := &f.comps[i]; c.carrier == l.Carrier() {
			reach := c.B * extent(voigt.Damping(l.Gamma, l.Wave, c.B), 1e-9/math.Abs(peakTau(l, c.N, c.B)))
			for _, p := range l.Within(0) {
				lo, hi = min(lo, c.V+p.DV-reach), max(hi, c.V+p.DV+reach)
			}
			b = min(b, c.B)
		}
	}
	lo, hi = max(lo, lim[0]), min(hi, lim[1])
	if !(hi > lo) || !(b > 0) {
		return 0, grad
	}
	const most = 200_000
	steps := min(most, int((hi-lo)/(b/5))+2)
	h := (hi - lo) / float64(steps)
	wave, tau := make([]float64, steps), make([]float64, steps)
	for j := range wave {
		wave[j] = l.Wave * (1 + (lo+(float64(j)+0.5)*h)/atomic.C)
	}
	g := voigt.Gradient{LogN: make([]float64, steps), V: make([]float64, steps), B: make([]float64, steps)}
	total := make([]float64, steps)
	for i := range f.comps {
		if c := &f.comps[i]; c.carrier == l.Carrier() && c.N > 0 {
			voigt.AddTau(total, wave, *l, voigt.Cloud{V: c.V, B: c.B, LogN: c.logN()})
		}
	}
	trans := make([]float64, steps)
	dw := h * l.Wave / atomic.C
	for j, t := range total {
		trans[j] = math.Exp(-t)
		w += (1 - trans[j]) * dw
	}
	for i := range f.comps {
		c := &f.comps[i]
		if c.carrier != l.Carrier() || !(c.N > 0) {
			continue
		}
		clear(tau)
		clear(g.LogN)
		clear(g.V)
		clear(g.B)
		voigt.AddTauGrad(tau, g, wave, *l, voigt.Cloud{V: c.V, B: c.B, LogN: c.logN()})
		byN := floats.Dot(g.LogN, trans) * dw
		if c.linear {
			byN /= c.N * math.Ln10
		}
		for _, u := range c.dn {
			grad[u.j] += u.k * byN
		}
		for _, u := range c.dv {
			grad[u.j] += u.k * floats.Dot(g.V, trans) * dw
		}
		for _, u := range c.db {
			grad[u.j] += u.k * floats.Dot(g.B, trans) * dw
		}
	}
	return w, grad
}
