package clouds

import (
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
