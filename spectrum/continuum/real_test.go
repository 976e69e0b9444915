package continuum

import (
	"math"
	"path/filepath"
	"testing"

	"lacuna/internal/check"
	"lacuna/spectrum"
)

// Six spectra of the ESO archive (UVES, programmes 68.D-0568(A) and others, CC BY
// 4.0): pixels scatter by 0.62 of the tabulated error and neighbours correlate by
// +0.33, sums of five pixels scatter by 0.72 of √5 times the error. Those three
// numbers are from the project's practice notes, computed apart from this program
// on windows of its author's choice; hence the tolerances.
func TestAuditOfESOSpectra(t *testing.T) {
	for _, name := range []string{
		"cen-x3/ADP.2021-08-26T17_24_42.195.fits", "cen-x3/ADP.2021-08-26T17_24_42.172.fits",
		"smc-x1/ADP.2021-08-25T12_56_30.964.fits", "lmc-x4/ADP.2021-09-09T13_16_16.511.fits",
		"lmc-x4/ADP.2021-09-09T08_23_17.841.fits", "qv-nor/ADP.2020-06-19T08_40_21.544.fits",
	} {
		s, err := spectrum.Read(check.Shared(t, filepath.Join("realdata", name)), spectrum.Options{})
		if err != nil {
			t.Fatal(err)
		}
		g := s.Segments[0]
		parts, n, err := Audit(g.Wave, g.Flux, g.Err, g.Mask, nil)
		if err != nil {
			t.Fatal(err)
		}
		sum := n.Ratio * math.Sqrt(n.Tau(5))
		t.Logf("%s: rms/σ %.3f, ρ %.3f, sums of 5 %.3f; %d stretches, %d pixels", name, n.Ratio, n.Rho, sum, len(parts), n.Pixels)
		if !(math.Abs(n.Ratio-0.62) < 0.04) || !(math.Abs(n.Rho[0]-0.33) < 0.07) || !(math.Abs(sum-0.72) < 0.07) {
			t.Errorf("%s: rms/σ %.3f (0.62), ρ₁ %.3f (0.33), sums of 5 %.3f (0.72)", name, n.Ratio, n.Rho[0], sum)
		}
	}
}
