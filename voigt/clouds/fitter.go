package clouds

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"lacuna/atomic"
	"lacuna/internal/lsq"
)

// A Fitter holds one Problem with all its memory. It serves one goroutine; a worker
// keeps one for each shape of problem and gives it new data (SetFlux).
type Fitter struct {
	in     Problem // in our own order: of clouds by velocity, of windows and lines by wavelength
	clouds []int   // place in that order of each cloud as given
	place  []int   // and of each window
	params parameters
	comps  []comp
	wins   []*window
	priors []prior
	q      float64 // sub-grid steps asked for; 0: automatic
	lo, hi []float64
	start  []float64
	rows   int   // residuals
	hold   *hold // one more row, during a profile
	// When a fit ends: see lsq.Options. 0: the defaults of round.
	tol, slow float64
	most      int
	gridX     []float64 // the point that the sub-grids were made for
	ws        lsq.Workspace
}

// A prior is one row: a linear function of the parameters with a Gaussian error.
type prior struct {
	name        string
	value       form
	mean, sigma float64
}

// Options of a Fitter.
type Options struct {
	// Steps of the sub-grid in the narrowest b or in 2σ of the instrument, whichever is
	// smaller; 0: 4, and 6 where a line has τ₀ above 100 (lsf.New states the accuracy).
	Steps float64
	// Tau is the optical depth below which the wing of a line is cut off; 0: 1e-7.
	Tau float64

	cache *gridCache // shared by the fitters of one search; nil: an own one
}

// New checks a problem and prepares its fit.
//
// Errors are the user's, by name of window or parameter: a window without pixels, a
// pixel without flux or error, more parameters than pixels, a species without lines
// and a line without species, bounds that exclude the start, ties that run in a
// circle, and what lsf finds wrong with a line spread function.
func New(p Problem, o Options) (*Fitter, error) {
	f := &Fitter{q: o.Steps}
	f.arrange(p)
	p = f.in
	if o.Tau == 0 {
		o.Tau = tauTol
	}
	if o.cache == nil {
		o.cache = new(gridCache)
	}
	if len(p.Windows) == 0 {
		return nil, bad("", "give at least one", "no window to fit")
	}
	if o.Steps != 0 && !(o.Steps >= 2 && o.Steps <= 100) {
		return nil, bad("", "use 4, or 6 for strong lines", "%g sub-grid steps", o.Steps)
	}
	if !(o.Tau > 0 && o.Tau <= 1e-3) {
		return nil, bad("", "use 1e-7, or less", "wings cut off at an optical depth of %g", o.Tau)
	}
	for i := range p.Windows {
		w, err := newWindow(&p.Windows[i])
		if err != nil {
			return nil, err
		}
		w.cut, w.cache = o.Tau, o.cache
		f.wins = append(f.wins, w)
	}
	if err := f.params.enter(p); err != nil {
		return nil, err
	}
	if err := f.nuisances(); err != nil {
		return nil, err
	}
	if err := f.params.resolve(); err != nil {
		return nil, err
	}
	var err error
	if f.comps, err = f.params.components(p); err != nil {
		return nil, err
	}
	for _, a := range f.params.all {
		if a.par.Sigma > 0 && !(a.par.Fixed) {
			f.priors = append(f.priors, prior{a.name, a.value, a.par.Mean, a.par.Sigma})
		}
	}
	for _, k := range f.params.free {
		a := f.params.all[k]
		f.start, f.lo, f.hi = append(f.start, a.par.Start), append(f.lo, a.lo), append(f.hi, a.hi)
	}
	if err := f.connect(); err != nil {
		return nil, err
	}
	return f, f.regrid(f.start)
}

