package cog_test

import (
	"encoding/json"
	"math"
	"testing"

	"lacuna/budget"
	"lacuna/cog"
)

// Any widths give a result that can be written, or an error: no panic, no endless
// search, no number that is not one.
func FuzzFit(f *testing.F) {
	f.Add(0.05, 0.002, 0.03, 0.002, 0.01, 0.001, 0.3, 0.1, 1e-3, false)
	f.Add(-0.05, 0.002, 0.3, 0.002, 0.0001, 0.01, 1e-4, 0.3, 0.3, true)
	f.Add(2.0, 1e-6, 1.0, 1e-6, 0.5, 1e-6, 0.3, 0.1, 1e-3, false)
	f.Fuzz(func(t *testing.T, w0, e0, w1, e1, w2, e2, f0, f1, f2 float64, limit bool) {
		l := ladder(f0, f1, f2)
		pts := []cog.Point{{Line: l[0], W: w0, Err: e0}, {Line: l[1], W: w1, Err: e1}, {Line: l[2], W: w2, Err: e2, Limit: limit, Sigma: 3}}
		pts[0].Common = []budget.Shift{{Cause: budget.Continuum, Key: "c", D: e1}}
		pts[1].Common = []budget.Shift{{Cause: budget.Continuum, Key: "c", D: e0}}
		r, err := cog.Fit("Fe II", pts, cog.Options{})
		if err != nil {
			return
		}
		if _, err := json.Marshal(r); err != nil {
			t.Fatalf("%v in %+v", err, r)
		}
		n := r.LogN[0]
		if math.IsNaN(n.X) || math.IsInf(n.X, 0) || math.IsNaN(n.Up) || math.IsNaN(n.Lo) || n.Up < 0 || n.Lo < 0 || math.IsNaN(n.Err()) {
			t.Fatalf("log N = %+v", n)
		}
	})
}
