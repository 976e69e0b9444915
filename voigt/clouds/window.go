package clouds

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/interp"
	"gonum.org/v1/gonum/mat"

	"lacuna/atomic"
	"lacuna/internal/lsq"
	"lacuna/internal/oops"
	"lacuna/voigt/lsf"
)

// A window is a Window ready to be computed again and again.
type window struct {
	in   *Window
	name string
	unit float64 // flux of in over that used here

	// Rows: one a good pixel, and one more for the prior of the zero level.
	pix   []int     // pixel of each row
	inv   []float64 // 1/σ
	noise noise
	basis []float64 // Legendre polynomials over σ, len(pix) × deg+1
	data  []float64 // y, whitened

	grid   *grid
	cache  *gridCache
	factor []float64 // on the sub-grid; nil: 1
	absorb []absorber
	cut    float64 // wings end at this optical depth
	cols   []int   // free parameter of each column
	width  int     // which column is the width of the profile; −1: none
	zeroAt []term  // of the velocity zero point
	shift  float64 // its value, km/s

	// The linear part: continuum and zero level.
	k       int // columns
	deg     int
	zeroCol int // column of the zero level, −1: none
	zeroRow bool
	knownZ  float64 // added light that is known
	lin     []float64
	lost    bool // the last evaluation failed
	a, d    *mat.Dense
	proj    lsq.Projector

	// At the current point.
	tau, trans []float64 // on the sub-grid
	u, h       []float64
	hu, ha     []float64
	flux       []float64 // of each row: transmission after the instrument
	slope      []stretch // of each column: ∂τ/∂x on the sub-grid
	resid      []float64
	fluxW      []float64 // ∂ flux/∂ ln width
}

// An absorber is one line in one comp.
type absorber struct {
	line  *atomic.Line
	comp  int
	parts []atomic.Part
}

// newWindow checks in and makes all that does not depend on the sub-grid.
func newWindow(in *Window) (*window, error) {
	w := &window{in: in, name: in.Name, width: -1, zeroCol: -1, deg: in.Degree}
	n := len(in.Wave)
	if len(in.Flux) != n || len(in.Err) != n || in.Mask != nil && len(in.Mask) != n || in.Edges != nil && len(in.Edges) != n+1 {
		panic("clouds: the slices of a Window differ in length")
	}
	if len(in.Lines) == 0 {
		return nil, w.bad("list the transitions that may absorb in it", "no line in the window")
	}
	if in.Profile == nil {
		return nil, w.bad("give the resolution of the spectrum", "no line spread function")
	}
	for p := range n {
		if in.Mask != nil && in.Mask[p] {
			continue
		}
		if !finite(in.Flux[p]) || !(in.Err[p] > 0) || !finite(in.Err[p]) {
			return nil, w.bad("mask the pixel", "pixel %d near %.3f Å has flux %g and error %g", p, in.Wave[p], in.Flux[p], in.Err[p])
		}
		w.pix = append(w.pix, p)
	}
	if len(w.pix) == 0 {
		return nil, w.bad("move or widen it, or mask less", "no good pixel in the window")
	}
	if n < 2 && in.Edges == nil {
		return nil, w.bad("widen it", "only one pixel in the window")
	}
	if w.deg < NoContinuum || w.deg > 12 {
		return nil, w.bad("give 0 to 12, 3 is the usual limit", "continuum degree %d", w.deg)
	}
	if math.IsNaN(in.ZeroErr) || in.ZeroErr < 0 || !(in.Zero > -0.5 && in.Zero < 1) {
		return nil, w.bad("give fractions of the continuum, such as 0 ± 0.01", "zero level %g ± %g", in.Zero, in.ZeroErr)
	}
	if math.IsNaN(in.WidthErr) || in.WidthErr > 0.3 {
		return nil, w.bad("give a fraction up to 0.3, such as 0.05", "the width of the line spread function is known to %g", in.WidthErr)
	}
	if math.IsNaN(in.VelocityErr) || in.VelocityErr < 0 || math.IsInf(in.VelocityErr, 0) {
		return nil, w.bad("give km/s", "the velocity zero point is known to %g km/s", in.VelocityErr)
	}
	w.k = w.deg + 1
	if in.ZeroErr > 0 {
		w.zeroCol = w.k
		w.k++
		w.zeroRow = !math.IsInf(in.ZeroErr, 0)
	} else {
		w.knownZ = in.Zero
	}
	if w.rows() < w.k+1 {
		return nil, w.bad("widen it, or lower the degree", "%d pixels for %d numbers of the continuum and zero level", len(w.pix), w.k)
	}
	w.load(in.Flux)
	if err := w.weigh(); err != nil {
		return nil, err
	}
	return w, nil
}

func (w *window) bad(fix, format string, a ...any) error { return bad(w.name, fix, format, a...) }

// rows counts the equations of the window.
func (w *window) rows() int {
	n := len(w.pix)
	if w.zeroRow {
		n++
	}
	return n
}

