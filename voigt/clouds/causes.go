package clouds

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"

	"lacuna/budget"
)

// innovations orders the parameters as nuisances first and takes the Cholesky factor
// L of their covariance: x = Σ L_ji ξ_i with independent ξ, so that the parts of an
// error add up to the whole, and what is common to all clouds keeps its sign.
func (a *analysis) innovations(f *Fitter) {
	type slot struct {
		j     int
		cause budget.Cause
		key   string
	}
	var slots, zero, cont, rest []slot
	for _, kind := range []Kind{VelocityZero, WidthFactor} {
		for k, i := range f.params.free {
			p := f.params.all[i]
			switch {
			case p.kind != kind:
			case kind == VelocityZero:
				slots = append(slots, slot{k, budget.VelocityZero, p.name})
			default:
				slots = append(slots, slot{k, budget.Profile, p.name})
			}
		}
	}
	lin := a.n
	for _, w := range f.wins {
		for k := range w.k {
			if k == w.zeroCol {
				zero = append(zero, slot{lin + k, budget.ZeroLevel, "zero level " + w.name})
			} else {
				cont = append(cont, slot{lin + k, budget.Continuum, ""})
			}
		}
		lin += w.k
	}
	for k, i := range f.params.free {
		if kind := f.params.all[i].kind; kind != VelocityZero && kind != WidthFactor {
			rest = append(rest, slot{k, budget.Photon, ""})
		}
	}
	slots = append(append(append(slots, zero...), cont...), rest...)
	n := len(slots)
	a.chol = make([][]float64, n)
	for i, s := range slots {
		a.order = append(a.order, s.j)
		a.group = append(a.group, s.cause)
		a.key = append(a.key, s.key)
		row := make([]float64, i+1)
		for k := range row {
			sum := a.cov.At(s.j, slots[k].j) - floats.Dot(row[:k], a.chol1(k, row)[:k])
			if k == i {
				if sum > 1e-13*a.cov.At(s.j, s.j) {
					row[k] = math.Sqrt(sum)
				}
			} else if d := a.chol[k][k]; d > 0 {
				row[k] = sum / d
			}
		}
		a.chol[i] = row
	}
}

// chol1 is row k of the factor, of which row is the one under way.
func (a *analysis) chol1(k int, row []float64) []float64 {
	if k < len(a.chol) && a.chol[k] != nil {
		return a.chol[k]
	}
	return row
}

// respond finds how all parameters follow when the f of a line is another: −C Xᵀq.
func (a *analysis) respond(design *mat.Dense, q map[string][]float64) {
	a.resp = map[string][]float64{}
	for name := range q {
		a.lines = append(a.lines, name)
	}
	slices.Sort(a.lines)
	for _, name := range a.lines {
		var xq, r mat.VecDense
		xq.MulVec(design.T(), mat.NewVecDense(len(q[name]), q[name]))
		r.MulVec(a.cov, &xq)
		r.ScaleVec(-1, &r)
		a.resp[name] = r.RawVector().Data
	}
}

// shifts splits the error of a linear function of the free parameters by cause.
func (a *analysis) shifts(g []float64) []budget.Shift {
	var out []budget.Shift
	private := map[budget.Cause]float64{}
	for i := range a.order {
		d := 0.0 // Σ_j g_j L_ji over the rows j ≥ i
		for r := i; r < len(a.order); r++ {
			if j := a.order[r]; j < len(g) && g[j] != 0 {
				d += g[j] * a.chol[r][i]
			}
		}
		if d == 0 {
			continue
		}
		if a.key[i] == "" {
			private[a.group[i]] += d * d
		} else {
			out = append(out, budget.Shift{Cause: a.group[i], Key: a.key[i], D: d})
		}
	}
	var all []budget.Shift
	for _, c := range []budget.Cause{budget.Photon, budget.Continuum} {
		if v := private[c]; v > 0 {
			all = append(all, budget.Shift{Cause: c, D: math.Sqrt(v)})
		}
	}
	all = append(all, out...)
	for _, name := range a.lines {
		d := 0.0
		for j, gj := range g {
			d += gj * a.resp[name][j]
		}
		if d != 0 {
			all = append(all, budget.Shift{Cause: budget.FValue, Key: "f:" + name, D: d})
		}
	}
	return all
}

// byStrength returns, for each line whose f has an error, the change of the model
// (whitened, over σ) when f is +1σ.
func (f *Fitter) byStrength(m int) map[string][]float64 {
	out := map[string][]float64{}
	at := 0
	for _, w := range f.wins {
		n := len(w.pix)
		for i := range w.in.Lines {
			l := &w.in.Lines[i]
			if !(l.FErr > 0) {
				continue
			}
			clear(w.tau)
			for k := range w.absorb {
				if a := &w.absorb[k]; a.line == l {
					w.line(a, &f.comps[a.comp], false)
				}
			}
			floats.Mul(w.tau, w.trans)
			col := make([]float64, n)
			for r, wt := range w.grid.weight {
				first := w.grid.first[r]
				col[r] = -w.continuum(r) * floats.Dot(wt, w.tau[first:first+len(wt)]) * l.FErr / l.F
			}
			w.noise.whiten(col, 1)
			if out[l.Name] == nil {
				out[l.Name] = make([]float64, m)
			}
			floats.Add(out[l.Name][at:at+n], col)
		}
		at += w.rows()
	}
	return out
}
