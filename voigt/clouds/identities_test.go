package clouds_test

import (
	"encoding/json"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/voigt/clouds"
)

var (
	d2 = atomic.Line{Name: "Na I 5889.95", Species: "Na I", Wave: 5891.5833, F: 0.6408, FErr: 0.006, Gamma: 6.16e7}
	d1 = atomic.Line{Name: "Na I 5895.92", Species: "Na I", Wave: 5897.5581, F: 0.3201, FErr: 0.003, Gamma: 6.14e7}
)

// doublet is a problem with both D lines.
func doublet(err float64, cs ...clouds.Cloud) clouds.Problem {
	p := clouds.Problem{Clouds: cs}
	for _, l := range []atomic.Line{d2, d1} {
		p.Windows = append(p.Windows, flat(l, -80, 80, 1.5, 3.75, err))
	}
	return p
}

func model(t *testing.T, p clouds.Problem) []float64 {
	t.Helper()
	f, err := clouds.New(p, clouds.Options{})
	if err != nil {
		t.Fatal(err)
	}
	var out []float64
	for i := range p.Windows {
		c, err := f.Curves(i, f.Start())
		if err != nil {
			t.Fatal(err)
		}
		out = append(out, c.Model...)
	}
	return out
}

func largest(a, b []float64) float64 {
	d := 0.0
	for i := range a {
		d = max(d, math.Abs(a[i]-b[i]))
	}
	return d
}

// Two clouds of the same v and b with half the column each are one cloud: optical
// depths add. A cloud without column changes nothing.
func TestTwoCloudsEqualOne(t *testing.T) {
	whole := model(t, doublet(0.01, one(3, 1.7, 11.9)))
	halves := model(t, doublet(0.01, one(3, 1.7, 11.9-math.Log10(2)), one(3, 1.7, 11.9-math.Log10(2))))
	if d := largest(whole, halves); !(d <= 1e-13) { // rounding; and 10^x, which is good to 3e-16 x ln 10
		t.Errorf("two halves differ from the whole by %.1e", d)
	}
	empty := clouds.Cloud{V: clouds.Fix(-5), B: clouds.Fix(2), Species: []clouds.Species{{Carrier: "Na I", Linear: true, LogN: clouds.Fix(0)}}}
	if d := largest(whole, model(t, doublet(0.01, one(3, 1.7, 11.9), empty))); !(d <= 1e-14) {
		t.Errorf("a cloud without column changes the flux by %.1e", d)
	}
}

// The same two halves in a fit: named as degenerate, their parameters have no errors
// of their own, the total keeps that of the single cloud.
func TestDegenerateNamed(t *testing.T) {
	p := doublet(0.01, one(3, 1.7, 12.2))
	observe(t, &p, rand.New(rand.NewPCG(1, 2)))
	_, single := fit(t, p)
	x, _ := single.Param("cloud 1: log N(Na I)")
	v, _ := single.Param("cloud 1: v")
	b, _ := single.Param("cloud 1: b")
	p.Clouds = []clouds.Cloud{one(v.X, b.X, x.X-math.Log10(2)), one(v.X, b.X, x.X-math.Log10(2))}
	_, r := fit(t, p)
	if !r.Converged {
		t.Errorf("%s", r.Stop)
	}
	for _, q := range r.Params {
		if !q.Undetermined {
			t.Errorf("%s = %g ± %g counts as determined", q.Name, q.X, q.Err)
		}
	}
	found := false
	for _, d := range r.Degenerate {
		found = found || strings.HasSuffix(d.A, "log N(Na I)") && strings.HasSuffix(d.B, "log N(Na I)")
	}
	if !found || !(r.Condition > 1e7) {
		t.Errorf("degenerate pairs %v, condition %.2g", r.Degenerate, r.Condition)
	}
	want := single.Totals[0].N
	got := r.Totals[0].N
	if !(math.Abs(got.X-want.X) <= 0.01*want.Err()) || !(math.Abs(got.Err()/want.Err()-1) <= 0.01) {
		t.Errorf("total %.5g ± %.3g, of the single cloud %.5g ± %.3g", got.X, got.Err(), want.X, want.Err())
	}
	if _, err := json.Marshal(r); err != nil {
		t.Error(err)
	}
}

