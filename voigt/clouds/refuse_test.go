package clouds_test

import (
	"math"
	"slices"
	"strings"
	"testing"

	"lacuna/internal/oops"
	"lacuna/voigt/clouds"
	"lacuna/voigt/lsf"
)

// Mistakes of the user are named, with their place, and are errors of the kind that is
// the user's to mend.
func TestRefuses(t *testing.T) {
	base := func() clouds.Problem {
		p := doublet(0.01, one(0, 2, 12))
		return p
	}
	short, err := lsf.NewTabulated(lsf.Table{Unit: lsf.Kms, Offset: []float64{-2, -1, 0, 1, 2},
		Density: [][]float64{{0, 0.25, 0.5, 0.25, 0}}, Wave: []float64{1200}})
	if err != nil {
		t.Fatal(err)
	}
	_ = short
	far, err := lsf.NewTabulated(lsf.Table{Unit: lsf.Kms, Offset: []float64{-2, -1, 0, 1, 2},
		Density: [][]float64{{0, 0.25, 0.5, 0.25, 0}, {0, 0.25, 0.5, 0.25, 0}}, Wave: []float64{1200, 1700}})
	if err != nil {
		t.Fatal(err)
	}
	for _, tc := range []struct {
		name string
		want string // in the message
		edit func(p *clouds.Problem)
	}{
		{"no window", "no window", func(p *clouds.Problem) { p.Windows = nil }},
		{"window without pixels", "Na I 5889.95: no good pixel", func(p *clouds.Problem) {
			p.Windows[0].Mask = make([]bool, len(p.Windows[0].Wave))
			for i := range p.Windows[0].Mask {
				p.Windows[0].Mask[i] = true
			}
		}},
		{"empty window", "no good pixel", func(p *clouds.Problem) {
			w := &p.Windows[1]
			w.Wave, w.Edges, w.Flux, w.Err = nil, nil, nil, nil
		}},
		{"few pixels", "parameters", func(p *clouds.Problem) {
			for i := range p.Windows {
				w := &p.Windows[i]
				w.Wave, w.Edges, w.Flux, w.Err = w.Wave[:4], w.Edges[:5], w.Flux[:4], w.Err[:4]
			}
			for i := range 3 {
				p.Clouds = append(p.Clouds, one(float64(i), 1, 12))
			}
		}},
		{"few pixels for the continuum", "of the continuum", func(p *clouds.Problem) {
			w := &p.Windows[0]
			w.Wave, w.Edges, w.Flux, w.Err, w.Degree = w.Wave[:4], w.Edges[:5], w.Flux[:4], w.Err[:4], 3
		}},
		{"species without line", `no window has a line of "Na 1"; did you mean "Na I"`, func(p *clouds.Problem) { p.Clouds[0].Species[0].Carrier = "Na 1" }},
		{"line without species", "no cloud holds", func(p *clouds.Problem) {
			l := d1
			l.Species = "Ca II"
			p.Windows[0].Lines = append(slices.Clone(p.Windows[0].Lines), l)
		}},
		{"start outside its bounds", "cloud 1: b: the bounds 3 to 5 exclude the start 2", func(p *clouds.Problem) { p.Clouds[0].B = clouds.Start(2).Within(3, 5) }},
		{"bounds in the wrong order", "no room", func(p *clouds.Problem) { p.Clouds[0].V = clouds.Start(0).Within(5, -5) }},
		{"b of 0", "above 0", func(p *clouds.Problem) { p.Clouds[0].B = clouds.Start(0) }},
		{"start of NaN", "cloud 1: v: the start is NaN", func(p *clouds.Problem) { p.Clouds[0].V = clouds.Start(math.NaN()) }},
		{"prior of no width", "prior", func(p *clouds.Problem) { p.Clouds[0].V = clouds.Start(0).Prior(0, -1) }},
		{"tie to nothing", `"c", which is no parameter`, func(p *clouds.Problem) { p.Clouds[0].B = clouds.Follow("c", 1, 0) }},
		{"ties in a circle", "circle", func(p *clouds.Problem) {
			p.Clouds[0].B, p.Clouds[0].V = clouds.Follow("v", 1, 0), clouds.Follow("b", 1, 0)
		}},
		{"two clouds of one name", "two clouds", func(p *clouds.Problem) {
			p.Clouds = append(p.Clouds, one(4, 1, 12))
			p.Clouds[0].Name, p.Clouds[1].Name = "a", "a"
		}},
		{"cloud without species", "without species", func(p *clouds.Problem) { p.Clouds[0].Species = nil }},
		{"species twice", "exists already", func(p *clouds.Problem) {
			p.Clouds[0].Species = append(slices.Clone(p.Clouds[0].Species), p.Clouds[0].Species[0])
		}},
		{"flux of NaN", "pixel 3 near", func(p *clouds.Problem) { p.Windows[0].Flux[3] = math.NaN() }},
		{"error of 0", "mask the pixel", func(p *clouds.Problem) { p.Windows[0].Err[3] = 0 }},
		{"wavelengths that descend", "ascend", func(p *clouds.Problem) { slices.Reverse(p.Windows[0].Edges) }},
		{"no line spread function", "no line spread function", func(p *clouds.Problem) { p.Windows[0].Profile = nil }},
		{"line spread function elsewhere", "tabulated from 1200 to 1700 Å only", func(p *clouds.Problem) { p.Windows[0].Profile = far }},
		{"unnormalised line spread function", "add up to 0.5", func(p *clouds.Problem) {
			p.Windows[0].Profile = lsf.Sum{{Weight: 0.5, FWHM: lsf.Velocity(3)}}
		}},
		{"zero level of 2", "zero level", func(p *clouds.Problem) { p.Windows[0].Zero = 2 }},
		{"degree 40", "degree", func(p *clouds.Problem) { p.Windows[0].Degree = 40 }},
		{"two errors of one instrument", "profile width has error", func(p *clouds.Problem) { p.Windows[0].WidthErr = 0.1 }},
		{"factor of NaN", "factor", func(p *clouds.Problem) {
			p.Windows[0].Factor = &clouds.Curve{Wave: []float64{1, 2}, Value: []float64{1, math.NaN()}}
		}},
		{"Boltzmann without partner", "tied to", func(p *clouds.Problem) {
			p.Clouds[0].Species[0].Boltzmann = &clouds.Boltzmann{Of: "CN N=0", T: "T"}
		}},
	} {
		p := base()
		tc.edit(&p)
		f, err := clouds.New(p, clouds.Options{})
		if err == nil {
			_, err = f.Fit()
		}
		switch {
		case err == nil:
			t.Errorf("%s: accepted", tc.name)
		case !oops.IsInput(err):
			t.Errorf("%s: %v is not the user's mistake", tc.name, err)
		case !strings.Contains(err.Error(), tc.want):
			t.Errorf("%s: %q does not say %q", tc.name, err, tc.want)
		}
	}
}

