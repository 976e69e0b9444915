package clouds

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"lacuna/atomic"
	"lacuna/voigt/lsf"
)

// allOfIt is a problem that uses all that a model has.
func allOfIt(t *testing.T) *Fitter {
	t.Helper()
	table := atomic.Default()
	line := func(name string) atomic.Line {
		l, err := table.Find(name)
		if err != nil {
			t.Fatal(err)
		}
		return l
	}
	window := func(fwhm float64, lo, hi float64, names ...string) Window {
		var w Window
		for _, n := range names {
			w.Lines = append(w.Lines, line(n))
		}
		rest := w.Lines[0].Wave
		for v := lo; v <= hi; v += 1.3 {
			w.Wave = append(w.Wave, rest*(1+v/atomic.C))
			x := (v - 0.4) / 6
			w.Flux = append(w.Flux, 3.3*(1-0.6*math.Exp(-x*x)))
			w.Err = append(w.Err, 0.05)
		}
		w.Mask = make([]bool, len(w.Wave))
		w.Mask[3], w.Mask[len(w.Wave)/2] = true, true
		w.Profile = lsf.Sum{{Weight: 0.8, FWHM: lsf.Velocity(fwhm)}, {Weight: 0.2, FWHM: lsf.Velocity(2 * fwhm), Shift: 0.2}}
		return w
	}
	na := window(3.75, -50, 50, "Na I 5889.95")
	na.Degree, na.Zero, na.ZeroErr, na.Rho, na.Exposure, na.VelocityErr = 2, 0.005, 0.01, []float64{0.33, 0.05}, "night 1", 0.3
	na.Factor = &Curve{Wave: []float64{na.Wave[5], na.Wave[20], na.Wave[40]}, Value: []float64{0.9, 0.97, 0.92}}
	cn := window(5, -120, 60, "CN 3874.603", "CN 3873.994", "CN N=2 3873.366")
	cn.Degree, cn.Instrument, cn.Zero = 1, "blue", 0.01
	k := window(4, -40, 40, "K I 7698.96")
	k.Degree, k.ZeroErr, k.WidthErr, k.Instrument = NoContinuum, 0.02, -1, "red"
	for i := range k.Flux {
		k.Flux[i] /= 3.3
		k.Err[i] = 0.02
	}
	own := Start(1.4)
	offset := Par{Tie: &Tie{Terms: []Term{{"v", 1}, {"offset of K I", 1}}}}
	p := Problem{
		Windows: []Window{na, cn, k},
		Clouds: []Cloud{
			{V: Start(-2.2), Thermal: true, T: Start(800), Turb: Start(0.9), Species: []Species{
				{Carrier: "Na I", LogN: Start(12.1)},
				{Carrier: "K I", LogN: Follow("log N(Na I)", 1, -1.5), V: &offset},
			}},
			{Name: "main", V: Start(1.1), B: Start(1.1).Prior(1, 0.2), Species: []Species{
				{Carrier: "Na I", LogN: Start(12.9), B: &own},
				{Carrier: "K I", Linear: true, LogN: Start(2e11), V: &offset},
				{Carrier: "CN N=0", LogN: Start(12.6)},
				{Carrier: "CN N=1", Boltzmann: &Boltzmann{Of: "CN N=0", T: "T(CN)"}},
				{Carrier: "CN N=2", Boltzmann: &Boltzmann{Of: "CN N=0", T: "T(CN)"}},
			}},
		},
		Shared: []Shared{{"T(CN)", Temperature, Start(2.9)}, {"offset of K I", Velocity, Start(0.1).Prior(0, 0.5)}},
	}
	f, err := New(p, Options{Tau: 1e-12}) // a wing that ends moves with x: a jump for differences
	if err != nil {
		t.Fatal(err)
	}
	return f
}

