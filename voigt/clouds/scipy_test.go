package clouds

import (
	"bytes"
	"encoding/json"
	"math"
	"os/exec"
	"path/filepath"
	"testing"

	"lacuna/atomic"
	"lacuna/internal/check"
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
	Chi2  float64 // SciPy's solution
	X     []float64
	Cov   []float64
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
		g := &grid{fwhm: c.FWHM, density: density{far: math.Inf(1)}}
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

// The same spectra, starts and sub-grid fitted by scipy.optimize.least_squares with
// scipy.special.wofz and a numeric Jacobian: the same minimum and covariance.
func TestAgreesWithSciPy(t *testing.T) {
	script := filepath.Join(check.Root(t), "bench", "fit_scipy.py")
	var out []byte
	for _, name := range []string{"/usr/bin/python3", "python3"} {
		if exec.Command(name, "-c", "import scipy.optimize").Run() != nil {
			continue
		}
		var errs bytes.Buffer
		cmd := exec.Command(name, script, "solve")
		cmd.Stderr = &errs
		var err error
		if out, err = cmd.Output(); err != nil {
			t.Fatalf("%v: %s", err, errs.String())
		}
		break
	}
	if out == nil {
		check.Missing(t, "python3 with scipy is not installed")
	}
	var c fitCases
	if err := json.Unmarshal(out, &c); err != nil {
		t.Fatal(err)
	}
	for i, k := range c.Cases {
		f, err := New(c.problem(k, NoContinuum), Options{})
		if err != nil {
			t.Fatal(err)
		}
		c.asScript(f)
		var x []float64
		for _, s := range k.Start {
			x = append(x, s...)
		}
		f.gridX = append(f.gridX[:0], x...) // the script's grid serves any start
		r, err := f.FitFrom(x)
		if err != nil {
			t.Fatal(err)
		}
		if d := math.Abs(r.Chi2 - k.Chi2); !(d <= 1e-3) { // SciPy stops when χ² changes by 1e-8 of itself
			t.Errorf("case %d, %d clouds: χ² %.6f, by SciPy %.6f", i, k.K, r.Chi2, k.Chi2)
		}
		n := len(x)
		for a := range n {
			if d := math.Abs(r.X[a]-k.X[a]) / math.Sqrt(k.Cov[a*n+a]); !(d <= 0.03) { // Δχ² of 1e-3
				t.Errorf("case %d, %d clouds: %s %.6f, by SciPy %.6f: %.3fσ off", i, k.K, f.Free()[a], r.X[a], k.X[a], d)
			}
			for b := range n {
				scale := math.Sqrt(k.Cov[a*n+a] * k.Cov[b*n+b])
				if d := math.Abs(r.Cov[a*n+b]-k.Cov[a*n+b]) / scale; !(d <= 0.01) {
					t.Errorf("case %d, %d clouds: covariance %d %d %.4g, by SciPy %.4g", i, k.K, a, b, r.Cov[a*n+b], k.Cov[a*n+b])
				}
			}
		}
		t.Logf("%d clouds: χ² %.6f, %+.1e; %d evaluations", k.K, r.Chi2, r.Chi2-k.Chi2, r.Evaluations)
	}
}
