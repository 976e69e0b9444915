package voigt_test

import (
	"bytes"
	"fmt"
	"math"
	"math/rand/v2"
	"os/exec"
	"strconv"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/voigt"
)

// python runs a script with numbers on its input and returns those it prints, or
// skips the test where Python or SciPy is missing.
func python(t *testing.T, script string, in []float64) []float64 {
	t.Helper()
	var text bytes.Buffer
	for _, x := range in {
		fmt.Fprintf(&text, "%x\n", x)
	}
	for _, name := range []string{"/usr/bin/python3", "python3"} {
		if exec.Command(name, "-c", "import scipy.special").Run() != nil {
			continue
		}
		cmd := exec.Command(name, "-c", script)
		cmd.Stdin = &text
		var errs bytes.Buffer
		cmd.Stderr = &errs
		out, err := cmd.Output()
		if err != nil {
			t.Fatalf("%v: %s", err, errs.String())
		}
		var nums []float64
		for _, f := range strings.Fields(string(out)) {
			x, err := strconv.ParseFloat(f, 64)
			if err != nil {
				t.Fatal(err)
			}
			nums = append(nums, x)
		}
		return nums
	}
	check.Missing(t, "python3 with scipy is not installed")
	return nil
}

const wofz = `
import sys
from scipy.special import wofz
x = [float.fromhex(line) for line in sys.stdin]
for u, a in zip(x[0::2], x[1::2]):
    w = wofz(complex(u, a))
    print(w.real.hex(), w.imag.hex())
`

// 20,000 points against scipy.special.wofz, also below a = 1e-8. SciPy is itself off by
// up to 3.2e-13 in Im w near zero (found with the long arithmetic of this package's
// tests at z = 5.47e-4 + 4.2e-7i), so no closer agreement can be asked.
func TestFaddeevaScipy(t *testing.T) {
	r := rand.New(rand.NewPCG(20, 26))
	var in []float64
	for i := range 20000 {
		a, u := math.Pow(10, -12+14*r.Float64()), math.Pow(10, -8+12*r.Float64())
		switch i % 5 {
		case 1:
			u = 10 * r.Float64()
		case 2:
			a, u = 0.2*r.Float64(), -9*r.Float64()
		case 3:
			a, u = 9*r.Float64(), 9*r.Float64()
		case 4:
			a, u = math.Pow(10, -12+6*r.Float64()), 4+6*r.Float64()
		}
		in = append(in, u, a)
	}
	out := python(t, wofz, in)
	var re, im worst
	for i := 0; i < len(in); i += 2 {
		w := voigt.Faddeeva(complex(in[i], in[i+1]))
		re.see(in[i+1], in[i], rel(real(w), out[i]))
		im.see(in[i+1], in[i], rel(imag(w), out[i+1]))
	}
	if len(out) != len(in) {
		t.Fatalf("%d numbers for %d", len(out), len(in))
	}
	re.demand(t, "Re w against SciPy", 5*promise)
	im.demand(t, "Im w against SciPy", 5*promise)
}