// The derivatives of everything against differences. For the residuals that the
// continuum leaves, Kaufman's derivative lacks a term; so the continuum is taken as
// known here (the columns of window.d, with the linear parameters frozen).
func TestJacobian(t *testing.T) {
	f := allOfIt(t)
	x := f.Start()
	n := len(x)
	frozen := func(x []float64) []float64 {
		for i := range f.comps {
			f.comps[i].set(x)
		}
		var out []float64
		for _, w := range f.wins {
			w.absorption(f.comps, x, false)
			out = append(out, w.residuals()...)
		}
		return out
	}
	m := f.rows
	r, jac := make([]float64, m), mat.NewDense(m, n, nil)
	(*objective)(f).Eval(x, r, jac) // sets the linear parameters
	design := [][]float64{}
	for _, w := range f.wins {
		w.absorption(f.comps, x, true)
		w.project(w.resid)
		w.derivatives()
		for i := range w.pix {
			row := make([]float64, n)
			for k, j := range w.cols {
				row[j] = w.d.At(i, k)
			}
			design = append(design, row)
		}
	}
	for j, name := range f.Free() {
		h := 1e-4 * max(0.1, math.Abs(x[j]))
		at := func(d float64) []float64 {
			y := append([]float64(nil), x...)
			y[j] += d
			return frozen(y)
		}
		// Richardson: error of order h⁴
		p1, m1, p2, m2 := at(h), at(-h), at(2*h), at(-2*h)
		largest, worst := 0.0, 0.0
		for i := range p1 {
			d := (8*(p1[i]-m1[i]) - (p2[i] - m2[i])) / (12 * h)
			largest = max(largest, math.Abs(d))
			worst = max(worst, math.Abs(d-design[i][j]))
		}
		// slopeTol leaves out elements of 1e-5, trimTol as much; tauTol changes with x
		if !(worst <= 1e-4*largest) || largest == 0 {
			t.Errorf("%s: off by %.1e of %.3g", name, worst/largest, largest)
		}
		t.Logf("%s: %.1e", name, worst/largest)
	}
}

// With data that the model meets, the projected derivatives are those of the projected
// residuals, and no evaluation allocates.
func TestProjectedJacobian(t *testing.T) {
	f := allOfIt(t)
	x := f.Start()
	for i := range f.comps {
		f.comps[i].set(x)
	}
	for _, w := range f.wins { // the model's own fluxes, zero levels in the middle of their priors
		w.absorption(f.comps, x, false)
		w.columns()
		n := len(w.pix)
		lin := make([]float64, w.k)
		if w.deg >= 0 {
			lin[0] = 1
		}
		if w.zeroCol >= 0 {
			lin[w.zeroCol] = w.in.Zero
		}
		for i := range n {
			w.resid[i] = 0
			if w.deg == NoContinuum {
				w.resid[i] = w.flux[i] * w.inv[i]
			}
		}
		w.noise.whiten(w.resid[:n], 1)
		for i := range n {
			w.data[i] = w.resid[i]
			for k, c := range lin {
				w.data[i] += c * w.a.At(i, k)
			}
		}
	}
	n, m := len(x), f.rows
	r, jac := make([]float64, m), mat.NewDense(m, n, nil)
	(*objective)(f).Eval(x, r, jac)
	offset := 0.0 // the priors that x does not meet
	for _, p := range f.priors {
		d := (p.value.at(x) - p.mean) / p.sigma
		offset += d * d
	}
	if c := sum2(r) - offset; !(c <= 1e-20) {
		t.Errorf("χ² = %g of the model's own data", c)
	}
	scratch := mat.NewDense(m, n, nil)
	for j, name := range f.Free() {
		h := 1e-5 * max(0.1, math.Abs(x[j]))
		rp, rm := make([]float64, m), make([]float64, m)
		y := append([]float64(nil), x...)
		y[j] += h
		(*objective)(f).Eval(y, rp, scratch)
		y[j] -= 2 * h
		(*objective)(f).Eval(y, rm, scratch)
		// Q turns with x: compare what does not depend on it, ∂χ²/∂x and the norm
		grad, norm := 0.0, 0.0
		for i := range rp {
			grad += r[i] * jac.At(i, j)
			norm += jac.At(i, j) * jac.At(i, j)
		}
		num := (sum2(rp) - sum2(rm)) / (4 * h)
		curve := (sum2(rp) - 2*sum2(r) + sum2(rm)) / (2 * h * h)
		if !(math.Abs(num-grad) <= 1e-3*math.Sqrt(norm)) {
			t.Errorf("%s: gradient %.6g, differences %.6g (norm %.3g)", name, grad, num, math.Sqrt(norm))
		}
		if !(math.Abs(curve/norm-1) <= 0.02) {
			t.Errorf("%s: curvature %.6g, differences %.6g", name, norm, curve)
		}
	}
	if a := testing.AllocsPerRun(20, func() { (*objective)(f).Eval(x, r, jac) }); a != 0 {
		t.Errorf("%g allocations an evaluation", a)
	}
}

func sum2(r []float64) float64 {
	s := 0.0
	for _, x := range r {
		s += x * x
	}
	return s
}
