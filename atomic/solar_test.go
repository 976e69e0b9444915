package atomic

import (
	"fmt"
	"math"
	"testing"

	"lacuna/internal/oops"
)

// Values named in ../shared/reference/abundances.md §1, and the rule there for
// scales that have both a photospheric and a meteoritic value.
func TestSolar(t *testing.T) {
	for _, c := range []struct {
		scale, element string
		eps, err       float64
		kind           string
	}{
		{"lodders2003proto", "Fe", 7.54, 0.03, "recommended"},
		{"lodders2003", "Fe", 7.47, 0.03, "recommended"},
		{"lodders2009", "Fe", 7.46, 0.08, "mean"},
		{"lodders2003proto", "O", 8.76, 0.05, "recommended"},
		{"lodders2003", "O", 8.69, 0.05, "recommended"},
		{"asplund2009", "O", 8.69, 0.05, "photosphere"},
		{"asplund2021", "O", 8.69, 0.04, "photosphere"},
		{"lodders2009", "O", 8.73, 0.07, "photosphere"},
		// photosphere 0.04 is not below CI 0.02 + 0.02: CI
		{"asplund2021", "Fe", 7.46, 0.02, "CI"},
		// photosphere 0.05, CI 0.04 or 0.05 in A09: below the sum
		{"asplund2009", "Zn", 4.56, 0.05, "photosphere"},
		// photosphere 0.03, CI 0.03
		{"asplund2021", "Ca", 6.30, 0.03, "photosphere"},
		// never the photosphere for Li, whatever the errors; never CI for C and N
		{"asplund2021", "Li", 3.25, 0.04, "CI"},
		{"asplund2021", "C", 8.46, 0.04, "photosphere"},
		{"asplund2021", "N", 7.83, 0.07, "photosphere"},
		// only one of the two
		{"asplund2021", "Ar", 6.38, 0.10, "photosphere"},
		{"asplund2021", "As", 2.30, 0.04, "CI"},
	} {
		r, err := Solar(c.scale, c.element)
		if err != nil || r.LogEps != c.eps || r.Err != c.err || r.Kind != c.kind {
			t.Errorf("%s %s: %g ± %g %s, %v; want %g ± %g %s", c.scale, c.element, r.LogEps, r.Err, r.Kind, err, c.eps, c.err, c.kind)
		}
	}
	// A09 Fe: both values, 7.50 in the photosphere
	rows, err := SolarRows("asplund2009", "Fe")
	if err != nil || len(rows) != 2 || rows[0].LogEps != 7.50 || rows[0].Kind != "photosphere" {
		t.Errorf("asplund2009 Fe: %+v, %v", rows, err)
	}
	for _, c := range [][2]string{{"asplund2020", "Fe"}, {"asplund2021", "Qq"}, {"savage-sembach1996", "Li"}, {"", "Fe"}, {"asplund2021", "Xe"}} {
		if _, err := Solar(c[0], c[1]); !oops.IsInput(err) {
			t.Errorf("%q: %v", c, err)
		}
	}
	// proto-solar metals lie 0.07 dex (2003) and 0.05 dex (2009) above present-day ones
	for _, p := range []struct {
		now, then string
		d         float64
	}{{"lodders2003", "lodders2003proto", 0.07}, {"lodders2009", "lodders2009proto", 0.05}} {
		for _, e := range []string{"C", "Mg", "Si", "Fe", "Zn", "Pb"} {
			a, b := must(Solar(p.now, e)), must(Solar(p.then, e))
			if d := b.LogEps - a.LogEps; !(math.Abs(d-p.d) <= 0.016) { // two roundings to 0.01
				t.Errorf("%s: %s differs by %.3f", p.then, e, d)
			}
		}
	}
	for _, s := range SolarScales() {
		if s.Citation == "" || s.Name == "" {
			t.Errorf("%+v", s)
		}
		if h, err := Solar(s.Key, "H"); s.Key != "savage-sembach1996" && (err != nil || h.LogEps != 12) {
			t.Errorf("%s: H %g, %v", s.Key, h.LogEps, err)
		}
	}
}

func ExampleSolar() {
	r, err := Solar("asplund2021", "Fe")
	fmt.Println(r.LogEps, r.Err, r.Kind, err)
	// Output: 7.46 0.02 CI <nil>
}
