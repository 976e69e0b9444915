package frame_test

import (
	"math"
	"testing"

	"lacuna/spectrum/frame"
)

// n − 1 of air with 0.045 % CO₂ at 6330 Å in vacuum: values that NIST's refractive
// index calculator documents for Ciddor's equation with dry air (from memory). The
// two equations agree to a few 1e-8 over this range.
func TestRoomAgainstCiddor(t *testing.T) {
	for _, tc := range []struct{ hPa, c, n1 float64 }{
		{1013.25, 20, 2.71800e-4}, {600, 20, 1.60924e-4}, {1200, 20, 3.21916e-4}, {1000, 50, 2.43285e-4}, {1000, 5, 2.82756e-4},
	} {
		air := frame.ToAirIn(6330, frame.Ciddor1996, frame.Room{Pressure: tc.hPa, Temperature: tc.c})
		if got := 6330/air - 1; !(math.Abs(got-tc.n1) < 3e-8) {
			t.Errorf("%g hPa, %g °C: n − 1 = %.4e, want %.4e", tc.hPa, tc.c, got, tc.n1)
		}
	}
}

func TestRoom(t *testing.T) {
	for f := frame.Ciddor1996; f <= frame.Morton2000; f++ {
		// Standard air is what the formulas are for.
		for _, w := range []float64{2100, 3934.775, 7700} {
			if a, b := frame.ToAirIn(w, f, frame.Standard), frame.ToAir(w, f); !(math.Abs(a-b) < 1e-10) {
				t.Errorf("%v at %g Å: %.12f in the standard room, %.12f in standard air", f, w, a, b)
			}
			room := frame.Room{Pressure: 743, Temperature: 11.5, Humidity: 0.2}
			air := frame.ToAirIn(w, f, room)
			if back := frame.ToVacuumIn(air, f, room); !(math.Abs(back-w) < 1e-9) {
				t.Errorf("%v: %.12f came back as %.12f", f, w, back)
			}
		}
	}
	// No air, no refraction; and the density of an ideal gas within 0.1 %.
	if a := frame.ToAirIn(5000, frame.Ciddor1996, frame.Room{}); a != 5000 {
		t.Errorf("in vacuum %.9f", a)
	}
	n := func(r frame.Room) float64 { return 5000/frame.ToAirIn(5000, frame.Ciddor1996, r) - 1 }
	ratio := n(frame.Room{Pressure: 770, Temperature: 5}) / n(frame.Standard)
	if ideal := 770 / 1013.25 * (273.15 + 15) / (273.15 + 5); !(math.Abs(ratio/ideal-1) < 1e-3) {
		t.Errorf("density %.5f of the standard, ideal gas %.5f", ratio, ideal)
	}
	// Water vapour lowers n: about 4e-7 at half saturation and 20 °C by the formula's
	// coefficient 3.7e-10 a Pa and 1170 Pa.
	dry, wet := n(frame.Room{Pressure: 1000, Temperature: 20}), n(frame.Room{Pressure: 1000, Temperature: 20, Humidity: 0.5})
	if d := dry - wet; !(math.Abs(d-4.2e-7) < 0.3e-7) {
		t.Errorf("vapour takes %.2e", d)
	}
	for _, r := range []frame.Room{{Pressure: -1}, {Pressure: math.NaN()}, {Pressure: 1e5}, {Pressure: 1000, Temperature: 300}, {Humidity: 50}} {
		if a, v := frame.ToAirIn(5000, frame.Ciddor1996, r), frame.ToVacuumIn(5000, frame.Ciddor1996, r); !math.IsNaN(a) || !math.IsNaN(v) {
			t.Errorf("%+v: %g %g", r, a, v)
		}
	}
	for _, w := range []float64{-1, 0, 1999, math.NaN(), math.Inf(1)} {
		if a, v := frame.ToAirIn(w, 0, frame.Standard), frame.ToVacuumIn(w, 0, frame.Standard); !math.IsNaN(a) || !math.IsNaN(v) {
			t.Errorf("%g: %g %g", w, a, v)
		}
	}
}
