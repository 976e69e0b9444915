package clouds_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"lacuna/atomic"
	"lacuna/internal/check"
	"lacuna/voigt"
	"lacuna/voigt/clouds"
	"lacuna/voigt/lsf"
)

// sightline is one invented sightline of ../shared/checks.
type sightline struct {
	name   string
	clouds []clouds.Cloud
	lines  []atomic.Line
	fwhm   float64
}

// synthetic reads the invented sightlines, each line of a sightline as one that the
// same gas makes.
func synthetic(t *testing.T) []*sightline {
	var out []*sightline
	find := func(name string) *sightline {
		for _, s := range out {
			if s.name == name {
				return s
			}
		}
		out = append(out, &sightline{name: name})
		return out[len(out)-1]
	}
	// The tables rest on CODATA 2018 (README.md there), ours on 2022: 3e-9.
	const unit = 0.026540088560 / (math.Pi * atomic.ElectronRadius * atomic.C * 1e5)
	for _, r := range check.CSV(t, check.Shared(t, "checks/synthetic_lines.csv")) {
		s := find(r["sightline"])
		s.fwhm = check.F(t, r, "fwhm_lsf_kms")
		s.lines = append(s.lines, atomic.Line{
			Name: r["line"], Species: "Na I", Wave: check.F(t, r, "lambda_vac_A"),
			F: unit * check.F(t, r, "f"), Gamma: check.F(t, r, "gamma_s"),
		})
	}
	for _, r := range check.CSV(t, check.Shared(t, "checks/synthetic_components.csv")) {
		s := find(r["sightline"])
		s.clouds = append(s.clouds, one(check.F(t, r, "v_kms"), check.F(t, r, "b_kms"), math.Log10(check.F(t, r, "N_cm2"))))
	}
	return out
}

// one is a cloud of one species.
func one(v, b, logN float64) clouds.Cloud {
	return clouds.Cloud{V: clouds.Start(v), B: clouds.Start(b), Species: []clouds.Species{{Carrier: "Na I", LogN: clouds.Start(logN)}}}
}

// pixels returns the borders of pixels (Å) of width dv km/s about a line, and their
// centres.
func pixels(l atomic.Line, lo, hi, dv float64) (edges, wave []float64) {
	for v := lo; v < hi+dv/2; v += dv {
		edges = append(edges, l.Wave*(1+v/atomic.C))
	}
	return edges, centres(edges)
}

func centres(edges []float64) []float64 {
	var wave []float64
	for i := 1; i < len(edges); i++ {
		wave = append(wave, (edges[i-1]+edges[i])/2)
	}
	return wave
}

// gauss is a Gaussian instrument of width fwhm (km/s), constant in v = c(λ/λ₀ − 1).
func gauss(fwhm float64, l atomic.Line) lsf.Profile {
	return lsf.Sum{{Weight: 1, FWHM: lsf.Constant(l.Wave * fwhm / atomic.C)}}
}

func constant(n int, x float64) []float64 {
	out := make([]float64, n)
	for i := range out {
		out[i] = x
	}
	return out
}

// flat is a window on one line with flux 1 ± err, an exact instrument and no continuum.
func flat(l atomic.Line, lo, hi, dv, fwhm, err float64) clouds.Window {
	edges, wave := pixels(l, lo, hi, dv)
	return clouds.Window{
		Name: l.Name, Lines: []atomic.Line{l}, Wave: wave, Edges: edges,
		Flux: constant(len(wave), 1), Err: constant(len(wave), err),
		Profile: gauss(fwhm, l), WidthErr: -1, Degree: clouds.NoContinuum,
	}
}

