package frame

import (
	"encoding/json"
	"math"
	"os/exec"
	"testing"

	"lacuna/internal/check"
)

// The series against the ephemeris it was fitted to, at 4000 other dates of 1950 to
// 2061: at most the 0.031 m/s that the comment promises (0.0005 more for dates
// between those of the generator's own audit), and 0.01 m/s in the mean.
func TestEarthAgainstERFA(t *testing.T) {
	py := "/usr/bin/python3"
	if exec.Command(py, "-c", "import erfa").Run() != nil {
		check.Missing(t, "python3 with erfa is not installed (apt-get install python3-erfa)")
	}
	out, err := exec.Command(py, "-c", `
import erfa, json, numpy as np
t = np.linspace(-18262.4, 22279.6, 4000)
h, b = erfa.epv00(2451545.0, t)
k = 149597870.7 / 86400
print(json.dumps({"t": list(t), "h": (h["v"]*k).tolist(), "b": (b["v"]*k).tolist()}))`).Output()
	if err != nil {
		t.Fatal(err)
	}
	var want struct {
		T    []float64
		H, B []vec
	}
	if err := json.Unmarshal(out, &want); err != nil || len(want.T) != 4000 {
		t.Fatalf("%d dates, %v", len(want.T), err)
	}
	var worst, sum float64
	for i, x := range want.T {
		h, b := earth(x)
		for _, d := range []vec{h.add(vec{-want.H[i][0], -want.H[i][1], -want.H[i][2]}), b.add(vec{-want.B[i][0], -want.B[i][1], -want.B[i][2]})} {
			size := 1e3 * math.Sqrt(d.dot(d))
			worst = max(worst, size)
			sum += size
		}
	}
	if mean := sum / 8000; !(worst < 0.0315) || !(mean < 0.01) {
		t.Errorf("off by %.4f m/s at most, %.4f in the mean", worst, mean)
	}
}

// Sidereal time, nutation and precession together: the axes of the Earth against
// ERFA's celestial-to-terrestrial matrix without polar motion. 0.2″ (1e-6) is 0.5 mm/s.
func TestRotationAgainstERFA(t *testing.T) {
	py := "/usr/bin/python3"
	if exec.Command(py, "-c", "import erfa").Run() != nil {
		check.Missing(t, "python3 with erfa is not installed (apt-get install python3-erfa)")
	}
	out, err := exec.Command(py, "-c", `
import erfa, json, numpy as np
ut = np.linspace(-18262.4, 22279.6, 300)
tt = ut + 69.0 / 86400
print(json.dumps({"ut": list(ut), "m": erfa.c2t06a(2451545.0, tt, 2451545.0, ut, 0.0, 0.0).tolist()}))`).Output()
	if err != nil {
		t.Fatal(err)
	}
	var want struct {
		UT []float64
		M  []matrix
	}
	if err := json.Unmarshal(out, &want); err != nil || len(want.UT) != 300 {
		t.Fatalf("%d dates, %v", len(want.UT), err)
	}
	for n, ut := range want.UT {
		got := rotation(ut, (ut+69.0/86400)/36525).transposed()
		for i := range got {
			for j := range got[i] {
				if !(math.Abs(got[i][j]-want.M[n][i][j]) < 1e-6) {
					t.Fatalf("day %.1f, element %d %d: %.9f, ERFA %.9f", ut, i, j, got[i][j], want.M[n][i][j])
				}
			}
		}
	}
}