// arrange puts clouds, windows and lines into an order of its own, so that the
// results are the same to the last digit however they were given.
func (f *Fitter) arrange(p Problem) {
	type named struct {
		c  Cloud
		at int
	}
	var cs []named
	for i, c := range p.Clouds {
		c.Name = cloudName(c, i)
		c.Species = slices.Clone(c.Species)
		slices.SortStableFunc(c.Species, func(a, b Species) int { return cmp.Compare(a.Carrier, b.Carrier) })
		cs = append(cs, named{c, i})
	}
	slices.SortStableFunc(cs, func(a, b named) int {
		if d := cmp.Compare(a.c.V.Start, b.c.V.Start); d != 0 {
			return d
		}
		if d := cmp.Compare(a.c.B.Start, b.c.B.Start); d != 0 {
			return d
		}
		for i := range min(len(a.c.Species), len(b.c.Species)) {
			if d := cmp.Compare(a.c.Species[i].LogN.Start, b.c.Species[i].LogN.Start); d != 0 {
				return d
			}
		}
		return 0
	})
	f.in = Problem{Shared: slices.Clone(p.Shared)}
	slices.SortStableFunc(f.in.Shared, func(a, b Shared) int { return cmp.Compare(a.Name, b.Name) })
	f.clouds = make([]int, len(cs))
	for i, c := range cs {
		f.in.Clouds = append(f.in.Clouds, c.c)
		f.clouds[c.at] = i
	}
	order := make([]int, len(p.Windows))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int {
		x, y := &p.Windows[a], &p.Windows[b]
		if d := slices.Compare(x.Wave, y.Wave); d != 0 {
			return d
		}
		if d := slices.Compare(x.Flux, y.Flux); d != 0 {
			return d
		}
		return slices.Compare(x.Err, y.Err)
	})
	f.place = make([]int, len(order))
	for i, k := range order {
		f.place[k] = i
		w := p.Windows[k]
		if w.Name == "" {
			w.Name = fmt.Sprintf("window %d", k+1)
		}
		w.Lines = slices.Clone(w.Lines)
		slices.SortStableFunc(w.Lines, func(a, b atomic.Line) int {
			if d := cmp.Compare(a.Wave, b.Wave); d != 0 {
				return d
			}
			return cmp.Compare(a.Name, b.Name)
		})
		f.in.Windows = append(f.in.Windows, w)
	}
}

// nuisances adds the widths of the profiles and the velocity zero points.
func (f *Fitter) nuisances() error {
	type known struct {
		window string
		err    float64
	}
	seen := map[string]known{}
	for _, w := range f.wins {
		sigma := w.in.WidthErr
		if sigma == 0 {
			sigma = DefaultWidthErr
		}
		for _, n := range []struct {
			name string
			kind Kind
			err  float64
		}{{widthName(w.in), WidthFactor, sigma}, {zeroName(w.in), VelocityZero, w.in.VelocityErr}} {
			if was, ok := seen[n.name]; ok {
				if was.err != n.err {
					return w.bad("give one, or give them different names", "%s has error %g here and %g in %s", n.name, n.err, was.err, was.window)
				}
				continue
			}
			seen[n.name] = known{w.name, n.err}
			if !(n.err > 0) {
				continue
			}
			if err := f.params.add(n.name, n.kind, -1, Start(0).Prior(0, n.err)); err != nil {
				return err
			}
		}
	}
	return nil
}

func widthName(w *Window) string { return named("profile width", w.Instrument) }
func zeroName(w *Window) string  { return named("velocity zero", w.Exposure) }

func named(what, key string) string {
	if key == "" {
		return what
	}
	return what + " " + key
}

