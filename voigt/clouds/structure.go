package clouds

import (
	"cmp"
	"math"
	"slices"

	"lacuna/budget"
)

// structureBIC is the ΔBIC up to which a solution says how far the structure is known.
const structureBIC = 6

// found picks the best and works out what its number leaves open.
func (h *hunt) found() (Found, error) {
	best := h.best
	slices.SortStableFunc(h.all, func(a, b *Solution) int {
		if (a == best) != (b == best) {
			if a == best {
				return -1
			}
			return 1
		}
		return cmp.Compare(h.criterion(a), h.criterion(b))
	})
	out := Found{Result: best.result, Fitter: best.fitter, Model: best.clouds}
	out.Conditional = true
	lim := h.Ranges
	if len(lim) == 0 {
		lim = [][2]float64{{math.Inf(-1), math.Inf(1)}}
	}
	for _, s := range h.all {
		if s == best || s.BIC < best.BIC+structureBIC {
			s.ranges = s.fitter.Ranges(s.result, append([][2]float64{{math.Inf(-1), math.Inf(1)}}, lim...)...)
		}
		out.Solutions = append(out.Solutions, *s)
	}
	h.structure(&out, best)
	if err := h.hidden(&out, best); err != nil {
		return Found{}, err
	}
	if len(best.clouds) > 0 {
		out.note("the number of clouds was chosen from the data: errors of single clouds hold for %d clouds only", len(best.clouds))
	}
	return out, nil
}

// structure adds to sums the error that the unknown division into clouds makes,
//
//	σ² = Σ p_k (X_k − X)² / Σ p_k,  p_k = exp(−ΔBIC_k/2),
//
// over all other solutions within ΔBIC < 6 of the best.
func (h *hunt) structure(out *Found, best *Solution) {
	spread := func(x float64, of func(r []Range) float64) float64 {
		sum, weight := 0.0, 0.0
		for _, s := range h.all {
			if s == best || s.ranges == nil {
				continue
			}
			p := math.Exp(-(s.BIC - best.BIC) / 2)
			d := of(s.ranges) - x
			if s.Number == 0 {
				d = -x
			}
			sum += p * d * d
			weight += p
		}
		if !(weight > 0) {
			return 0
		}
		return math.Sqrt(sum / weight)
	}
	column := func(n, logN *budget.Number, of func(r []Range) float64) {
		d := spread(n.X, of)
		if !(d > 0) {
			return
		}
		*n = n.Add(budget.Shift{Cause: budget.Structure, D: d})
		if logN.Kind() == "value" {
			*logN = logN.Add(budget.Shift{Cause: budget.Structure, D: d / (n.X * math.Ln10)})
		} else {
			*logN = budget.Log10(limited(*n))
		}
	}
	for i := range out.Totals {
		t := &out.Totals[i]
		column(&t.N, &t.LogN, func(r []Range) float64 { return r[0].Columns[i].N.X })
	}
	out.Ranges = slices.Clone(best.ranges[1:])
	for k := range out.Ranges {
		g := &out.Ranges[k]
		for i := range g.Columns {
			c := &g.Columns[i]
			column(&c.N, &c.LogN, func(r []Range) float64 { return r[k+1].Columns[i].N.X })
		}
		for i := range g.Widths {
			w := &g.Widths[i].W
			if d := spread(w.X, func(r []Range) float64 { return r[k+1].Widths[i].W.X }); d > 0 {
				*w = w.Add(budget.Shift{Cause: budget.Structure, D: d})
			}
		}
	}
}
