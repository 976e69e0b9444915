package clouds

import (
	"math"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"

	"lacuna/budget"
)

// An analysis is the linear model of everything about the solution: the whitened
// design matrix of all parameters, the linear ones included, and what follows.
type analysis struct {
	n, all int   // free parameters; with the linear ones
	at     []int // of each free parameter: at a bound (−1, +1), then counted as fixed
	cov    *mat.SymDense
	null   [][]float64 // directions that the data do not determine
	cond   float64     // of the design matrix, columns scaled to unit length
	chol   [][]float64 // of cov, in the order of order: row i belongs to order[i]
	order  []int
	group  []budget.Cause // of each column of chol: whose innovation it is
	key    []string
	resp   map[string][]float64 // shift of all parameters when f of a line is +1σ
	lines  []string             // the keys of resp, in order
	tied   float64              // Σ over rows of U_i·U_{i−1}, U the basis below
	basis  *mat.Dense           // orthonormal columns that span the design matrix; nil if empty
}

// Directions with a singular value below this part of the largest count as
// undetermined.
const rankTol = 1e-9

// analyse works at x, which becomes the current point.
func (f *Fitter) analyse(x []float64, at []int) *analysis {
	n := len(x)
	a := &analysis{n: n, all: n, at: at}
	m := 0
	for _, w := range f.wins {
		a.all += w.k
		m += w.rows()
	}
	m += len(f.priors)
	design := mat.NewDense(m, max(a.all, 1), nil)
	f.fill(design, x)
	for j, b := range at {
		if b != 0 {
			for i := range m {
				design.Set(i, j, 0)
			}
		}
	}
	q := f.byStrength(m)
	if a.all > 0 {
		a.decompose(design)
		a.innovations(f)
		a.respond(design, q)
	}
	return a
}

// fill sets the design matrix: ∂(model/σ)/∂ of all parameters, whitened.
func (f *Fitter) fill(design *mat.Dense, x []float64) {
	for i := range f.comps {
		f.comps[i].set(x)
	}
	at, lin := 0, len(x)
	for _, w := range f.wins {
		w.absorption(f.comps, x, true)
		w.project(w.resid)
		w.derivatives()
		for i := range w.rows() {
			dst := design.RawRowView(at + i)
			for k, j := range w.cols {
				dst[j] = -w.d.At(i, k)
			}
			for k := range w.k {
				dst[lin+k] = w.a.At(i, k)
			}
		}
		at += w.rows()
		lin += w.k
	}
	for i, p := range f.priors {
		for _, t := range p.value.terms {
			design.Set(at+i, t.j, design.At(at+i, t.j)+t.k/p.sigma)
		}
	}
}

// decompose finds the covariance by a singular value decomposition of R, columns
// scaled to unit length.
func (a *analysis) decompose(design *mat.Dense) {
	m, n := design.Dims()
	scale := make([]float64, n)
	var keep []int
	for j := range n {
		if norm := mat.Norm(design.ColView(j), 2); norm > 0 {
			scale[j] = 1 / norm
			keep = append(keep, j)
		} else if j >= a.n || a.at[j] == 0 {
			dir := make([]float64, n)
			dir[j] = 1
			a.null = append(a.null, dir)
		}
	}
	a.cov = mat.NewSymDense(n, nil)
	if len(keep) == 0 {
		return
	}
	scaled := mat.NewDense(m, len(keep), nil)
	for i := range m {
		src, dst := design.RawRowView(i), scaled.RawRowView(i)
		for l, j := range keep {
			dst[l] = src[j] * scale[j]
		}
	}
	var qr mat.QR
	qr.Factorize(scaled)
	var r mat.Dense
	qr.RTo(&r)
	var svd mat.SVD
	if !svd.Factorize(r.Slice(0, len(keep), 0, len(keep)), mat.SVDThin) {
		a.cond = math.Inf(1)
		return
	}
	values := svd.Values(nil)
	var v mat.Dense
	svd.VTo(&v)
	a.cond = values[0] / max(values[len(values)-1], 1e-300)
	back := mat.NewDense(len(keep), len(keep), nil) // V/s, undetermined directions left out
	for d, s := range values {
		if s > rankTol*values[0] {
			for l := range keep {
				back.Set(l, d, v.At(l, d)/s)
			}
			continue
		}
		dir := make([]float64, n)
		for l, j := range keep {
			dir[j] = v.At(l, d) * scale[j]
		}
		floats.Scale(1/floats.Norm(dir, 2), dir)
		a.null = append(a.null, dir)
	}
	var c mat.Dense
	c.Mul(back, back.T())
	for l, j := range keep {
		for o, i := range keep[:l+1] {
			a.cov.SetSym(j, i, c.At(l, o)*scale[j]*scale[i])
		}
	}
	// How much neighbouring residuals are tied by the fit: U = X V/s.
	var u mat.Dense
	u.Mul(scaled, back)
	a.basis = &u
	for i := 1; i < m; i++ {
		a.tied += floats.Dot(u.RawRowView(i), u.RawRowView(i-1))
	}
}

// covariance returns that of two linear functions of the free parameters.
func (a *analysis) covariance(g, h []float64) float64 {
	sum := 0.0
	for i, gi := range g {
		if gi == 0 {
			continue
		}
		for j, hj := range h {
			if hj != 0 {
				sum += gi * hj * a.cov.At(i, j)
			}
		}
	}
	return sum
}

// determined reports whether the data determine a linear function.
func (a *analysis) determined(g []float64) bool {
	for _, dir := range a.null {
		along, scale := 0.0, 0.0
		for j, gj := range g {
			along += gj * dir[j]
			scale += gj * gj * dir[j] * dir[j]
		}
		if math.Abs(along) > 1e-4*math.Sqrt(scale) && math.Sqrt(scale) > 1e-4*floats.Norm(g, 2) {
			return false
		}
	}
	return true
}