// connect finds which lines of a window each comp absorbs in, and the columns of its
// Jacobian.
func (f *Fitter) connect() error {
	n, spare := len(f.start), 0
	for _, w := range f.wins {
		for i := range w.in.Lines {
			l := &w.in.Lines[i]
			if !(l.Wave > 0) || !(l.F > 0) || !(l.Gamma >= 0) {
				return w.bad("mend its row", "the line %q has no wavelength or no oscillator strength", l.Name)
			}
			found := len(f.in.Clouds) == 0
			for k := range f.comps {
				if f.comps[k].carrier == l.Carrier() {
					w.absorb = append(w.absorb, absorber{line: l, comp: k})
					found = true
				}
			}
			if !found {
				return w.bad(fmt.Sprintf("give a cloud the species %q, or take the line out of the window", l.Carrier()), "no cloud holds %s", l.Name)
			}
		}
		for _, a := range w.absorb {
			c := &f.comps[a.comp]
			c.set(f.start) // the derivatives name the parameters
			for _, ts := range [][]term{c.dv, c.db, c.dn} {
				for _, t := range ts {
					w.column(t.j)
				}
			}
		}
		if i, ok := f.params.byName[zeroName(w.in)]; ok && w.in.VelocityErr > 0 {
			w.zeroAt = f.params.all[i].value.terms
			w.column(w.zeroAt[0].j)
		}
		if i, ok := f.params.byName[widthName(w.in)]; ok && w.in.WidthErr >= 0 {
			w.width = w.column(f.params.all[i].value.terms[0].j)
		}
		w.linear()
		f.rows += w.rows()
		spare += w.rows() - w.k
	}
	f.rows += len(f.priors)
	if spare+len(f.priors) < n {
		pixels := 0
		linear := 0
		for _, w := range f.wins {
			pixels += len(w.pix)
			linear += w.k
		}
		return bad(f.wins[0].name, "widen the windows, or fix or tie parameters",
			"%d parameters (%d of them of the continuum) for %d pixels", n+linear, linear, pixels)
	}
	return nil
}

// regrid makes the sub-grids for the clouds at x.
func (f *Fitter) regrid(x []float64) error {
	f.gridX = append(f.gridX[:0], x...)
	for i := range f.comps {
		f.comps[i].set(x)
	}
	for _, w := range f.wins {
		w.place(x)
		tau := 0.0
		for _, a := range w.absorb {
			if c := &f.comps[a.comp]; c.B > 0 {
				tau = max(tau, math.Abs(peakTau(a.line, c.N, c.B)))
			}
		}
		q := f.q
		if q == 0 {
			q = 4
			if tau > 100 {
				q = 6
			}
		}
		w0, h := 0.0, 0.0
		if w.width >= 0 {
			k := f.params.free[w.cols[w.width]]
			w0 = x[w.cols[w.width]]
			h = min(max(2*f.params.all[k].par.Sigma, 0.02), 0.15)
		}
		if err := w.regrid(f.comps, q, w0, h); err != nil {
			return err
		}
	}
	return nil
}

// The sub-grid is made for clouds this much narrower than they are, so that they may
// become narrower during a fit; and renewed when one has fewer than gridLimit times the
// points that were asked for.
const (
	gridPart  = 0.7
	gridLimit = 0.8
)

// stale reports whether a sub-grid no longer suits the clouds at x.
func (f *Fitter) stale(x []float64) bool {
	for i := range f.comps {
		f.comps[i].set(x)
	}
	for _, w := range f.wins {
		w.place(x)
		for _, c := range w.cores(f.comps) {
			if !w.grid.density.covers(c, w.grid.q) {
				return true
			}
		}
		if w.width >= 0 && math.Abs(x[w.cols[w.width]]-w.grid.at) > 0.1 {
			return true
		}
	}
	return false
}

// SetFlux gives window k new data in the unit of the old; weights stay.
func (f *Fitter) SetFlux(k int, flux []float64) {
	w := f.wins[f.place[k]]
	if len(flux) != len(w.in.Flux) {
		panic("clouds: SetFlux: another number of pixels")
	}
	w.whitenData(flux)
}

// Start returns the free parameters at the start, in the order of Free.
func (f *Fitter) Start() []float64 { return append([]float64(nil), f.start...) }

// Free returns the names of the free parameters.
func (f *Fitter) Free() []string {
	var out []string
	for _, i := range f.params.free {
		out = append(out, f.params.all[i].name)
	}
	return out
}
