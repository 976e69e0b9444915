package telluric

import (
	"math"
	"strings"
	"testing"

	"lacuna/atomic"
)

// Fine-structure lines of the ground state, GHz, from memory of the microwave
// spectroscopy of O₂ (good to 1 MHz): N+ is J = N to N+1, N− is J = N−1 to N.
// 0.15 GHz is the 0.005 cm⁻¹ that ground promises.
func TestGroundState(t *testing.T) {
	const ghz = 29.9792458 // per cm⁻¹
	for _, c := range []struct {
		n           int
		plus, minus float64
	}{{1, 56.265, 118.750}, {3, 58.447, 62.486}, {5, 59.591, 60.306}, {7, 60.435, 59.164}, {9, 61.151, 58.324}, {21, 64.678, 54.671}} {
		plus := (ground(c.n, 2) - ground(c.n, 1)) * ghz
		minus := (ground(c.n, 2) - ground(c.n, 3)) * ghz
		if !(math.Abs(plus-c.plus) <= 0.15) || !(math.Abs(minus-c.minus) <= 0.15) {
			t.Errorf("N = %d: %.3f and %.3f GHz, want %.3f and %.3f", c.n, plus, minus, c.plus, c.minus)
		}
	}
}

// Pairs of the P branch of the A band around K I, air Å, from memory of Babcock &
// Herzberg 1948 (solar spectrum, 0.005 Å); 0.01 Å is WaveErr of the band.
func TestABandNearPotassium(t *testing.T) {
	for _, want := range []float64{7659.370, 7664.872, 7665.944, 7670.600, 7671.670, 7676.563, 7677.618, 7682.756, 7683.802, 7689.177, 7690.217, 7695.836, 7696.868} {
		best := math.Inf(1)
		for _, l := range Lines() {
			if strings.HasPrefix(l.Name, "O2 A") && math.Abs(l.WaveAir-want) < math.Abs(best) {
				best = l.WaveAir - want
			}
		}
		if !(math.Abs(best) <= 0.010) {
			t.Errorf("%.3f Å: nearest O2 line off by %.4f", want, best)
		}
	}
	k, err := atomic.Default().Find("K I 7665")
	if err != nil {
		t.Fatal(err)
	}
	n := Near(k.Wave-1.5, k.Wave+1.5)
	if len(n) != 2 || n[0].Strength != Saturated || n[1].Strength != Saturated {
		t.Errorf("near K I 7665: %+v", n)
	}
}

// The bands end with the right neighbours: no level with even N, no J = 0 to 0.
func TestBandShape(t *testing.T) {
	count := map[string]int{}
	prev := 0.0
	for _, l := range Lines() {
		if l.Wave < prev {
			t.Fatalf("%s is out of order", l.Name)
		}
		prev = l.Wave
		if l.Molecule == "O2" {
			count[l.Name[:strings.IndexByte(l.Name, '(')]]++
			if strings.Contains(l.Name, "PQ(1)") || strings.Contains(l.Name, "(2)") {
				t.Error(l.Name)
			}
		}
	}
	for _, b := range []string{"O2 A ", "O2 B ", "O2 γ "} {
		for _, br := range []string{"PP", "PQ", "RR", "RQ"} {
			if count[b+br] < 9 {
				t.Errorf("%s%s: %d lines", b, br, count[b+br])
			}
		}
	}
	// the head of the B band, 6867.2 Å, of the A band, 7593.7 Å (Fraunhofer's B and A)
	for band, head := range map[string]float64{"O2 B": 6867.2, "O2 A": 7593.7} {
		first := math.Inf(1)
		for _, l := range Lines() {
			if strings.HasPrefix(l.Name, band) {
				first = min(first, l.WaveAir)
			}
		}
		if !(math.Abs(first-head) <= 0.2) {
			t.Errorf("%s begins at %.2f", band, first)
		}
	}
}
