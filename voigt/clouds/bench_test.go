package clouds

import (
	"fmt"
	"math/rand/v2"
	"testing"

	"lacuna/atomic"
	"lacuna/voigt/lsf"
)

// crowd is K clouds in the Na I doublet at R = 80 000 and S/N 100, with starts that are
// off by 0.15 dex, 0.5 km/s and 20 % in b.
func crowd(tb testing.TB, k, degree int, seed uint64) (*Fitter, []float64) {
	rng := rand.New(rand.NewPCG(seed, uint64(k)))
	var p Problem
	for i := range k {
		p.Clouds = append(p.Clouds, Cloud{
			V: Start(8*(float64(i)-float64(k-1)/2) + 3*rng.Float64()), B: Start(0.9 + 1.6*rng.Float64()),
			Species: []Species{{Carrier: "Na I", LogN: Start(11.2 + 1.2*rng.Float64())}},
		})
	}
	for i, wave := range []float64{5891.5833, 5897.5581} {
		l := atomic.Line{Name: []string{"D2", "D1"}[i], Species: "Na I", Wave: wave, F: []float64{0.6408, 0.3201}[i], Gamma: 6.15e7}
		w := Window{Lines: []atomic.Line{l}, Degree: degree, WidthErr: -1, Profile: lsf.Sum{{Weight: 1, FWHM: lsf.Resolution(80000)}}}
		for j := range 121 {
			w.Wave = append(w.Wave, wave*(1+1.91*float64(j-60)/atomic.C))
			w.Flux, w.Err = append(w.Flux, 1), append(w.Err, 0.01)
		}
		p.Windows = append(p.Windows, w)
	}
	f, err := New(p, Options{})
	if err != nil {
		tb.Fatal(err)
	}
	x := f.Start()
	for i := range f.wins {
		c, err := f.Curves(i, x)
		if err != nil {
			tb.Fatal(err)
		}
		for j := range c.Model {
			c.Model[j] = c.Model[j]/c.Continuum[j] + 0.01*rng.NormFloat64()
		}
		f.SetFlux(i, c.Model)
	}
	for j := range x {
		s := float64(2*rng.IntN(2) - 1)
		switch j % 3 {
		case 0:
			x[j] += 0.5 * s
		case 1:
			x[j] *= 1 + 0.2*s
		default:
			x[j] += 0.15 * s
		}
	}
	return f, x
}

func BenchmarkFit(b *testing.B) {
	for _, k := range []int{1, 5, 8} {
		for _, degree := range []int{NoContinuum, 2} {
			b.Run(fmt.Sprintf("K=%d/degree=%d", k, degree), func(b *testing.B) {
				f, x := crowd(b, k, degree, 1)
				b.ReportAllocs()
				its := 0
				for b.Loop() {
					r, err := f.FitFrom(x)
					if err != nil {
						b.Fatal(err)
					}
					its = r.Evaluations
				}
				b.ReportMetric(float64(its), "evaluations/op")
			})
		}
	}
}

func BenchmarkChi2(b *testing.B) {
	f, x := crowd(b, 5, 2, 1)
	for b.Loop() {
		f.Chi2(x)
	}
}

// BenchmarkNew is the cost of a new problem: mostly that of the instrument's matrix.
func BenchmarkNew(b *testing.B) {
	f, _ := crowd(b, 5, 2, 1)
	for b.Loop() {
		if _, err := New(f.in, Options{}); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkBatch fits 5 clouds on as many goroutines as there are cores, each with a
// fitter of its own.
func BenchmarkBatch(b *testing.B) {
	b.RunParallel(func(pb *testing.PB) {
		f, x := crowd(b, 5, 2, 1)
		for pb.Next() {
			if _, err := f.FitFrom(x); err != nil {
				b.Error(err)
				return
			}
		}
	})
}
