package lsq_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"lacuna/internal/lsq"
)

// fn is a Problem from a function.
type fn struct {
	m    int
	eval func(x, r []float64, jac *mat.Dense)
}

func (f fn) Points() int                         { return f.m }
func (f fn) Eval(x, r []float64, jac *mat.Dense) { f.eval(x, r, jac) }

func rosenbrock(x, r []float64, jac *mat.Dense) {
	r[0], r[1] = 10*(x[1]-x[0]*x[0]), 1-x[0]
	jac.SetRow(0, []float64{-20 * x[0], 10})
	jac.SetRow(1, []float64{-1, 0})
}

// Problems 1, 2, 13, 14 and 16 of Moré, Garbow & Hillstrom 1981, ACM Trans. Math.
// Softw. 7, 17, with their standard starts (from memory); the minima f = 0 follow
// from the formulas, 48.98… and 85822.2… are given there.
func TestMoreGarbowHillstrom(t *testing.T) {
	for _, tc := range []struct {
		name  string
		m     int
		eval  func(x, r []float64, jac *mat.Dense)
		start []float64
		x     []float64 // nil: not compared
		f     float64
		tol   float64
	}{
		{"Rosenbrock", 2, rosenbrock, []float64{-1.2, 1}, []float64{1, 1}, 0, 1e-20},
		{"Freudenstein & Roth", 2, func(x, r []float64, jac *mat.Dense) {
			r[0] = -13 + x[0] + ((5-x[1])*x[1]-2)*x[1]
			r[1] = -29 + x[0] + ((x[1]+1)*x[1]-14)*x[1]
			jac.SetRow(0, []float64{1, 10*x[1] - 3*x[1]*x[1] - 2})
			jac.SetRow(1, []float64{1, 3*x[1]*x[1] + 2*x[1] - 14})
		}, []float64{0.5, -2}, []float64{11.4127789869, -0.896805253274}, 48.9842536792, 1e-9},
		{"Powell singular", 4, func(x, r []float64, jac *mat.Dense) {
			r[0], r[1] = x[0]+10*x[1], math.Sqrt(5)*(x[2]-x[3])
			a, b := x[1]-2*x[2], x[0]-x[3]
			r[2], r[3] = a*a, math.Sqrt(10)*b*b
			jac.SetRow(0, []float64{1, 10, 0, 0})
			jac.SetRow(1, []float64{0, 0, math.Sqrt(5), -math.Sqrt(5)})
			jac.SetRow(2, []float64{0, 2 * a, -4 * a, 0})
			jac.SetRow(3, []float64{2 * math.Sqrt(10) * b, 0, 0, -2 * math.Sqrt(10) * b})
		}, []float64{3, -1, 0, 1}, nil, 0, 1e-20},
		{"Wood", 6, func(x, r []float64, jac *mat.Dense) {
			r[0], r[1] = 10*(x[1]-x[0]*x[0]), 1-x[0]
			r[2], r[3] = math.Sqrt(90)*(x[3]-x[2]*x[2]), 1-x[2]
			r[4], r[5] = math.Sqrt(10)*(x[1]+x[3]-2), (x[1]-x[3])/math.Sqrt(10)
			jac.Zero()
			jac.Set(0, 0, -20*x[0])
			jac.Set(0, 1, 10)
			jac.Set(1, 0, -1)
			jac.Set(2, 2, -2*math.Sqrt(90)*x[2])
			jac.Set(2, 3, math.Sqrt(90))
			jac.Set(3, 2, -1)
			jac.Set(4, 1, math.Sqrt(10))
			jac.Set(4, 3, math.Sqrt(10))
			jac.Set(5, 1, 1/math.Sqrt(10))
			jac.Set(5, 3, -1/math.Sqrt(10))
		}, []float64{-3, -1, -3, -1}, []float64{1, 1, 1, 1}, 0, 1e-20},
		{"Brown & Dennis", 20, func(x, r []float64, jac *mat.Dense) {
			for i := range r {
				s := float64(i+1) / 5
				a, b := x[0]+s*x[1]-math.Exp(s), x[2]+x[3]*math.Sin(s)-math.Cos(s)
				r[i] = a*a + b*b
				jac.SetRow(i, []float64{2 * a, 2 * a * s, 2 * b, 2 * b * math.Sin(s)})
			}
		}, []float64{25, 5, -5, -1}, nil, 85822.2016263, 1e-6},
	} {
		got, err := lsq.Fit(fn{tc.m, tc.eval}, tc.start, nil, nil, lsq.Options{Tol: 1e-25, MaxIterations: 1000}, nil)
		if err != nil {
			t.Fatal(err)
		}
		t.Logf("%s: %d iterations, %d evaluations, f = %.12g, %s", tc.name, got.Iterations, got.Evaluations, got.Chi2, got.Stop)
		if !got.OK() {
			t.Errorf("%s: %s", tc.name, got.Stop)
		}
		if !(math.Abs(got.Chi2-tc.f) <= tc.tol+1e-11*tc.f) { // the digits printed
			t.Errorf("%s: f = %.12g, want %.12g", tc.name, got.Chi2, tc.f)
		}
		for j := range tc.x {
			if !(math.Abs(got.X[j]-tc.x[j]) <= 1e-6*math.Abs(tc.x[j])) {
				t.Errorf("%s: x%d = %.10g, want %.10g", tc.name, j+1, got.X[j], tc.x[j])
			}
		}
	}
}