// observe fills the fluxes of p with its own model at the start, and noise.
func observe(t testing.TB, p *clouds.Problem, rng *rand.Rand) {
	t.Helper()
	q := clouds.Problem{Clouds: p.Clouds, Shared: p.Shared, Windows: append([]clouds.Window(nil), p.Windows...)}
	for i := range q.Windows {
		q.Windows[i].Degree, q.Windows[i].ZeroErr, q.Windows[i].Flux = clouds.NoContinuum, 0, constant(len(q.Windows[i].Wave), 1)
	}
	f, err := clouds.New(q, clouds.Options{Steps: 8})
	if err != nil {
		t.Fatal(err)
	}
	for i := range p.Windows {
		c, err := f.Curves(i, f.Start())
		if err != nil {
			t.Fatal(err)
		}
		w := &p.Windows[i]
		w.Flux = c.Model
		for j := range w.Flux {
			if rng != nil {
				w.Flux[j] += rng.NormFloat64() * w.Err[j]
			}
		}
	}
}

func fit(t testing.TB, p clouds.Problem) (*clouds.Fitter, clouds.Result) {
	t.Helper()
	f, err := clouds.New(p, clouds.Options{})
	if err != nil {
		t.Fatal(err)
	}
	r, err := f.Fit()
	if err != nil {
		t.Fatal(err)
	}
	return f, r
}

// Intensities after the instrument: checks/synthetic_profiles.csv, computed apart from
// this code to 1e-10 (README.md there).
func TestSyntheticProfiles(t *testing.T) {
	rows := check.CSV(t, check.Shared(t, "checks/synthetic_profiles.csv"))
	worst, n := 0.0, 0
	for _, s := range synthetic(t) {
		for _, l := range s.lines {
			// A pixel far narrower than anything else about each point, and one between.
			const half = 2e-5 // km/s: the box changes the flux by less than 1e-11
			var edges, want []float64
			for _, r := range rows {
				if r["sightline"] == s.name && r["line"] == l.Name {
					v := check.F(t, r, "v_kms")
					edges = append(edges, l.Wave*(1+(v-half)/atomic.C), l.Wave*(1+(v+half)/atomic.C))
					want = append(want, check.F(t, r, "I_convolved"))
				}
			}
			w := flat(l, 0, 1, 1, s.fwhm, 0.01)
			w.Edges, w.Wave = edges, centres(edges)
			w.Flux, w.Err = constant(len(w.Wave), 1), constant(len(w.Wave), 0.01)
			f, err := clouds.New(clouds.Problem{Clouds: s.clouds, Windows: []clouds.Window{w}}, clouds.Options{Steps: 14, Tau: 1e-13})
			if err != nil {
				t.Fatal(err)
			}
			c, err := f.Curves(0, f.Start())
			if err != nil {
				t.Fatal(err)
			}
			for i, x := range want {
				n++
				d := math.Abs(c.Model[2*i] - x)
				worst = max(worst, d)
				if !(d <= 1e-10) { // as stated for the table
					t.Errorf("%s %s point %d: %.13f, want %.13f: off by %.1e", s.name, l.Name, i, c.Model[2*i], x, c.Model[2*i]-x)
				}
			}
		}
	}
	t.Logf("%d intensities, largest error %.1e", n, worst)
	if n < 100 {
		t.Errorf("only %d intensities compared", n)
	}
}

// Widths of the same sightlines through the model with the instrument: the profile
// moves light, it does not take any. checks/synthetic_lines.csv, exact to 1e-9.
func TestSyntheticWidths(t *testing.T) {
	rows := check.CSV(t, check.Shared(t, "checks/synthetic_lines.csv"))
	for _, s := range synthetic(t) {
		for _, l := range s.lines {
			w := flat(l, -400, 400, 1, s.fwhm, 0.01)
			f, err := clouds.New(clouds.Problem{Clouds: s.clouds, Windows: []clouds.Window{w}}, clouds.Options{Steps: 14, Tau: 1e-13})
			if err != nil {
				t.Fatal(err)
			}
			c, err := f.Curves(0, f.Start())
			if err != nil {
				t.Fatal(err)
			}
			sum, wing := 0.0, 0.0
			for i, m := range c.Model {
				sum += (1 - m) * (w.Edges[i+1] - w.Edges[i])
			}
			for _, cl := range s.clouds { // τ beyond ±400 km/s, where it is tiny: a τ₀ b/(√π u) in each wing
				b := cl.B.Start
				for _, edge := range []float64{400 - cl.V.Start, 400 + cl.V.Start} {
					wing += voigt.Tau0(math.Pow(10, cl.Species[0].LogN.Start), l.F, l.Wave, b) * voigt.Damping(l.Gamma, l.Wave, b) * b * b / (math.SqrtPi * edge) * l.Wave / atomic.C
				}
			}
			for _, r := range rows {
				if r["sightline"] == s.name && r["line"] == l.Name {
					want := check.F(t, r, "W_total_mA") * 1e-3
					// the part of the wing is exact to τ and (b/400)²: 1e-4 of it
					if d := math.Abs((sum+wing)/want - 1); !(d <= 1e-9+3e-4*wing/want) {
						t.Errorf("%s %s: W = %.10f Å, want %.10f: off by %.1e (wings %.1e)", s.name, l.Name, sum+wing, want, d, wing/want)
					}
				}
			}
		}
	}
}

