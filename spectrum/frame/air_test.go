package frame_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"lacuna/internal/check"
	"lacuna/spectrum/frame"
)

// checks/air_vacuum.csv: 135 values computed from the stated formulas in extended
// precision; the gate of 1e-9 Å is 0.1 mm/s at 2000 Å and far above rounding.
func TestAirVacuumTable(t *testing.T) {
	names := map[string]frame.Formula{"ciddor1996": frame.Ciddor1996, "edlen1966": frame.Edlen1966,
		"edlen1953_morton1991": frame.Edlen1953, "morton2000_birch_downs1994": frame.Morton2000}
	seen := 0
	for _, row := range check.CSV(t, check.Shared(t, "checks/air_vacuum.csv")) {
		f, ok := names[row["formula"]]
		if !ok {
			continue // the fitted inverse of another author
		}
		in, want := check.F(t, row, "lambda_in_A"), check.F(t, row, "lambda_out_A")
		got := frame.ToVacuum(in, f)
		if row["direction"] == "vac_to_air" {
			got = frame.ToAir(in, f)
		}
		if !(math.Abs(got-want) <= 1e-9) {
			t.Errorf("%s %s %s of %g: %.12f, want %.12f", row["id"], row["formula"], row["direction"], in, got, want)
		}
		seen++
	}
	if seen != 120 {
		t.Errorf("%d rows tested, want 120", seen)
	}
}

// checks/air_vacuum_published.csv: documented examples of two other programs'
// pages, each with its own number of digits.
func TestAirVacuumPublished(t *testing.T) {
	for _, row := range check.CSV(t, check.Shared(t, "checks/air_vacuum_published.csv")) {
		f, err := frame.ParseFormula(map[string]string{"ciddor1996": "Ciddor 1996", "edlen1966": "Edlen 1966",
			"edlen1953_morton1991": "Edlén 1953"}[row["formula"]])
		if err != nil {
			t.Fatal(err)
		}
		in, want, tol := check.F(t, row, "lambda_in_A"), check.F(t, row, "lambda_out_A"), check.F(t, row, "tolerance_A")
		got := frame.ToVacuum(in, f)
		if row["direction"] == "vac_to_air" {
			got = frame.ToAir(in, f)
		}
		if !(math.Abs(got-want) <= tol) {
			t.Errorf("%s: %.9f, want %.9f", row["id"], got, want)
		}
		// The recomputed column has all digits of the stated formula.
		if want := check.F(t, row, "recomputed"); !(math.Abs(got-want) <= 1e-8) {
			t.Errorf("%s: %.9f, recomputed %.9f", row["id"], got, want)
		}
	}
}

// A round trip must return the wavelength: 1e-9 Å is 0.05 mm/s in the violet.
func TestAirRoundTrip(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for f := frame.Ciddor1996; f <= frame.Morton2000; f++ {
		for range 2000 {
			air := frame.MinAir + 22000*rng.Float64()
			if back := frame.ToAir(frame.ToVacuum(air, f), f); !(math.Abs(back-air) < 1e-9) {
				t.Errorf("%v: %.12f came back as %.12f", f, air, back)
			}
			if up := frame.ToVacuum(air, f); !(up > air) {
				t.Errorf("%v: vacuum %.6f is not above air %.6f", f, up, air)
			}
		}
		if back := frame.ToAir(frame.ToVacuum(frame.MinAir, f), f); !(math.Abs(back-frame.MinAir) < 1e-9) {
			t.Errorf("%v: the limit itself comes back as %v", f, back)
		}
	}
}

func TestAirRefuses(t *testing.T) {
	for _, w := range []float64{-1, 0, 1216, 1999.34, math.NaN(), math.Inf(1), math.Inf(-1)} {
		if v := frame.ToVacuum(w, frame.Ciddor1996); !math.IsNaN(v) {
			t.Errorf("ToVacuum(%g) = %g, want NaN", w, v)
		}
		if v := frame.ToAir(w, frame.Ciddor1996); !math.IsNaN(v) {
			t.Errorf("ToAir(%g) = %g, want NaN", w, v)
		}
	}
	if v := frame.ToVacuum(5000, frame.Formula(9)); !math.IsNaN(v) {
		t.Errorf("an unknown formula gave %g", v)
	}
}
