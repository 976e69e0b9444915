package clouds

// Curves is what a figure of one window needs; one number a pixel, masked ones too,
// fluxes in the unit of the input.
type Curves struct {
	Wave, Flux, Err []float64
	Used            []bool
	Continuum       []float64
	Model           []float64   // continuum × transmission after the instrument, with the zero level
	Residual        []float64   // (flux − model)/error; 0 where the pixel is not used
	Cloud           [][]float64 // of each cloud: the model if it alone absorbed
}

// Curves computes window k at the point x (Result.X).
func (f *Fitter) Curves(k int, x []float64) (Curves, error) {
	k = f.place[k]
	in := f.in.Windows[k]
	open := in
	open.Mask = nil
	c := Curves{Wave: in.Wave, Flux: in.Flux, Err: in.Err, Used: make([]bool, len(in.Wave))}
	w := f.wins[k]
	for _, p := range w.pix {
		c.Used[p] = true
	}
	for i := range f.comps {
		f.comps[i].set(x)
	}
	w.absorption(f.comps, x, false)
	if !w.project(w.resid) {
		return c, w.bad("mask less, or lower the degree of the continuum", "the continuum cannot be found")
	}
	// All pixels, masked ones too: the same sub-grid step and width with other rows.
	full := &window{in: &open, name: w.name, width: -1, zeroCol: w.zeroCol, deg: w.deg, k: w.k, unit: w.unit, cut: w.cut, cache: new(gridCache), knownZ: w.knownZ, lin: w.lin}
	full.pix = make([]int, len(in.Wave))
	for i := range full.pix {
		full.pix[i] = i
	}
	full.zeroAt, full.absorb = w.zeroAt, append([]absorber(nil), w.absorb...)
	full.flux = make([]float64, len(full.pix))
	w0 := 0.0
	if w.width >= 0 {
		w0 = x[w.cols[w.width]]
	}
	full.shift = w.shift
	if err := full.regrid(f.comps, w.grid.q, w0, 0); err != nil {
		return c, err
	}
	n := len(in.Wave)
	lo, hi := in.Wave[w.pix[0]], in.Wave[w.pix[len(w.pix)-1]]
	basis := make([]float64, w.deg+1)
	level := func(i int, t float64) (cont, model float64) {
		z := 0.0
		if w.zeroCol >= 0 {
			z = w.lin[w.zeroCol]
		}
		if w.deg == NoContinuum {
			if w.zeroCol >= 0 {
				return 1, t + z*(1-t)
			}
			return 1, full.fixedPart(t)
		}
		u := 0.0
		if hi > lo {
			u = (2*in.Wave[i] - lo - hi) / (hi - lo)
		}
		legendre(basis, u)
		s := 0.0
		for j, b := range basis {
			s += b * w.lin[j]
		}
		return ((1+w.knownZ)*s + z) * w.unit, ((t+w.knownZ)*s + z) * w.unit
	}
	full.absorption(f.comps, x, false)
	c.Continuum, c.Model, c.Residual = make([]float64, n), make([]float64, n), make([]float64, n)
	for i, t := range full.flux {
		c.Continuum[i], c.Model[i] = level(i, t)
		if c.Used[i] {
			c.Residual[i] = (in.Flux[i] - c.Model[i]) / in.Err[i]
		}
	}
	all := full.absorb
	for _, cloud := range f.clouds {
		full.absorb = nil
		for _, a := range all {
			if f.comps[a.comp].cloud == cloud {
				full.absorb = append(full.absorb, a)
			}
		}
		full.absorption(f.comps, x, false)
		one := make([]float64, n)
		for i, t := range full.flux {
			_, one[i] = level(i, t)
		}
		c.Cloud = append(c.Cloud, one)
	}
	return c, nil
}
