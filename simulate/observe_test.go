package simulate

import (
	"math"
	"testing"

	"lacuna/atomic"
	"lacuna/spectrum/frame"
)

// The rotation profile has unit area for any limb darkening: the definition.
func TestRotationHasUnitArea(t *testing.T) {
	const n = 200000
	var sum float64
	for i := range n {
		sum += rotation(-1+(float64(i)+0.5)*2/n) * 2 / n
	}
	if !(math.Abs(sum-1) < 1e-6) {
		t.Errorf("area %.9f, want 1", sum)
	}
}

// A thin line keeps its weak-line width W = N f λ² / 1.12958e20 Å (the constant of
// practice; from CODATA in package voigt) through profile, pixels and frame; its
// centre lies where the Earth's velocity puts it.
func TestThinLine(t *testing.T) {
	table := atomic.Default()
	line, err := table.Find("K I 7698.96")
	if err != nil {
		t.Fatal(err)
	}
	s := Star{Name: "Lantern 9", Clouds: []Cloud{{V: 10, B: 1.5, Cols: []Col{{"K I", 9}}}}}
	in := Instrument{R: 70000, Sampling: 2.5, Orders: [][2]float64{{7685, 7712}}, First: 1, Medium: frame.Air, SN: 100}
	const earth = -20.0
	obs, err := Observe(s, in, table, earth, 1, 2)
	if err != nil {
		t.Fatal(err)
	}
	seg := obs.Segments[0]
	var w, vw float64
	for i := 1; i+1 < len(seg.Wave); i++ {
		helio := frame.ToVacuum(seg.Wave[i], frame.Ciddor1996) * (1 + earth/atomic.C)
		d := (1 - obs.Light[0][i]) * (seg.Wave[i+1] - seg.Wave[i-1]) / 2
		w += d
		vw += d * frame.Velocity(helio, line.Wave)
	}
	want := 1e9 * line.F * line.Wave * line.Wave / 1.12958e20 / 1.000275 // air wavelengths
	if !(math.Abs(w/want-1) < 0.002) {                                   // τ₀ = 0.002: saturation 0.07 %
		t.Errorf("W = %.5g Å, want %.5g", w, want)
	}
	mean := 10.0 // the isotopes' mean is not the table's wavelength, that of 39K
	for _, p := range line.Parts {
		mean += p.Strength * p.DV
	}
	if v := vw / w; !(math.Abs(v-mean) < 0.002) {
		t.Errorf("mean velocity %.4f km/s, want %.4f", v, mean)
	}
}

func TestNoiseIsCorrelatedAsAsked(t *testing.T) {
	s := Star{Name: "Lantern 9"}
	in := Instrument{R: 50000, Sampling: 3, Orders: [][2]float64{{5000, 5600}}, First: 1, Medium: frame.Vacuum, SN: 100, Correlation: 0.33, ErrorScale: 1.5}
	obs, err := Observe(s, in, atomic.Default(), 0, 3, 4)
	if err != nil {
		t.Fatal(err)
	}
	seg := obs.Segments[0]
	var s0, s1 float64
	n := len(seg.Wave)
	r := make([]float64, n)
	for i := range r {
		r[i] = (seg.Flux[i] - 1e4*obs.Light[0][i]) / (seg.Err[i] / 1.5)
		s0 += r[i] * r[i]
		if i > 0 {
			s1 += r[i] * r[i-1]
		}
	}
	tol := 5 / math.Sqrt(float64(n))
	if !(math.Abs(s0/float64(n)-1) < tol) || !(math.Abs(s1/s0-0.33) < tol) {
		t.Errorf("variance %.3f (want 1), lag-1 correlation %.3f (want 0.33), allowed %.3f", s0/float64(n), s1/s0, tol)
	}
	again, _ := Observe(s, in, atomic.Default(), 0, 3, 4)
	for i := range seg.Flux {
		if again.Segments[0].Flux[i] != seg.Flux[i] {
			t.Fatal("the same seed gives other noise")
		}
	}
}
