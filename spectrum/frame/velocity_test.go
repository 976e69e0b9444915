package frame_test

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/internal/oops"
	"lacuna/spectrum/frame"
)

func ExampleWavelength() {
	// Ca II K of a cloud that recedes with 13 km/s.
	fmt.Printf("%.4f Å\n", frame.Wavelength(3934.7750, 13))
	// Output: 3934.9456 Å
}

func TestVelocityProduct(t *testing.T) {
	for _, v := range []float64{-300, -18.437, 0, 13.888, 162} {
		if got := frame.Velocity(frame.Wavelength(5891.5833, v), 5891.5833); !(math.Abs(got-v) < 1e-9) {
			t.Errorf("v = %g came back as %g", v, got)
		}
		for _, w := range []float64{-29, 50} {
			// By way of the wavelengths: two shifts, one after the other.
			want := frame.Velocity(frame.Wavelength(frame.Wavelength(4000, v), w), 4000)
			if got := frame.AddVelocity(v, w); !(math.Abs(got-want) < 1e-9) {
				t.Errorf("AddVelocity(%g, %g) = %.12g, want %.12g", v, w, got, want)
			}
			if got := frame.SubVelocity(frame.AddVelocity(v, w), w); !(math.Abs(got-v) < 1e-9) {
				t.Errorf("SubVelocity undoes %g + %g as %g", v, w, got)
			}
		}
	}
	// 18 and 50 km/s: the plain sum is 3 m/s off, 18·50/c.
	if d := frame.AddVelocity(18, 50) - 68; !(math.Abs(d-0.003) < 1e-4) {
		t.Errorf("18 and 50 km/s exceed their sum by %g km/s, want 0.0030", d)
	}
}

// checks/velocity_frames.csv: LSRK term and Galactic coordinates, computed with
// an independent astronomy library to the digits printed (1e-9 km/s); the vector
// here has 8 decimals, so 1e-7 km/s is the tolerance.
func TestLSRKAndGalactic(t *testing.T) {
	rows := check.CSV(t, check.Shared(t, "checks/velocity_frames.csv"))
	for _, row := range rows {
		ra, dec := check.F(t, row, "ra_icrs_deg"), check.F(t, row, "dec_icrs_deg")
		want := check.F(t, row, "dv_lsrk_kms")
		if got := frame.LSRKTerm(ra, dec); !(math.Abs(got-want) < 1e-7) {
			t.Errorf("%s: LSRK term %.9f, want %.9f", row["id"], got, want)
		}
		// The Galactic frame of that library is tied to FK5 and differs from
		// the Hipparcos definition by up to 0.03″ (1e-5°), more in l by 1/cos b.
		l, b := frame.Galactic(ra, dec)
		dl := math.Mod(l-check.F(t, row, "l_deg")+540, 360) - 180
		cos := math.Cos(b * math.Pi / 180)
		if !(math.Abs(dl*cos) < 2e-5) || !(math.Abs(b-check.F(t, row, "b_deg")) < 2e-5) {
			t.Errorf("%s: l, b = %.7f, %.7f, want %s, %s", row["id"], l, b, row["l_deg"], row["b_deg"])
		}
	}
	if len(rows) < 20 {
		t.Errorf("%d rows", len(rows))
	}
}

func TestParse(t *testing.T) {
	for in, want := range map[string]frame.Kind{"BARYCENT": frame.Barycentric, " heliocentric ": frame.Heliocent,
		"Helio": frame.Heliocent, "lsrk": frame.LSRK, "topocent": frame.Topocentric} {
		if got, err := frame.ParseKind(in); err != nil || got != want {
			t.Errorf("ParseKind(%q) = %q, %v; want %q", in, got, err, want)
		}
	}
	_, err := frame.ParseKind("heliocentrik")
	if err == nil || !oops.IsInput(err) {
		t.Fatalf("heliocentrik: %v", err)
	}
	if want := "did you mean heliocentric"; !strings.Contains(err.Error(), want) {
		t.Errorf("%q does not say %q", err, want)
	}
	for in, want := range map[string]frame.Medium{"AIR": frame.Air, "vac": frame.Vacuum, "Vacuum": frame.Vacuum} {
		if got, err := frame.ParseMedium(in); err != nil || got != want {
			t.Errorf("ParseMedium(%q) = %q, %v; want %q", in, got, err, want)
		}
	}
	for _, in := range []string{"", "water", "vaccum"} {
		if _, err := frame.ParseMedium(in); !oops.IsInput(err) {
			t.Errorf("ParseMedium(%q): %v", in, err)
		}
	}
	for in, want := range map[string]frame.Formula{"ciddor": frame.Ciddor1996, "Edlen-1966": frame.Edlen1966,
		"edlén 1953": frame.Edlen1953, "morton2000": frame.Morton2000} {
		if got, err := frame.ParseFormula(in); err != nil || got != want {
			t.Errorf("ParseFormula(%q) = %v, %v; want %v", in, got, err, want)
		}
	}
	if _, err := frame.ParseFormula("edlen"); err == nil {
		t.Error("edlen alone names two formulas and was taken")
	}
}

func BenchmarkToVacuum(b *testing.B) {
	for b.Loop() {
		frame.ToVacuum(3933.66, frame.Ciddor1996)
	}
}