// A flat spectrum has nothing to fit: no error, but no number without a flag either.
func TestFlatSpectrum(t *testing.T) {
	p := doublet(0.01, one(0, 2, 12))
	for i := range p.Windows {
		p.Windows[i].Degree = 1
	}
	_, r := fit(t, p)
	s := r.Clouds[0].Species[0]
	// Half of the light of one resolution element would show at S/N 100: N < 1e12
	if s.LogN.Kind() != "upper" || !(s.LogN.X < 12) || s.N.Kind() != "value" || r.Clouds[0].V.Kind() != "none" {
		t.Errorf("log N %s %g, N = %g ± %g, v %s in a flat spectrum", s.LogN.Kind(), s.LogN.X, s.N.X, s.N.Err(), r.Clouds[0].V.Kind())
	}
	if len(r.Notes) == 0 {
		t.Error("nothing is said about it")
	}
	// Dark: no continuum to be found.
	for i := range p.Windows {
		p.Windows[i].Flux = constant(len(p.Windows[i].Flux), 0)
	}
	if f, err := clouds.New(p, clouds.Options{}); err != nil {
		t.Error(err)
	} else if r, err := f.Fit(); err != nil {
		t.Error(err)
	} else if n := r.Clouds[0].Species[0].LogN; n.Kind() == "value" && n.Err() < 0.3 {
		t.Errorf("log N = %g ± %g in darkness", n.X, n.Err())
	}
}
