package abundance_test

import (
	"math"
	"strings"
	"testing"

	"lacuna/abundance"
	"lacuna/budget"
	"lacuna/internal/check"
	"lacuna/internal/oops"
)

// Jenkins 2009, ApJ 700, 1299, Table 2: N(H) = N(H I) + 2 N(H2) of 239
// sightlines, all printed to 0.01 dex, as transcribed in
// reference/fstar_sightlines.csv. Where he has no H2 he takes N(H I) alone; here
// that is a lower limit with the same number.
func TestHydrogenOfJenkins(t *testing.T) {
	rows := check.CSV(t, check.Shared(t, "reference/fstar_sightlines.csv"))
	sums, alone := 0, 0
	for _, r := range rows {
		if r["logNHI"] == "" || r["logNH_obs"] == "" {
			continue
		}
		in := abundance.HydrogenInput{Sightline: r["HD"], HI: stated(t, check.F(t, r, "logNHI"), 0.05, "value"), Source: "Jenkins 2009"}
		kind := "lower"
		alone++
		if r["logNH2"] != "" {
			in.H2 = stated(t, check.F(t, r, "logNH2"), 0.05, "value")
			kind = "value"
			sums, alone = sums+1, alone-1
		}
		h, err := abundance.NewHydrogen(in)
		if err != nil {
			t.Fatal(err)
		}
		// three numbers rounded to 0.01, the two of the sum with weights that add to 1
		if d := h.H.X - check.F(t, r, "logNH_obs"); !(math.Abs(d) <= 0.0101) || h.H.Kind() != kind {
			t.Errorf("HD %s: log N(H) = %.4f (%s), want %s (%s)", r["HD"], h.H.X, h.H.Kind(), r["logNH_obs"], kind)
		}
	}
	t.Logf("%d sums, %d without H2", sums, alone)
	if sums < 100 || alone < 10 {
		t.Errorf("only %d sums and %d without H2 among %d rows", sums, alone, len(rows))
	}
}

// By hand: N(H I) = 1e21 ± 5 %, N(H2) = 2e20 ± 10 % → 1.4e21 ± √(5e19² + 4 (2e19)²).
func TestHydrogenErrors(t *testing.T) {
	h, err := abundance.NewHydrogen(abundance.HydrogenInput{Sightline: "Lantern 1", Source: "invented",
		HI: stated(t, 21, 0.05/math.Ln10, "value"), H2: stated(t, math.Log10(2e20), 0.1/math.Ln10, "value")})
	if err != nil {
		t.Fatal(err)
	}
	want := math.Hypot(5e19, 4e19) / (1.4e21 * math.Ln10)
	if !(math.Abs(h.H.X-math.Log10(1.4e21)) <= 1e-12 && math.Abs(h.H.Err()-want) <= 1e-12) {
		t.Errorf("log N(H) = %.6f ± %.6f, want %.6f ± %.6f", h.H.X, h.H.Err(), math.Log10(1.4e21), want)
	}
	if len(h.H.Shifts) != 1 || h.H.Shifts[0].Key != "NH:Lantern 1" || h.H.Shifts[0].Cause != budget.Hydrogen {
		t.Errorf("its error is %+v", h.H.Shifts)
	}
	// above 20 % the two sides are log10(1+s) and −log10(1−s): 0.1 dex is +25.9 %, −20.6 %
	h, err = abundance.NewHydrogen(abundance.HydrogenInput{Sightline: "a", Source: "invented", HI: stated(t, 20, 0.1, "value"), H2: stated(t, 10, 0.1, "value")})
	if err != nil || !(math.Abs(h.H.ErrUp()-0.1) <= 1e-9 && math.Abs(h.H.ErrLo()-0.1) <= 1e-9) {
		t.Errorf("negligible H2 changes the error: +%.6f −%.6f, %v", h.H.ErrUp(), h.H.ErrLo(), err)
	}
}