// Any order of clouds, species, lines and windows gives the same bytes.
func TestOrderDoesNotMatter(t *testing.T) {
	a, b, c := one(-4, 1.2, 11.8), one(2, 2.5, 12.3), one(9, 0.9, 11.4)
	a.Name, b.Name, c.Name = "a", "b", "c"
	p := doublet(0.01, a, b, c)
	both := flat(d2, -60, 360, 1.5, 3.75, 0.02) // D1 lies 304 km/s from D2
	both.Lines, both.Degree = []atomic.Line{d2, d1}, 2
	both.Name = "both"
	p.Windows = append(p.Windows, both)
	observe(t, &p, rand.New(rand.NewPCG(3, 4)))
	_, r := fit(t, p)
	q := p
	q.Clouds = []clouds.Cloud{c, a, b}
	w := slices.Clone(p.Windows)
	w[0], w[1], w[2] = w[2], w[0], w[1]
	w[0].Lines = []atomic.Line{d1, d2}
	q.Windows = w
	_, s := fit(t, q)
	r.Clouds[0], r.Clouds[1], r.Clouds[2] = r.Clouds[2], r.Clouds[0], r.Clouds[1]
	r.Windows[0], r.Windows[1], r.Windows[2] = r.Windows[2], r.Windows[0], r.Windows[1]
	x, err := json.Marshal(r)
	if err != nil {
		t.Fatal(err)
	}
	y, err := json.Marshal(s)
	if err != nil {
		t.Fatal(err)
	}
	if string(x) != string(y) {
		t.Errorf("another order, another result:\n%s\n%s", x, y)
	}
}

// A thin resolved line of depth d and dispersion s in pixels δ of noise σ, b free and
// the continuum known: σ_v = (σ/d)√(2sδ/√π), σ_lnN = (σ/d)√(3δ/(2√π s)). Derivation:
// ∂F/∂v and ∂F/∂N, ∂F/∂b of a Gaussian line, sums over pixels as integrals (Landman,
// Roussel-Dupré & Tanigawa 1982, ApJ 261, 732 has the same formulas; from memory).
func TestThinLineErrors(t *testing.T) {
	const (
		b, fwhm, dv, sigma = 4.0, 0.5, 0.3, 0.001
		logN               = 10.3
	)
	p := clouds.Problem{Clouds: []clouds.Cloud{one(1.234, b, logN)}, Windows: []clouds.Window{flat(d1, -40, 40, dv, fwhm, sigma)}}
	p.Windows[0].Lines[0].FErr = 0
	observe(t, &p, nil)
	f, r := fit(t, p)
	c, err := f.Curves(0, r.X)
	if err != nil {
		t.Fatal(err)
	}
	depth := 1 - slices.Min(c.Model)
	if depth > 0.02 {
		t.Fatalf("depth %g: not thin", depth)
	}
	sInst := fwhm / (2 * math.Sqrt(2*math.Ln2))
	s := math.Sqrt(b*b/2 + sInst*sInst + dv*dv/12)
	sv := sigma / depth * math.Sqrt(2*s*dv/math.SqrtPi)
	sn := sigma / depth * math.Sqrt(3*dv/(2*math.SqrtPi*s))
	sp := r.Clouds[0].Species[0]
	if got := r.Clouds[0].V.Err(); !(math.Abs(got/sv-1) <= 0.02) {
		t.Errorf("σ_v = %.5f, formula %.5f", got, sv)
	}
	if got := sp.LogN.Err() * math.Ln10; !(math.Abs(got/sn-1) <= 0.02) {
		t.Errorf("σ_lnN = %.5f, formula %.5f", got, sn)
	}
	if got := sp.N.Err() / sp.N.X; !(math.Abs(got/sn-1) <= 0.02) {
		t.Errorf("σ_N/N = %.5f, formula %.5f", got, sn)
	}
}

// All results are the same for flux and error in another unit, 10⁻¹⁶ and 10⁴ times.
func TestUnitOfFlux(t *testing.T) {
	p := doublet(0.01, one(-4, 1.2, 11.8), one(2, 2.5, 12.3))
	for i := range p.Windows {
		p.Windows[i].Degree, p.Windows[i].ZeroErr, p.Windows[i].WidthErr = 2, 0.01, 0.05
	}
	observe(t, &p, rand.New(rand.NewPCG(5, 6)))
	_, r := fit(t, p)
	for _, k := range []float64{1e-16, 1e4} {
		q := p
		q.Windows = slices.Clone(p.Windows)
		for i := range q.Windows {
			w := &q.Windows[i]
			w.Flux, w.Err = slices.Clone(w.Flux), slices.Clone(w.Err)
			for j := range w.Flux {
				w.Flux[j] *= k
				w.Err[j] *= k
			}
		}
		_, s := fit(t, q)
		for i := range r.Params {
			a, b := r.Params[i], s.Params[i]
			// rounding enters the data at 1e-16, and a step of the fit by cond. × that
			if !(math.Abs(a.X-b.X) <= 1e-9*a.Err) || !(math.Abs(a.Err/b.Err-1) <= 1e-9) {
				t.Errorf("unit %g: %s %.15g ± %.15g, was %.15g ± %.15g", k, a.Name, b.X, b.Err, a.X, a.Err)
			}
		}
	}
}