// A linear problem r = A x − y is solved by the normal equations; one step, and
// the covariance is (AᵀA)⁻¹.
func TestLinear(t *testing.T) {
	r := rand.New(rand.NewPCG(4, 2))
	const m, n = 30, 5
	a, y := mat.NewDense(m, n, nil), make([]float64, m)
	for i := range m {
		for j := range n {
			a.Set(i, j, r.NormFloat64())
		}
		y[i] = r.NormFloat64()
	}
	p := linear(a, y)
	got, err := lsq.Fit(p, make([]float64, n), nil, nil, lsq.Options{}, nil)
	if err != nil {
		t.Fatal(err)
	}
	var ata, cov mat.Dense
	ata.Mul(a.T(), a)
	if err := cov.Inverse(&ata); err != nil {
		t.Fatal(err)
	}
	var aty, x mat.VecDense
	aty.MulVec(a.T(), mat.NewVecDense(m, y))
	x.MulVec(&cov, &aty)
	for j := range n {
		// Converged to 1e-6 in χ²: 1e-3 standard errors; the last step squares the rest
		if d := math.Abs(got.X[j] - x.AtVec(j)); !(d <= 1e-6*got.Err(j)) {
			t.Errorf("x%d = %.12g, want %.12g", j, got.X[j], x.AtVec(j))
		}
		for k := range n {
			if d := math.Abs(got.Cov[j*n+k] - cov.At(j, k)); !(d <= 1e-13) {
				t.Errorf("cov %d %d = %.12g, want %.12g", j, k, got.Cov[j*n+k], cov.At(j, k))
			}
		}
	}
	if !got.OK() || got.Points != m || len(got.Undetermined) != 0 {
		t.Errorf("%+v", got)
	}
}

func linear(a *mat.Dense, y []float64) fn {
	m, n := a.Dims()
	return fn{m, func(x, r []float64, jac *mat.Dense) {
		v := mat.NewVecDense(m, r)
		v.MulVec(a, mat.NewVecDense(n, x))
		for i := range y {
			r[i] -= y[i]
		}
		jac.Copy(a)
	}}
}

