package clouds

import (
	"gonum.org/v1/gonum/floats"
)

// project solves for the linear parameters and sets r (a row each) to the residuals
// that they leave. It reports false where they cannot be found.
func (w *window) project(r []float64) bool {
	n := len(w.pix)
	w.columns()
	w.lost = false
	copy(r, w.data)
	if w.deg == NoContinuum { // the part without linear parameters
		for i, t := range w.flux {
			r[i] = w.fixedPart(t) * w.inv[i]
		}
		w.noise.whiten(r[:n], 1)
		for i := range n {
			r[i] = w.data[i] - r[i]
		}
	}
	if w.k > 0 {
		if w.proj.Factor(w.a) != nil {
			w.lost = true
			return false
		}
		w.proj.Coef(w.lin, r)
		w.proj.Residuals(r)
	}
	return true
}

// fixedPart is the model of a normalised window less its free zero level, for
// transmission t.
func (w *window) fixedPart(t float64) float64 {
	if w.zeroCol < 0 {
		return (t + w.knownZ) / (1 + w.knownZ)
	}
	return t
}

// columns fills the matrix of the linear parameters: F P_k for the continuum, and the
// zero level, which is one constant flux, or 1 − F where the continuum is known
// (added light z raises F to (F + z)/(1 + z), and z/(1 + z) is the parameter).
func (w *window) columns() {
	if w.k == 0 {
		return
	}
	a := w.a.RawMatrix()
	p := w.deg + 1
	n := len(w.pix)
	for i, t := range w.flux {
		row := a.Data[i*a.Stride : i*a.Stride+w.k]
		for k, b := range w.basis[i*p : (i+1)*p] {
			row[k] = (t + w.knownZ) * b
		}
		if w.zeroCol >= 0 {
			row[w.zeroCol] = w.inv[i]
			if p == 0 {
				row[w.zeroCol] *= 1 - t
			}
		}
	}
	w.noise.whiten(a.Data[:n*w.k], w.k)
	if w.zeroRow {
		row := a.Data[n*a.Stride : n*a.Stride+w.k]
		clear(row)
		mean, sigma := w.in.Zero, w.in.ZeroErr
		if p > 0 { // flux z' with the mean level c₀: (z' − Zero c₀)/(ZeroErr) in units of the mean flux
			row[0], row[w.zeroCol] = -mean/sigma, 1/sigma
		} else { // dz/dζ = (1 + z)²
			row[w.zeroCol] = (1 + mean) * (1 + mean) / sigma
		}
	}
}

// continuum returns the continuum over σ of row i.
func (w *window) continuum(i int) float64 {
	p := w.deg + 1
	if p == 0 {
		if w.zeroCol >= 0 {
			return (1 - w.lin[w.zeroCol]) * w.inv[i]
		}
		return w.inv[i] / (1 + w.knownZ)
	}
	return floats.Dot(w.lin[:p], w.basis[i*p:(i+1)*p])
}

// derivatives fills d with −∂(model/σ)/∂x, whitened.
func (w *window) derivatives() {
	raw := w.d.RawMatrix()
	clear(raw.Data)
	if len(w.cols) == 0 {
		return
	}
	for col := range w.cols {
		s := &w.slope[col]
		if s.lo == s.hi {
			continue
		}
		y := s.y[s.lo:s.hi]
		floats.Mul(y, w.trans[s.lo:s.hi])
		first, last := w.grid.seeing(s.lo, s.hi)
		for i := first; i < last; i++ {
			at := w.grid.first[i]
			lo, hi := max(s.lo, at+w.grid.trim[i][0]), min(s.hi, at+w.grid.trim[i][1])
			if lo < hi {
				raw.Data[i*raw.Stride+col] = floats.Dot(w.grid.weight[i][lo-at:hi-at], s.y[lo:hi])
			}
		}
	}
	if w.width >= 0 {
		for i, wt := range w.grid.slope {
			first := w.grid.first[i]
			raw.Data[i*raw.Stride+w.width] -= floats.Dot(wt, w.trans[first:first+len(wt)])
		}
	}
	n := len(w.pix)
	for i := range n {
		floats.Scale(w.continuum(i), raw.Data[i*raw.Stride:i*raw.Stride+raw.Cols])
	}
	w.noise.whiten(raw.Data[:n*raw.Cols], raw.Cols)
}