// K copies of an exposure are one of S/N √K.
func TestCopies(t *testing.T) {
	p := doublet(0.01, one(-4, 1.2, 11.8), one(2, 2.5, 12.3))
	observe(t, &p, rand.New(rand.NewPCG(8, 9)))
	four, sharp := p, p
	four.Windows = nil
	for range 4 {
		four.Windows = append(four.Windows, p.Windows...)
	}
	sharp.Windows = slices.Clone(p.Windows)
	for i := range sharp.Windows {
		sharp.Windows[i].Err = constant(len(sharp.Windows[i].Err), 0.005)
	}
	_, a := fit(t, four)
	_, b := fit(t, sharp)
	for i := range a.Params {
		x, y := a.Params[i], b.Params[i]
		// both converged to Δχ² of 1e-6: 1e-3 σ
		if !(math.Abs(x.X-y.X) <= 2e-3*x.Err) || !(math.Abs(x.Err/y.Err-1) <= 1e-3) {
			t.Errorf("%s: four copies %.6f ± %.6f, half the noise %.6f ± %.6f", x.Name, x.X, x.Err, y.X, y.Err)
		}
	}
}

// One σ of the strength of a line of a species with but this line moves log N by
// −σ_f/(f ln 10), whatever else is in the fit.
func TestStrengthError(t *testing.T) {
	p := doublet(0.01, one(2, 2.5, 12.3), one(7, 1.5, 11.5))
	p.Windows = p.Windows[1:]
	p.Windows[0].Degree = 1
	observe(t, &p, rand.New(rand.NewPCG(8, 9)))
	_, r := fit(t, p)
	want := d1.FErr / d1.F / math.Ln10
	for _, c := range r.Clouds {
		if got := c.Species[0].LogN.ErrBy(budget.FValue); !(math.Abs(got/want-1) <= 1e-4) { // the cut of the derivatives
			t.Errorf("%s: %.8f dex by f, want %.8f", c.Name, got, want)
		}
	}
}

// A prior on the width of the instrument: for a narrow line δb/b = (b_inst/b)² δR/R
// (common practice, by b² = b_obs² − b_inst²), and the correlation is reported.
func TestWidthOfInstrument(t *testing.T) {
	const b, fwhm = 1.5, 3.75
	p := clouds.Problem{Clouds: []clouds.Cloud{one(0.3, b, 10.5)}, Windows: []clouds.Window{flat(d1, -40, 40, 0.5, fwhm, 1e-4)}}
	p.Windows[0].WidthErr = 0.01
	observe(t, &p, nil)
	_, r := fit(t, p)
	inst := fwhm / (2 * math.Sqrt(math.Ln2))
	s := r.Clouds[0].Species[0]
	want := inst * inst / b * 0.01
	if got := s.B.ErrBy(budget.Profile); !(math.Abs(got/want-1) <= 0.05) { // second order: δb/b = 2 %
		t.Errorf("σ_b by the profile %.4f, formula %.4f", got, want)
	}
	if !(s.CorrBWidth < -0.8) {
		t.Errorf("correlation of b and the width %.3f", s.CorrBWidth)
	}
	if q, ok := r.Param("profile width"); !ok || !(math.Abs(q.Err/0.01-1) <= 0.05) {
		t.Errorf("width known to %g, prior 0.01", q.Err)
	}
	// An unresolved line: only a limit.
	p = clouds.Problem{Clouds: []clouds.Cloud{one(0.3, 0.6, 10.5)}, Windows: p.Windows}
	p.Windows[0].WidthErr = 0.05
	observe(t, &p, nil)
	_, r = fit(t, p)
	if s := r.Clouds[0].Species[0]; s.B.Kind() != "upper" || !(s.B.X > 0.6) {
		t.Errorf("b of an unresolved line: %s %g", s.B.Kind(), s.B.X)
	}
}