// Bounded linear problems against brute force: of all 3ⁿ choices of which
// parameters sit at which bound, the feasible one with the smallest χ².
func TestBoundedLinear(t *testing.T) {
	r := rand.New(rand.NewPCG(77, 1))
	const m, n = 9, 4
	atBound := 0
	for trial := range 200 {
		a, y := mat.NewDense(m, n, nil), make([]float64, m)
		for i := range m {
			common := r.NormFloat64() // correlated columns: steps and gradients point apart
			for j := range n {
				a.Set(i, j, 2*common+r.NormFloat64())
			}
			y[i] = 3 * r.NormFloat64()
		}
		lo, hi, start := make([]float64, n), make([]float64, n), make([]float64, n)
		for j := range n {
			lo[j], hi[j] = -0.5*r.Float64(), 0.5*r.Float64()
			start[j] = []float64{lo[j], 0, hi[j], 10}[r.IntN(4)]
		}
		got, err := lsq.Fit(linear(a, y), start, lo, hi, lsq.Options{Tol: 1e-12}, nil)
		if err != nil {
			t.Fatal(err)
		}
		want := bruteForce(a, y, lo, hi)
		if !got.OK() || !(math.Abs(got.Chi2-want) <= 1e-9*(1+want)) {
			t.Errorf("trial %d: χ² = %.12g, want %.12g, %s", trial, got.Chi2, want, got.Stop)
		}
		for j, x := range got.X {
			if !(x >= lo[j] && x <= hi[j]) {
				t.Errorf("trial %d: x%d = %g outside %g … %g", trial, j, x, lo[j], hi[j])
			}
			if b := got.AtBound[j]; b != 0 {
				atBound++
				if b < 0 && x != lo[j] || b > 0 && x != hi[j] || got.Err(j) != 0 {
					t.Errorf("trial %d: x%d = %g ± %g said to be at bound %d", trial, j, x, got.Err(j), b)
				}
			} else if !(got.Err(j) > 0) {
				t.Errorf("trial %d: free x%d has error %g", trial, j, got.Err(j))
			}
		}
	}
	if atBound < 200 {
		t.Errorf("only %d parameters ended at a bound: the test tests little", atBound)
	}
}

func bruteForce(a *mat.Dense, y, lo, hi []float64) float64 {
	m, n := a.Dims()
	best := math.Inf(1)
	cases := int(math.Pow(3, float64(n)))
	for c := range cases {
		x := make([]float64, n)
		var free []int
		for j, k := 0, c; j < n; j, k = j+1, k/3 {
			switch k % 3 {
			case 0:
				free = append(free, j)
			case 1:
				x[j] = lo[j]
			case 2:
				x[j] = hi[j]
			}
		}
		rhs := mat.NewVecDense(m, nil)
		for i := range m {
			s := y[i]
			for j := range n {
				s -= a.At(i, j) * x[j]
			}
			rhs.SetVec(i, s)
		}
		if len(free) > 0 {
			sub := mat.NewDense(m, len(free), nil)
			for l, j := range free {
				sub.SetCol(l, mat.Col(nil, j, a))
			}
			var sol mat.VecDense
			if sol.SolveVec(sub, rhs) != nil {
				continue
			}
			inside := true
			for l, j := range free {
				x[j] = sol.AtVec(l)
				inside = inside && x[j] >= lo[j] && x[j] <= hi[j]
			}
			if !inside {
				continue
			}
		}
		chi2 := 0.0
		for i := range m {
			s := -y[i]
			for j := range n {
				s += a.At(i, j) * x[j]
			}
			chi2 += s * s
		}
		best = min(best, chi2)
	}
	return best
}

// Rosenbrock's valley with x ≤ ½: on it f = (1 − x)² at y = x², so the minimum is
// ¼ at (½, ¼), and there ∂f/∂x < 0.
func TestBoundedRosenbrock(t *testing.T) {
	inf := math.Inf(1)
	got, err := lsq.Fit(fn{2, rosenbrock}, []float64{-1.2, 1}, []float64{-inf, -inf}, []float64{0.5, inf}, lsq.Options{Tol: 1e-14}, nil)
	if err != nil {
		t.Fatal(err)
	}
	if !got.OK() || got.X[0] != 0.5 || !(math.Abs(got.X[1]-0.25) <= 1e-7) || !(math.Abs(got.Chi2-0.25) <= 1e-12) {
		t.Errorf("%+v", got)
	}
	if got.AtBound[0] != 1 || got.AtBound[1] != 0 || got.Err(0) != 0 {
		t.Errorf("at bounds %v, error of x %g", got.AtBound, got.Err(0))
	}
	if want := 0.1; !(math.Abs(got.Err(1)-want) <= 1e-12) { // x fixed: ∂r₁/∂y = 10
		t.Errorf("error of y %g, want %g", got.Err(1), want)
	}
	// Everything against its bound.
	got, err = lsq.Fit(fn{2, rosenbrock}, []float64{0, 0}, []float64{0, 0.5}, []float64{0.2, 0.7}, lsq.Options{}, nil)
	if err != nil {
		t.Fatal(err)
	}
	if got.X[0] != 0.2 || got.X[1] != 0.5 || got.Stop != lsq.Cornered {
		t.Errorf("%+v", got)
	}
}