// The table of NewHydrogen's description: kinds of N(H) and of D.
func TestHydrogenKinds(t *testing.T) {
	num := func(kind string, x, e float64) *budget.Number {
		switch kind {
		case "":
			return nil
		case "value":
			return stated(t, x, e, kind)
		}
		return stated(t, x, 0, kind)
	}
	for _, tc := range []struct {
		hi, h2, kind, d string
		lo, up          float64 // ends, log
	}{
		{"value", "value", "value", "value", 0, 0},
		{"value", "upper", "interval", "interval", 21, math.Log10(1e21 + 2e20)},
		{"value", "", "lower", "upper", 21, 0},
		{"value", "lower", "lower", "upper", math.Log10(1e21 + 2e20), 0},
		{"upper", "value", "interval", "interval", math.Log10(2e20), math.Log10(1e21 + 2e20)},
		{"upper", "upper", "upper", "lower", 0, math.Log10(1e21 + 2e20)},
		{"upper", "", "none", "none", 0, 0},
		{"lower", "value", "lower", "upper", math.Log10(1e21 + 2e20), 0},
		{"lower", "upper", "lower", "upper", 21, 0},
		{"lower", "", "lower", "upper", 21, 0},
	} {
		h, err := abundance.NewHydrogen(abundance.HydrogenInput{Sightline: "a", Source: "invented", HI: num(tc.hi, 21, 0.05), H2: num(tc.h2, 20, 0.05)})
		if err != nil {
			t.Fatal(err)
		}
		lo, up := h.H.Range()
		if h.H.Kind() != tc.kind || tc.lo > 0 && !(math.Abs(lo-tc.lo) <= 1e-9) || tc.up > 0 && !(math.Abs(up-tc.up) <= 1e-9) {
			t.Errorf("H I %s, H2 %q: N(H) is %s from %.4f to %.4f, want %s from %.4f to %.4f", tc.hi, tc.h2, h.H.Kind(), lo, up, tc.kind, tc.lo, tc.up)
		}
		d := deplete(t, []abundance.Column{col(t, "Fe II", 14, 0.1, "value")}, h, "asplund2021")["Fe"]
		if d.D.Kind() != tc.d {
			t.Errorf("H I %s, H2 %q: D is %s, want %s", tc.hi, tc.h2, d.D.Kind(), tc.d)
		}
	}
	// a bound far below the error of N(H I) is no reason for an interval
	h, err := abundance.NewHydrogen(abundance.HydrogenInput{Sightline: "a", Source: "invented", HI: stated(t, 20, 0.05, "value"), H2: stated(t, 14, 0, "upper")})
	if err != nil || h.H.Kind() != "value" || !(math.Abs(h.H.X-20) <= 1e-5) {
		t.Errorf("N(H2) < 1e14: %s %.6f, %v", h.H.Kind(), h.H.X, err)
	}
}

func TestHydrogenRefusals(t *testing.T) {
	v := stated(t, 21, 0.1, "value")
	for name, in := range map[string]abundance.HydrogenInput{
		"no source":     {HI: v},
		"nothing":       {Source: "s"},
		"H2 alone":      {Source: "s", H2: v},
		"total and H I": {Source: "s", Total: v, HI: v},
		"no error":      {Source: "s", HI: &budget.Number{X: 21}},
		"NaN":           {Source: "s", HI: &budget.Number{X: math.NaN()}},
	} {
		if _, err := abundance.NewHydrogen(in); !oops.IsInput(err) {
			t.Errorf("%s: %v", name, err)
		}
	}
	for _, tc := range []struct {
		x, up, lo float64
		kind      string
	}{{math.NaN(), 0.1, 0.1, ""}, {21, 0, 0, "value"}, {21, -1, -1, ""}, {21, 0.1, 0.1, "upper"}, {21, 0.1, 0.1, "about"}, {21, 0.1, math.Inf(1), ""}} {
		if _, err := abundance.Stated(tc.x, tc.up, tc.lo, tc.kind, 3, ""); err == nil {
			t.Errorf("Stated(%v) accepted", tc)
		}
	}
	h, _ := abundance.NewHydrogen(abundance.HydrogenInput{Sightline: "a", Source: "s", HI: stated(t, 19.2, 0.1, "value")})
	if !strings.Contains(strings.Join(h.Notes, ";"), "partly ionized") {
		t.Errorf("thin gas without a note: %v", h.Notes)
	}
}
