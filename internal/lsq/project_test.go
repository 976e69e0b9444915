package lsq_test

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"lacuna/internal/lsq"
)

// projected fits a NIST set with its linear parameters (the first k) taken out.
type projected struct {
	nist
	k       int
	columns func(x float64, b, a []float64)    // A's row; b the non-linear ones
	slopes  func(x float64, b, c, d []float64) // ∂(A c)/∂b
	p       *lsq.Projector
	a       *mat.Dense
	c       []float64
}

func (s *projected) Points() int { return len(s.y) }

func (s *projected) Eval(b, r []float64, jac *mat.Dense) {
	for i, x := range s.x {
		s.columns(x, b, s.a.RawRowView(i))
	}
	if err := s.p.Factor(s.a); err != nil {
		r[0] = math.NaN()
		return
	}
	s.p.Coef(s.c, s.y)
	copy(r, s.y)
	s.p.Residuals(r)
	for i, x := range s.x {
		row := jac.RawRowView(i)
		s.slopes(x, b, s.c, row)
		for j := range row {
			row[j] = -row[j]
		}
	}
	s.p.Jacobian(jac)
}

// The certified values of NIST again, found with the linear parameters projected
// out: same χ², same parameters, and the same errors of those that are left.
func TestProjection(t *testing.T) {
	misra := &projected{nist: sets[0], k: 1,
		columns: func(x float64, b, a []float64) { a[0] = 1 - math.Exp(-b[0]*x) },
		slopes:  func(x float64, b, c, d []float64) { d[0] = c[0] * x * math.Exp(-b[0]*x) }}
	den := func(x float64, b []float64) float64 { return 1 + x*(b[0]+x*(b[1]+x*b[2])) }
	thurber := &projected{nist: sets[2], k: 4,
		columns: func(x float64, b, a []float64) {
			q := den(x, b)
			a[0], a[1], a[2], a[3] = 1/q, x/q, x*x/q, x*x*x/q
		},
		slopes: func(x float64, b, c, d []float64) {
			q := den(x, b)
			f := -(c[0] + x*(c[1]+x*(c[2]+x*c[3]))) / (q * q)
			d[0], d[1], d[2] = f*x, f*x*x, f*x*x*x
		}}
	for _, s := range []*projected{misra, thurber} {
		m, n := len(s.y), len(s.b)-s.k
		s.p, s.a, s.c = new(lsq.Projector), mat.NewDense(m, s.k, nil), make([]float64, s.k)
		for i, start := range s.starts {
			got, err := lsq.Fit(s, start[s.k:], nil, nil, lsq.Options{Tol: 1e-30, MaxIterations: 1000}, nil)
			if err != nil {
				t.Fatal(err)
			}
			if !got.OK() {
				t.Errorf("%s start %d: %s", s.name, i+1, got.Stop)
			}
			r := make([]float64, m)
			s.Eval(got.X, r, mat.NewDense(m, n, nil)) // for the linear ones
			for j, want := range s.b {
				x := append(append([]float64(nil), s.c...), got.X...)[j]
				if !(math.Abs(x/want-1) <= 1e-7) {
					t.Errorf("%s start %d: b%d = %.11g, certified %.11g", s.name, i+1, j+1, x, want)
				}
			}
			s2 := got.Chi2 / float64(m-len(s.b))
			for j := range got.X {
				if sd, want := got.Err(j)*math.Sqrt(s2), s.sd[s.k+j]; !(math.Abs(sd/want-1) <= 1e-6) {
					t.Errorf("%s start %d: sd of b%d = %.11g, certified %.11g", s.name, i+1, s.k+j+1, sd, want)
				}
			}
			if !(math.Abs(got.Chi2/s.rss-1) <= 1e-10) {
				t.Errorf("%s start %d: sum of squares %.11g, certified %.11g", s.name, i+1, got.Chi2, s.rss)
			}
		}
		r, jac := make([]float64, m), mat.NewDense(m, n, nil)
		if a := testing.AllocsPerRun(10, func() { s.Eval(s.b[s.k:], r, jac) }); a != 0 {
			t.Errorf("%s: %g allocations an evaluation", s.name, a)
		}
	}
}

func TestProjectorRefuses(t *testing.T) {
	var p lsq.Projector
	for name, a := range map[string]*mat.Dense{
		"same columns": mat.NewDense(3, 2, []float64{1, 2, 2, 4, 3, 6}),
		"zero":         mat.NewDense(3, 1, nil),
		"NaN":          mat.NewDense(3, 1, []float64{1, math.NaN(), 2}),
		"wide":         mat.NewDense(1, 2, []float64{1, 2}),
	} {
		if p.Factor(a) == nil {
			t.Errorf("%s: no error", name)
		}
	}
}