// What the data do not determine is said, and the rest keeps its error: y depends
// on x₀ + x₁ and on x₂; x₃ does nothing.
func TestUndetermined(t *testing.T) {
	const m = 12
	p := fn{m, func(x, r []float64, jac *mat.Dense) {
		for i := range r {
			s := float64(i)/m - 0.5
			r[i] = (x[0]+x[1])*math.Exp(s) + x[2]*s - math.Cos(s)
			jac.SetRow(i, []float64{math.Exp(s), math.Exp(s), s, 0})
		}
	}}
	got, err := lsq.Fit(p, []float64{3, -1, 0, 7}, nil, nil, lsq.Options{Tol: 1e-12}, nil)
	if err != nil {
		t.Fatal(err)
	}
	if !got.OK() || len(got.Undetermined) != 3 || got.Undetermined[0] != 0 || got.Undetermined[1] != 1 || got.Undetermined[2] != 3 {
		t.Errorf("undetermined: %v, %s", got.Undetermined, got.Stop)
	}
	if !math.IsInf(got.Err(0), 1) || !math.IsInf(got.Err(3), 1) || got.X[3] != 7 {
		t.Errorf("errors %g, %g; x₃ = %g", got.Err(0), got.Err(3), got.X[3])
	}
	two, err := lsq.Fit(fn{m, func(x, r []float64, jac *mat.Dense) {
		full := mat.NewDense(m, 4, nil)
		p.eval([]float64{x[0], 0, x[1], 0}, r, full)
		jac.SetCol(0, mat.Col(nil, 0, full))
		jac.SetCol(1, mat.Col(nil, 2, full))
	}}, []float64{1, 0}, nil, nil, lsq.Options{Tol: 1e-12}, nil)
	if err != nil {
		t.Fatal(err)
	}
	if d := math.Abs(got.Err(2)/two.Err(1) - 1); !(d <= 1e-9) || !(math.Abs(got.Chi2-two.Chi2) <= 1e-9) {
		t.Errorf("error of x₂ is %g, alone %g; χ² %g, %g", got.Err(2), two.Err(1), got.Chi2, two.Chi2)
	}
}

// A model that breaks down (NaN) in part of the space is walked around.
func TestNaNOnTheWay(t *testing.T) {
	p := fn{3, func(x, r []float64, jac *mat.Dense) {
		for i := range r {
			s := float64(i + 1)
			r[i] = math.Log(x[0])*s - s*math.Log(2) // NaN for x < 0, where the first full step leads
			jac.Set(i, 0, s/x[0])
		}
	}}
	got, err := lsq.Fit(p, []float64{20}, nil, nil, lsq.Options{Tol: 1e-20}, nil)
	if err != nil {
		t.Fatal(err)
	}
	if !got.OK() || !(math.Abs(got.X[0]-2) <= 1e-9) {
		t.Errorf("%+v", got)
	}
}

func TestStops(t *testing.T) {
	got, err := lsq.Fit(fn{2, rosenbrock}, []float64{-1.2, 1}, nil, nil, lsq.Options{MaxIterations: 3}, nil)
	if err != nil || got.Stop != lsq.Limit || got.OK() || got.Iterations != 3 {
		t.Errorf("%+v, %v", got, err)
	}
	// A valley without an end: r = e^−x falls for ever, by a constant part a step
	valley := fn{2, func(x, r []float64, jac *mat.Dense) {
		r[0], r[1] = math.Exp(-x[0]), 0
		jac.SetRow(0, []float64{-r[0]})
		jac.SetRow(1, []float64{0})
	}}
	got, err = lsq.Fit(valley, []float64{0}, nil, nil, lsq.Options{Tol: 1e-300, Slow: 1e-3}, nil)
	if err != nil || got.Stop != lsq.Creeping || got.OK() || got.Iterations > 40 || !(got.Chi2 < 1e-9) {
		t.Errorf("%+v, %v", got, err)
	}
	// Derivatives of the wrong sign promise what never comes.
	wrong := fn{2, func(x, r []float64, jac *mat.Dense) {
		rosenbrock(x, r, jac)
		jac.Scale(-1, jac)
	}}
	got, err = lsq.Fit(wrong, []float64{-1.2, 1}, nil, nil, lsq.Options{}, nil)
	if err != nil || got.OK() {
		t.Errorf("wrong derivatives: %+v, %v", got, err)
	}
}