// weigh prepares weights and polynomials.
func (w *window) weigh() error {
	n := len(w.pix)
	w.inv, w.basis = make([]float64, n), make([]float64, n*(w.deg+1))
	lo, hi := w.in.Wave[w.pix[0]], w.in.Wave[w.pix[n-1]]
	for i, p := range w.pix {
		w.inv[i] = w.unit / w.in.Err[p]
		x := 0.0
		if hi > lo {
			x = (2*w.in.Wave[p] - lo - hi) / (hi - lo)
		}
		row := w.basis[i*(w.deg+1) : (i+1)*(w.deg+1)]
		legendre(row, x)
		for k := range row {
			row[k] *= w.inv[i]
		}
	}
	w.noise = newNoise(w.pix, w.in.Rho)
	w.whitenData(w.in.Flux)
	return nil
}

// load sets the unit of flux: about the continuum, so that all numbers are near 1.
func (w *window) load(flux []float64) {
	all := make([]float64, len(w.pix))
	for i, p := range w.pix {
		all[i] = flux[p]
	}
	slices.Sort(all)
	w.unit = all[len(all)*9/10]
	if !(w.unit > 0) || w.deg == NoContinuum {
		w.unit = 1
	}
}

// whitenData sets data from fluxes in the unit of the input.
func (w *window) whitenData(flux []float64) {
	if w.data == nil {
		w.data = make([]float64, w.rows())
	}
	for i, p := range w.pix {
		w.data[i] = flux[p] / w.unit * w.inv[i]
	}
	w.noise.whiten(w.data[:len(w.pix)], 1)
	if w.zeroRow { // see columns
		z := w.in.Zero
		w.data[len(w.pix)] = 0
		if w.deg == NoContinuum {
			w.data[len(w.pix)] = z * (1 + z) / w.in.ZeroErr
		}
	}
}

// linear prepares the projection once the columns are known.
func (w *window) linear() {
	m := w.rows()
	w.resid = make([]float64, m)
	w.flux, w.fluxW = make([]float64, len(w.pix)), make([]float64, len(w.pix))
	w.d = mat.NewDense(m, max(1, len(w.cols)), nil)
	w.lin = make([]float64, w.k)
	if w.k > 0 {
		w.a = mat.NewDense(m, w.k, nil)
	}
	w.slope = make([]stretch, len(w.cols))
}

// column returns the index of the column of free parameter j, new if need be.
func (w *window) column(j int) int {
	for i, c := range w.cols {
		if c == j {
			return i
		}
	}
	w.cols = append(w.cols, j)
	return len(w.cols) - 1
}

// regrid makes the sub-grid for the clouds at the current point, q steps in a Doppler
// parameter, and a width of the profile about exp(w0).
func (w *window) regrid(comps []comp, q, w0, h float64) error {
	edges := w.in.Edges
	if edges == nil {
		edges = lsf.Edges(w.in.Wave)
	}
	g, err := w.cache.get(gridPlan{edges: edges, pix: w.pix, in: w.in, q: q, w0: w0, h: h, cores: w.cores(comps)})
	if err != nil {
		if m, ok := err.(*oops.Mistake); ok {
			m.Where = w.name + ": " + m.Where
		}
		return err
	}
	w.grid = g
	w.room()
	n := len(w.grid.sub)
	w.factor = nil
	if f := w.in.Factor; f != nil {
		if len(f.Wave) != len(f.Value) || len(f.Wave) < 2 {
			return w.bad("give one value a wavelength", "the stellar or telluric factor has %d wavelengths and %d values", len(f.Wave), len(f.Value))
		}
		for i, v := range f.Value {
			if !(v >= 0) || math.IsInf(v, 0) || !finite(f.Wave[i]) || i > 0 && !(f.Wave[i] > f.Wave[i-1]) {
				return w.bad("give transmissions of 0 or more at ascending wavelengths", "the stellar or telluric factor is %g at %g Å", v, f.Wave[i])
			}
		}
		var spline interp.FritschButland
		if err := spline.Fit(f.Wave, f.Value); err != nil {
			return w.bad("check its numbers", "no curve through the stellar or telluric factor: %v", err)
		}
		w.factor = make([]float64, n)
		for j, x := range w.grid.sub {
			w.factor[j] = spline.Predict(min(max(x, f.Wave[0]), f.Wave[len(f.Wave)-1]))
		}
	}
	// Members of a line closer than a tenth of its b act as one.
	for i := range w.absorb {
		a := &w.absorb[i]
		if c := &comps[a.comp]; c.B > 0 {
			a.parts = a.line.Within(0.1 * gridPart * c.B)
		} else {
			a.parts = a.line.Within(0)
		}
	}
	return nil
}

// room makes the arrays on the sub-grid as long as it.
func (w *window) room() {
	n := len(w.grid.sub)
	for _, s := range []*[]float64{&w.tau, &w.trans, &w.u, &w.h, &w.hu, &w.ha} {
		*s = sized(*s, n)
	}
	for i := range w.slope {
		w.slope[i] = stretch{y: sized(w.slope[i].y, n)}
	}
}
