package survey_test

import (
	"testing"

	"lacuna/internal/check"
)

// G191-B2B, STIS E140M: O I 1302 lies in two orders, both saturated. Two widths of
// one line fix no b, so there is no growth curve, and the lower limit is that of
// the apparent optical depth. log N(O I) = 14.86 ± 0.04 towards this star by
// Lemoine et al. 2002, ApJS 140, 67 (from memory; 0.1 dex of room): no lower limit
// may lie above it.
func TestOneLineInTwoOrdersFixesNoB(t *testing.T) {
	file := check.Shared(t, "realdata/g191-b2b/o4vt02040_x1d.fits")
	r := runReal(t, `
[survey]
name = "G191-B2B"
[[sightline]]
name = "G191-B2B"
velocity = [-20, 35]
lines = ["O I 1302.17"]
[[sightline.spectrum]]
file = "`+file+`"
`)
	if len(r.Widths) != 2 {
		t.Fatalf("%d widths of O I 1302, want one an order", len(r.Widths))
	}
	for _, g := range r.Growth {
		t.Errorf("a growth curve of %s from one line", g.Species)
	}
	if n := adopted(t, r, "O I"); n.Kind() != "lower" || !(n.X > 14 && n.X < 14.96) {
		t.Errorf("log N(O I) %s %.2f", n.Kind(), n.X)
	}
}