func TestRefuses(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for name, f := range map[string]func() error{
		"few points": func() error {
			_, err := lsq.Fit(fn{1, rosenbrock}, []float64{1, 1}, nil, nil, lsq.Options{}, nil)
			return err
		},
		"nothing": func() error { _, err := lsq.Fit(fn{1, rosenbrock}, nil, nil, nil, lsq.Options{}, nil); return err },
		"NaN start": func() error {
			_, err := lsq.Fit(fn{2, rosenbrock}, []float64{nan, 1}, nil, nil, lsq.Options{}, nil)
			return err
		},
		"bounds": func() error {
			_, err := lsq.Fit(fn{2, rosenbrock}, []float64{1, 1}, []float64{0, 2}, []float64{1, 1}, lsq.Options{}, nil)
			return err
		},
		"NaN bound": func() error {
			_, err := lsq.Fit(fn{2, rosenbrock}, []float64{1, 1}, []float64{0, nan}, nil, lsq.Options{}, nil)
			return err
		},
		"bound at +Inf": func() error {
			_, err := lsq.Fit(fn{2, rosenbrock}, []float64{1, 1}, []float64{0, inf}, nil, lsq.Options{}, nil)
			return err
		},
		"NaN residual": func() error {
			_, err := lsq.Fit(fn{2, func(x, r []float64, jac *mat.Dense) { rosenbrock(x, r, jac); r[1] = nan }}, []float64{1, 1}, nil, nil, lsq.Options{}, nil)
			return err
		},
		"infinite derivative": func() error {
			_, err := lsq.Fit(fn{2, func(x, r []float64, jac *mat.Dense) { rosenbrock(x, r, jac); jac.Set(0, 0, inf) }}, []float64{1, 1}, nil, nil, lsq.Options{}, nil)
			return err
		},
	} {
		if f() == nil {
			t.Errorf("%s: no error", name)
		}
	}
}

// A workspace that has served a larger and a smaller problem gives the same bytes
// as a new one, and an iteration allocates nothing: runs of 5 and of 50 iterations
// allocate alike.
func TestWorkspace(t *testing.T) {
	var ws lsq.Workspace
	for _, set := range []nist{sets[2], sets[0], sets[1], sets[2]} {
		a, err := lsq.Fit(set, set.starts[0], nil, nil, lsq.Options{}, &ws)
		if err != nil {
			t.Fatal(err)
		}
		b, err := lsq.Fit(set, set.starts[0], nil, nil, lsq.Options{}, nil)
		if err != nil {
			t.Fatal(err)
		}
		for j := range a.X {
			if a.X[j] != b.X[j] || a.Err(j) != b.Err(j) || a.Chi2 != b.Chi2 {
				t.Errorf("%s: reused and new workspace differ: %v, %v", set.name, a.X, b.X)
			}
		}
	}
	allocs := func(iterations int) float64 {
		return testing.AllocsPerRun(10, func() {
			if _, err := lsq.Fit(sets[2], sets[2].starts[0], nil, nil, lsq.Options{Tol: 1e-30, MaxIterations: iterations}, &ws); err != nil {
				t.Fatal(err)
			}
		})
	}
	if few, many := allocs(5), allocs(30); few != many {
		t.Errorf("5 iterations allocate %g times, 30 %g times", few, many)
	}
}

func BenchmarkThurber(b *testing.B) {
	var ws lsq.Workspace
	for b.Loop() {
		if _, err := lsq.Fit(sets[2], sets[2].starts[0], nil, nil, lsq.Options{}, &ws); err != nil {
			b.Fatal(err)
		}
	}
}