// Seeded noise on the invented sightlines, refitted from starts that are off. Their
// clouds are blended, so single parameters have crooked intervals; but χ² at the truth
// exceeds the minimum by a number that has the χ² distribution of as many degrees of
// freedom as there are parameters, blended or not, and the total column stays within
// its error.
func TestSyntheticRefit(t *testing.T) {
	pulls := 0
	for k, s := range synthetic(t) {
		rng := rand.New(rand.NewPCG(7, uint64(k)))
		p := clouds.Problem{Clouds: s.clouds}
		for _, l := range s.lines {
			w := flat(l, -60, 60, 0.4*s.fwhm, s.fwhm, 1.0/300)
			w.Degree = 1
			p.Windows = append(p.Windows, w)
		}
		observe(t, &p, rng)
		f, err := clouds.New(p, clouds.Options{})
		if err != nil {
			t.Fatal(err)
		}
		truth := f.Start()
		start := f.Start()
		for j, n := range f.Free() {
			switch n[len(n)-1] {
			case 'v':
				start[j] += 0.1
			case 'b':
				start[j] *= 1.1
			default:
				start[j] += 0.05
			}
		}
		r, err := f.FitFrom(start)
		if err != nil {
			t.Fatal(err)
		}
		dof := float64(r.DOF)
		if !(math.Abs(r.Chi2-dof) <= 4*math.Sqrt(2*dof)) { // 4σ of the χ² distribution
			t.Errorf("%s: χ² = %.1f for %d degrees of freedom", s.name, r.Chi2, r.DOF)
		}
		if z := r.Whiteness; !(math.Abs(z.WatsonZ) <= 4) || !(math.Abs(z.RunsZ) <= 4) {
			t.Errorf("%s: residuals do not look like noise: %+v", s.name, z)
		}
		gain := f.Chi2(truth) - r.Chi2
		limit := distuv.ChiSquared{K: float64(len(truth))}.Quantile(0.9999)
		if !(gain >= -1e-3 && gain <= limit) {
			t.Errorf("%s: χ² of the truth is %.2f above the minimum, expected 0 to %.1f", s.name, gain, limit)
		}
		for i, q := range r.Params { // what is known to a tenth of its clouds
			if q.Name[len(q.Name)-1] == ')' && q.Err > 0 && q.Err < 0.03 {
				pulls++
				if d := math.Abs(q.X-truth[i]) / q.Err; !(d <= 4) {
					t.Errorf("%s: %s = %.4f ± %.4f, was %.4f", s.name, q.Name, q.X, q.Err, truth[i])
				}
			}
		}
		t.Logf("%s: χ² %.1f of %d, truth %.1f above (%d parameters), total %.4g ± %.2g, DW %+.1fσ, runs %+.1fσ, condition %.2g, %d evaluations",
			s.name, r.Chi2, r.DOF, gain, len(truth), r.Totals[0].N.X, r.Totals[0].N.Err(), r.Whiteness.WatsonZ, r.Whiteness.RunsZ, r.Condition, r.Evaluations)
	}
	if pulls < 4 {
		t.Errorf("only %d columns compared", pulls)
	}
}
