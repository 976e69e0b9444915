//go:build unix

package clouds

import (
	"encoding/json"
	"math"
	"os"
	"syscall"
	"testing"

	"lacuna/atomic"
	"lacuna/voigt/lsf"
)

// fitCases is what bench/fit_scipy.py hands over.
type fitCases struct {
	Lines  [][3]float64
	Sub    []float64 // km/s
	Kernel []float64
	Fine   int
	Pixels int
	Pixel  float64 // km/s
	FWHM   float64
	SN     float64
	Cases  []fitCase
}

type fitCase struct {
	K     int
	Data  []float64
	Start [][]float64
}

func (c *fitCases) problem(k fitCase, degree int) Problem {
	var p Problem
	for i, q := range c.Lines {
		l := atomic.Line{Name: []string{"D2", "D1"}[i], Species: "Na I", Wave: q[0], F: q[1], Gamma: q[2]}
		w := Window{Lines: []atomic.Line{l}, WidthErr: -1, Degree: degree,
			Profile: lsf.Sum{{Weight: 1, FWHM: lsf.Constant(l.Wave * c.FWHM / atomic.C)}}}
		for j := range c.Pixels + 1 {
			v := (float64(j) - float64(c.Pixels)/2) * c.Pixel
			w.Edges = append(w.Edges, l.Wave*(1+v/atomic.C))
			if j > 0 {
				w.Wave = append(w.Wave, (w.Edges[j]+w.Edges[j-1])/2)
				w.Flux = append(w.Flux, k.Data[i*c.Pixels+j-1])
				w.Err = append(w.Err, 1/c.SN)
			}
		}
		p.Windows = append(p.Windows, w)
	}
	for _, s := range k.Start {
		p.Clouds = append(p.Clouds, Cloud{V: Par{Start: s[0], Lo: -1e3, Hi: 1e3}, B: Start(s[1]), Species: []Species{{Carrier: "Na I", LogN: Start(s[2])}}})
	}
	return p
}

// asScript puts the sub-grid of the script in the place of our own: its kernel, and the
// mean of its points in each pixel.
func (c *fitCases) asScript(f *Fitter) {
	for _, w := range f.wins {
		l := w.in.Lines[0]
		g := &grid{fwhm: c.FWHM, b: 1e-9}
		for _, v := range c.Sub {
			g.sub = append(g.sub, l.Wave*(1+v/atomic.C))
		}
		n := len(c.Kernel) + c.Fine - 1
		row := make([]float64, n)
		for s := range c.Fine {
			for j, k := range c.Kernel {
				row[s+j] += k / float64(c.Fine)
			}
		}
		for i := range c.Pixels {
			g.first = append(g.first, i*c.Fine)
			g.weight = append(g.weight, row)
		}
		g.trimAll()
		w.grid = g
		w.room()
	}
}

// TestFitCases times the fits of bench/fit_scipy.py, which runs it.
func TestFitCases(t *testing.T) {
	in, out := os.Getenv("LACUNA_FIT_CASES"), os.Getenv("LACUNA_FIT_RESULTS")
	if in == "" {
		t.Skip("run by bench/fit_scipy.py")
	}
	raw, err := os.ReadFile(in)
	if err != nil {
		t.Fatal(err)
	}
	var c fitCases
	if err := json.Unmarshal(raw, &c); err != nil {
		t.Fatal(err)
	}
	type result struct {
		Chi2      float64   `json:"chi2"`
		Cov       []float64 `json:"cov"` // variances, in the order v, b, log N of each cloud
		Best      float64   `json:"best"`
		Mean      float64   `json:"mean"`
		New       float64   `json:"new"`
		Own       float64   `json:"own"`
		Continuum float64   `json:"continuum"`
		Evals     int       `json:"evals"`
	}
	cpu := func() float64 {
		var r syscall.Rusage
		if err := syscall.Getrusage(syscall.RUSAGE_SELF, &r); err != nil {
			t.Fatal(err)
		}
		return float64(r.Utime.Nano()+r.Stime.Nano()) / 1e6
	}
	ms := func(f func()) float64 {
		start := cpu()
		f()
		return cpu() - start
	}
	var results []result
	kept := map[int]*Fitter{}
	for _, k := range c.Cases {
		p := c.problem(k, NoContinuum)
		var r result
		f := kept[k.K] // one fitter for all spectra of a kind
		if f == nil {
			if f, err = New(p, Options{}); err != nil {
				t.Fatal(err)
			}
			c.asScript(f)
			kept[k.K] = f
		}
		var x []float64
		for _, s := range k.Start {
			x = append(x, s...)
		}
		r.Best = math.Inf(1)
		const times = 5
		for range times {
			var got Result
			d := ms(func() {
				for i := range p.Windows {
					f.SetFlux(i, p.Windows[i].Flux)
				}
				f.gridX = append(f.gridX[:0], x...) // the script's grid serves any start
				got, err = f.FitFrom(x)
			})
			if err != nil {
				t.Fatal(err)
			}
			r.Best = min(r.Best, d)
			r.Mean += d / times
			r.Chi2, r.Evals = got.Chi2, got.Evaluations
			r.Cov = nil
			for j := range x {
				r.Cov = append(r.Cov, got.Cov[j*len(x)+j])
			}
		}
		r.New = ms(func() {
			f, err := New(p, Options{})
			if err == nil {
				_, err = f.Fit()
			}
			if err != nil {
				t.Fatal(err)
			}
		})
		for _, own := range []struct {
			degree int
			ms     *float64
		}{{NoContinuum, &r.Own}, {2, &r.Continuum}} {
			f, err := New(c.problem(k, own.degree), Options{})
			if err != nil {
				t.Fatal(err)
			}
			*own.ms = math.Inf(1)
			for range times {
				*own.ms = min(*own.ms, ms(func() { _, err = f.Fit() }))
				if err != nil {
					t.Fatal(err)
				}
			}
		}
		results = append(results, r)
	}
	raw, err = json.Marshal(results)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(out, raw, 0o644); err != nil {
		t.Fatal(err)
	}
}
