//go:build unix

package clouds

import (
	"encoding/json"
	"math"
	"os"
	"syscall"
	"testing"
)

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
