package cog_test

import (
	"encoding/json"
	"fmt"
	"math"
	"reflect"
	"strings"
	"testing"

	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/cog"
	"lacuna/internal/check"
)

// ladder is a set of invented lines of one level whose fλ spans three decades.
func ladder(f ...float64) []atomic.Line {
	var out []atomic.Line
	for i, x := range f {
		out = append(out, atomic.Line{Name: fmt.Sprintf("Fe II %d", 2300+40*i), Species: "Fe II", Wave: 2300 + 40*float64(i), F: x, Gamma: 2.7e8})
	}
	return out
}

// widths makes points of exact widths with relative errors.
func widths(lines []atomic.Line, logN, b, relErr float64) []cog.Point {
	var out []cog.Point
	for _, l := range lines {
		w := cog.Width(l, logN, b)
		out = append(out, cog.Point{Line: l, W: w, Err: relErr * w})
	}
	return out
}

func mustFit(t testing.TB, pts []cog.Point, o cog.Options) cog.Result {
	t.Helper()
	r, err := cog.Fit("Fe II", pts, o)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func isNumber(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s = %.10g, want %.10g ± %g", what, got, want, tol)
	}
}

var fourLines = ladder(0.3, 0.06, 0.012, 0.002)

func TestFitReturnsTheTruth(t *testing.T) {
	for _, logN := range []float64{13.2, 14.2, 15} {
		for _, b := range []float64{1, 3, 10} {
			r := mustFit(t, widths(fourLines, logN, b, 0.02), cog.Options{})
			isNumber(t, "log N", r.LogN[0].X, logN, 1e-6)
			isNumber(t, "b", r.B.X, b, 1e-5*b)
			if !(r.Chi2 < 1e-9) || r.DOF != 2 {
				t.Errorf("exact widths: χ² = %g, %d degrees of freedom", r.Chi2, r.DOF)
			}
			for _, l := range r.Lines {
				isNumber(t, l.Line+": model", l.Model, l.W, 1e-7*l.W)
			}
		}
	}
}

// chi2Free is the lowest χ² of independent widths when one of log N and b is held:
// golden section on exact widths, without anything of the fit.
func chi2Free(pts []cog.Point, holdN bool, at float64) float64 {
	chi2 := func(logN, b float64) float64 {
		var s float64
		for _, p := range pts {
			r := (p.W - cog.Width(p.Line, logN, b)) / p.Err
			s += r * r
		}
		return s
	}
	lo, hi := math.Log(0.3), math.Log(30)
	f := func(z float64) float64 { return chi2(at, math.Exp(z)) }
	if !holdN {
		lo, hi = 12, 16
		f = func(z float64) float64 { return chi2(z, at) }
	}
	const g = 0.6180339887498949
	for range 60 {
		p, q := hi-g*(hi-lo), lo+g*(hi-lo)
		if f(p) < f(q) {
			hi = q
		} else {
			lo = p
		}
	}
	return f((lo + hi) / 2)
}

// scattered moves exact widths by fixed parts of their errors.
func scattered(pts []cog.Point) []cog.Point {
	for i, k := range []float64{0.7, -0.4, 1.1, -0.9} {
		pts[i].W += k * pts[i].Err
	}
	return pts
}

// Errors are where χ² has risen by 1, contours where it has risen by 2.30 and
// 6.17, on exact widths. 3 % of the rise: surfaces are good to 1/30 of an error.
func TestFitErrorsAreProfiles(t *testing.T) {
	pts := scattered(widths(fourLines, 14.2, 3, 0.04))
	r := mustFit(t, pts, cog.Options{})
	n, b := r.LogN[0], r.B
	for _, tc := range []struct {
		what  string
		holdN bool
		at    float64
	}{{"log N up", true, n.X + n.ErrUp()}, {"log N down", true, n.X - n.ErrLo()}, {"b up", false, b.X + b.ErrUp()}, {"b down", false, b.X - b.ErrLo()}} {
		// Errors within 3 % of the linear ones are printed as those: 6 % in χ².
		isNumber(t, "Δχ² of "+tc.what, chi2Free(pts, tc.holdN, tc.at)-r.Chi2, 1, 0.08)
	}
	if len(r.Contours) != 2 {
		t.Fatalf("%d contours", len(r.Contours))
	}
	for _, c := range r.Contours {
		if c.Open != "" || c.B[0] != c.B[len(c.B)-1] || !(math.Abs(c.LogN[0]-c.LogN[len(c.LogN)-1]) < 1e-4) {
			t.Errorf("contour %g is not closed (%q)", c.Delta, c.Open)
		}
		for i := range c.B {
			var s float64
			for _, p := range pts {
				k := (p.W - cog.Width(p.Line, c.LogN[i], c.B[i])) / p.Err
				s += k * k
			}
			isNumber(t, fmt.Sprintf("Δχ² at point %d of contour %g", i, c.Delta), s-r.Chi2, c.Delta, 0.03*c.Delta)
		}
	}
}

// A shift is what +1σ does: moving the widths, or f, by one error and fitting
// again moves N and b by the shift that the budget holds.
func TestFitShifts(t *testing.T) {
	pts := widths(fourLines, 14.2, 3, 0.02)
	for i := range pts {
		pts[i].Common = []budget.Shift{{Cause: budget.Continuum, Key: fmt.Sprintf("c%d", i/2), D: 0.001 * float64(i+1)}}
		pts[i].Line.FErr = 0.05 * pts[i].Line.F
	}
	r := mustFit(t, pts, cog.Options{NoContours: true})
	shift := func(n budget.Number, c budget.Cause, key string) float64 {
		for _, s := range n.Shifts {
			if s.Cause == c && s.Key == key {
				return s.D
			}
		}
		t.Fatalf("no shift %v %q in %+v", c, key, n.Shifts)
		return 0
	}
	const part = 0.02 // of an error: linear to its square
	for _, tc := range []struct {
		cause budget.Cause
		key   string
		move  func(p []cog.Point)
	}{
		{budget.Continuum, "c0", func(p []cog.Point) { p[0].W += part * 0.001; p[1].W += part * 0.002 }},
		{budget.Continuum, "c1", func(p []cog.Point) { p[2].W += part * 0.003; p[3].W += part * 0.004 }},
		{budget.Photon, "W::Fe II 2340:1", func(p []cog.Point) { p[1].W += part * p[1].Err }},
		{budget.FValue, "f:Fe II 2420", func(p []cog.Point) { p[3].Line.F += part * p[3].Line.FErr }},
		{budget.FValue, "f:Fe II 2300", func(p []cog.Point) { p[0].Line.F += part * p[0].Line.FErr }},
	} {
		moved := append([]cog.Point(nil), pts...)
		tc.move(moved)
		m := mustFit(t, moved, cog.Options{NoContours: true})
		for _, q := range []struct {
			what  string
			a, b  budget.Number
			scale float64
		}{{"log N", r.LogN[0], m.LogN[0], 0.02}, {"b", r.B, m.B, 0.2}} {
			got := shift(q.a, tc.cause, tc.key)
			want := (q.b.X - q.a.X) / part
			isNumber(t, fmt.Sprintf("%s: shift by %v %s", q.what, tc.cause, tc.key), got, want, 0.03*math.Abs(want)+2e-3*q.scale)
		}
	}
}

// Scaling every f by k scales N by 1/k and leaves b; scaling widths and errors
// with λ does nothing; order does not matter.
func TestFitInvariances(t *testing.T) {
	pts := scattered(widths(fourLines, 14, 3, 0.03))
	r := mustFit(t, pts, cog.Options{})
	scaled := append([]cog.Point(nil), pts...)
	for i := range scaled {
		scaled[i].Line.F *= 1.7
	}
	s := mustFit(t, scaled, cog.Options{})
	isNumber(t, "log N with f × 1.7", s.LogN[0].X, r.LogN[0].X-math.Log10(1.7), 1e-7)
	isNumber(t, "b with f × 1.7", s.B.X, r.B.X, 1e-6)
	back := []cog.Point{pts[3], pts[1], pts[0], pts[2]}
	o := mustFit(t, back, cog.Options{})
	isNumber(t, "log N in another order", o.LogN[0].X, r.LogN[0].X, 1e-8)
	isNumber(t, "error in another order", o.LogN[0].ErrUp(), r.LogN[0].ErrUp(), 1e-4*r.LogN[0].ErrUp())
	if again := mustFit(t, pts, cog.Options{}); !reflect.DeepEqual(again, r) {
		t.Error("the same input gave another result")
	}
}

// Two lines with one shared continuum error: the ratio keeps b, the sum moves N.
func TestFitCommonErrorsAreNotPrivate(t *testing.T) {
	lines := ladder(0.3, 0.15)
	shared := widths(lines, 12.8, 3, 0.01)
	private := widths(lines, 12.8, 3, 0.01)
	for i := range shared {
		d := 0.05 * shared[i].W
		shared[i].Common = []budget.Shift{{Cause: budget.Continuum, Key: "one", D: d}}
		private[i].Common = []budget.Shift{{Cause: budget.Continuum, Key: "", D: d}}
	}
	a := mustFit(t, shared, cog.Options{NoContours: true})
	b := mustFit(t, private, cog.Options{NoContours: true})
	if !(a.LogN[0].Err() < 0.5*b.LogN[0].Err()) {
		t.Errorf("error of log N %.4f with a shared continuum, %.4f with two", a.LogN[0].Err(), b.LogN[0].Err())
	}
	if e := a.LogN[0].ErrBy(budget.Continuum); !(e > 0) {
		t.Error("the continuum's part of the error is lost")
	}
}

func TestFitSaysWhatItCannotSay(t *testing.T) {
	has := func(r cog.Result, words string) bool { return strings.Contains(strings.Join(r.Notes, "\n"), words) }
	t.Run("linear", func(t *testing.T) {
		r := mustFit(t, widths(ladder(0.3, 0.15), 11.3, 3, 0.05), cog.Options{})
		if k := r.B.Kind(); k != "lower" && k != "none" {
			t.Errorf("b of two thin lines is a %s: %v", k, r.B.X)
		}
		if r.LogN[0].Kind() != "value" || !(math.Abs(r.LogN[0].X-11.3) < r.LogN[0].Err()) {
			t.Errorf("log N = %v (%s)", r.LogN[0].X, r.LogN[0].Kind())
		}
		if !has(r, "b") || r.Contours[0].Open == "" {
			t.Errorf("notes %q, contour open %q", r.Notes, r.Contours[0].Open)
		}
	})
	t.Run("single", func(t *testing.T) {
		p := widths(ladder(0.3), 12, 2, 0.05)
		r := mustFit(t, p, cog.Options{})
		if r.B.Kind() != "none" || r.LogN[0].Kind() != "value" || r.BestB != 2 {
			t.Errorf("b %s, N %s", r.B.Kind(), r.LogN[0].Kind())
		}
		up, _ := cog.Invert(p[0].Line, p[0].W, 1)
		lo, _ := cog.Invert(p[0].Line, p[0].W, 4)
		isNumber(t, "log N", r.LogN[0].X, 12, 1e-7)
		stat := r.LogN[0].ErrBy(budget.Photon)
		isNumber(t, "up: to b = 1", r.LogN[0].ErrUp(), math.Hypot(up-12, stat), 0.03*r.LogN[0].ErrUp())
		isNumber(t, "down: to b = 4", r.LogN[0].ErrLo(), math.Hypot(12-lo, stat), 0.03*r.LogN[0].ErrUp())
		isNumber(t, "Profile", r.LogN[0].ErrBy(budget.Profile), (up-lo)/2, 1e-6)
	})
	t.Run("single saturated", func(t *testing.T) {
		r := mustFit(t, widths(ladder(0.3), 14.5, 2, 0.03), cog.Options{})
		if n := r.LogN[0]; n.Kind() != "lower" || !n.Is(budget.Saturated) || !(n.X < 14.5) || n.Conf != 3 {
			t.Errorf("log N %s %v, flags %v, conf %g", n.Kind(), n.X, n.Flag, n.Conf)
		}
		// Neither value nor limit may rest on the b assumed: clouds of b = 2 side by side
		// have the width of one with a larger b, or of one with damping wings.
		l := ladder(0.3)
		for _, clouds := range []float64{2, 3, 6} {
			w := clouds * cog.Width(l[0], 13.5, 2)
			truth := 13.5 + math.Log10(clouds)
			r = mustFit(t, []cog.Point{{Line: l[0], W: w, Err: 0.01 * w}}, cog.Options{})
			if n := r.LogN[0]; n.Kind() != "lower" || !(n.X < truth) {
				t.Errorf("%g clouds of %.2f in all: log N %s %.2f", clouds, truth, n.Kind(), n.X)
			}
		}
		// A line with damping wings is another matter: no b within the bounds explains it.
		r = mustFit(t, []cog.Point{{Line: l[0], W: cog.Width(l[0], 20, 2), Err: 0.1}}, cog.Options{})
		if n := r.LogN[0]; n.Kind() != "value" || !(math.Abs(n.X-20) < 3*n.ErrUp()) {
			t.Errorf("a damped line: log N %s %.2f ± %.2f", n.Kind(), n.X, n.Err())
		}
	})
	t.Run("flat", func(t *testing.T) {
		// two strong lines of nearly equal fλ cannot tell N from b
		r := mustFit(t, widths(ladder(0.3, 0.2), 14.5, 1.5, 0.05), cog.Options{})
		n := r.LogN[0]
		if !n.Is(budget.Saturated) {
			t.Errorf("flags %v", n.Flag)
		}
		if lo, hi := n.Range(); !(lo <= 14.5 && hi >= 14.5 && hi-lo > 0.5) {
			t.Errorf("log N %s in %v .. %v", n.Kind(), lo, hi)
		}
		if !has(r, "flat part") && !has(r, "hangs") {
			t.Errorf("notes %q", r.Notes)
		}
	})
	t.Run("two solutions", func(t *testing.T) {
		// A strong doublet lies on the flat part at one b and, with damping, at a smaller b too.
		l := []atomic.Line{{Name: "D2", Species: "Na I", Wave: 5891.5833, F: 0.6408, Gamma: 6.16e7}, {Name: "D1", Species: "Na I", Wave: 5897.5581, F: 0.3201, Gamma: 6.14e7}}
		r := mustFit(t, widths(l, 12.8, 1.8, 0.01), cog.Options{})
		n := r.LogN[0]
		if n.Kind() != "interval" || !has(r, "second solution") || len(r.Contours) < 3 {
			t.Fatalf("log N %s %v, %d contours, notes %q", n.Kind(), n.X, len(r.Contours), r.Notes)
		}
		isNumber(t, "best fit", r.BestLogN[0], 12.8, 1e-5)
		if lo, hi := n.Range(); !(lo < 12.8 && hi > 13.3) {
			t.Errorf("interval %v .. %v", lo, hi)
		}
	})
	t.Run("contradiction", func(t *testing.T) {
		for _, tc := range []struct {
			ratio float64
			words string
		}{{2.4, "above"}, {0.8, "weaker"}} {
			l := ladder(0.3, 0.15)
			l[1].Wave = l[0].Wave
			r := mustFit(t, []cog.Point{{Line: l[0], W: 0.02 * tc.ratio, Err: 0.0004}, {Line: l[1], W: 0.02, Err: 0.0004}}, cog.Options{})
			if !has(r, tc.words) || !has(r, "χ²") || !(r.Chi2 > 9) {
				t.Errorf("ratio %g: χ² %.1f, notes %q", tc.ratio, r.Chi2, r.Notes)
			}
		}
	})
}

func TestFitLimits(t *testing.T) {
	lines := ladder(0.3, 0.06, 0.0002)
	pts := widths(lines[:2], 13, 3, 0.03)
	base := mustFit(t, pts, cog.Options{})
	weak := cog.Width(lines[2], 13, 3)
	limit := func(w float64) cog.Result {
		return mustFit(t, append(append([]cog.Point(nil), pts...), cog.Point{Line: lines[2], W: w, Limit: true, Sigma: 3}), cog.Options{})
	}
	// far above: nothing changes, the likelihood is 1
	far := limit(500 * weak)
	isNumber(t, "log N with a limit far above", far.LogN[0].X, base.LogN[0].X, 1e-3*base.LogN[0].Err())
	isNumber(t, "χ² with a limit far above", far.Chi2, -2*math.Log(0.99865010), 1e-4) // Φ(3), table value
	// below the expected width: N is pushed down, and the fit pays for it
	near := limit(0.4 * weak)
	if !(near.LogN[0].X < base.LogN[0].X-0.3*base.LogN[0].Err() && near.Chi2 > 1) {
		t.Errorf("log N %v, before %v ± %v; χ² %v", near.LogN[0].X, base.LogN[0].X, base.LogN[0].Err(), near.Chi2)
	}
	if near.DOF != base.DOF {
		t.Errorf("a limit counts as a degree of freedom")
	}
	// our own non-detection is a Gaussian, below 0 as well
	own := func(w float64) cog.Result {
		return mustFit(t, append(append([]cog.Point(nil), pts...), cog.Point{Line: lines[2], W: w, Err: weak}), cog.Options{})
	}
	if a, b := own(-weak), own(2*weak); !(a.LogN[0].X < base.LogN[0].X && b.LogN[0].X > base.LogN[0].X && a.DOF == 1) {
		t.Errorf("log N %v, %v, %v for W below, none, above", a.LogN[0].X, base.LogN[0].X, b.LogN[0].X)
	}
}

func TestFitNothingDetected(t *testing.T) {
	l := ladder(0.3, 0.15)
	r := mustFit(t, []cog.Point{{Line: l[0], W: 0.0002, Err: 0.0003}, {Line: l[1], W: -0.0005, Err: 0.0003}}, cog.Options{})
	n := r.LogN[0]
	if n.Kind() != "upper" || n.Behind == nil || r.B.Kind() != "none" {
		t.Fatalf("log N is %s, %+v", n.Kind(), n)
	}
	// by hand: thin lines, a = 1/N per Å; N = Σ aW/Σ a² and σ = 0.3 mÅ/√Σ a²
	a0, a1 := 1/cog.Linear(1, l[0]), 1/cog.Linear(1, l[1])
	isNear(t, "N behind the limit", n.Behind.X, (a0*0.0002-a1*0.0005)/(a0*a0+a1*a1), 1e-9)
	isNear(t, "σ behind the limit", n.Behind.Err(), 0.0003/math.Hypot(a0, a1), 1e-9)
	// The limit is where χ² is 9 above its lowest for N ≥ 0.
	chi2 := func(x float64) float64 {
		u, v := (0.0002-cog.Width(l[0], x, 2))/0.0003, (-0.0005-cog.Width(l[1], x, 2))/0.0003
		return u*u + v*v
	}
	isNumber(t, "Δχ² at the limit", chi2(n.X)-chi2(-20), 9, 0.01)

	// other people's limits only: the lowest
	r = mustFit(t, []cog.Point{{Line: l[0], W: 0.001, Limit: true, Sigma: 2}, {Line: l[1], W: 0.001, Limit: true, Sigma: 3}}, cog.Options{})
	want, _ := cog.Invert(l[0], 0.001, 2)
	isNumber(t, "limit", r.LogN[0].X, want, 1e-9)
	if r.LogN[0].Kind() != "upper" || r.LogN[0].Conf != 2 {
		t.Errorf("%s at %g σ", r.LogN[0].Kind(), r.LogN[0].Conf)
	}
}

// cn_excitation_computed.csv: R(0), R(1), P(1) with one b give both columns back.
func TestFitLevelsCN(t *testing.T) {
	for _, row := range check.CSV(t, check.Shared(t, "checks/cn_excitation_computed.csv")) {
		var pts []cog.Point
		for _, l := range cnLines[:3] {
			w := check.F(t, row, "W_"+l.Name+"_mA") * 1e-3
			pts = append(pts, cog.Point{Line: l, W: w, Err: 0.002 * w})
		}
		r, err := cog.Fit("CN", pts, cog.Options{BMin: 0.2, BMax: 10})
		if err != nil {
			t.Fatal(err)
		}
		if !reflect.DeepEqual(r.Levels, []string{"CN N=0", "CN N=1"}) || r.DOF != 0 {
			t.Fatalf("levels %q, %d degrees of freedom", r.Levels, r.DOF)
		}
		for i := range 2 {
			want := math.Log10(check.F(t, row, fmt.Sprintf("N%d_cm2", i))) + constants
			isNumber(t, fmt.Sprintf("%s log N%d", row["id"], i), r.BestLogN[i], want, 1e-4)
			if n := r.LogN[i]; n.Kind() == "value" {
				isNumber(t, fmt.Sprintf("%s log N%d ± %.3f", row["id"], i, n.Err()), n.X, want, 3*n.Err())
			}
		}
		isNumber(t, row["id"]+" b", r.BestB, check.F(t, row, "b_kms"), 2e-3*r.BestB)
		// Both columns hang on the same b: their difference is better known than either.
		d := budget.Number{}
		if r.LogN[0].Kind() == "value" && r.LogN[1].Kind() == "value" && r.B.Kind() == "value" {
			d = budget.Ratio(r.LogN[1], r.LogN[0])
			if !(d.Err() > 0) {
				t.Errorf("%s: the ratio has no error", row["id"])
			}
		}
	}
}

// A level without a detection gets a limit at the b of the others.
func TestFitLevelsWithLimit(t *testing.T) {
	var pts []cog.Point
	for _, l := range cnLines {
		x := map[string]float64{"N=0": 12.8, "N=1": 12.3}[l.Level]
		if x == 0 {
			pts = append(pts, cog.Point{Line: l, W: 0.0001, Err: 0.0002})
			continue
		}
		w := cog.Width(l, x, 0.8)
		pts = append(pts, cog.Point{Line: l, W: w, Err: 0.0001})
	}
	r, err := cog.Fit("CN", pts, cog.Options{})
	if err != nil {
		t.Fatal(err)
	}
	if len(r.LogN) != 3 || r.LogN[2].Kind() != "upper" || r.LogN[0].Kind() != "value" {
		t.Fatalf("%v: %s %s %s", r.Levels, r.LogN[0].Kind(), r.LogN[1].Kind(), r.LogN[2].Kind())
	}
	if r.LogN[2].Behind == nil || len(r.Cov) != 16 || r.Cov[10] != 0 || !(r.Cov[0] > 0 && r.Cov[15] > 0) {
		t.Errorf("limit %+v, covariance %v", r.LogN[2], r.Cov)
	}
}

func TestFitRefuses(t *testing.T) {
	good := cog.Point{Line: fourLines[0], W: 0.02, Err: 0.001}
	with := func(f func(*cog.Point)) []cog.Point {
		p := good
		f(&p)
		return []cog.Point{good, p}
	}
	nan := math.NaN()
	for name, tc := range map[string]struct {
		pts []cog.Point
		o   cog.Options
	}{
		"nothing":         {nil, cog.Options{}},
		"W NaN":           {with(func(p *cog.Point) { p.W = nan }), cog.Options{}},
		"no error":        {with(func(p *cog.Point) { p.Err = 0 }), cog.Options{}},
		"negative error":  {with(func(p *cog.Point) { p.Err = -1 }), cog.Options{}},
		"error NaN":       {with(func(p *cog.Point) { p.Err = nan }), cog.Options{}},
		"no f":            {with(func(p *cog.Point) { p.Line.F = 0 }), cog.Options{}},
		"γ NaN":           {with(func(p *cog.Point) { p.Line.Gamma = nan }), cog.Options{}},
		"limit 0":         {with(func(p *cog.Point) { p.Limit, p.W = true, 0 }), cog.Options{}},
		"shared NaN":      {with(func(p *cog.Point) { p.Common = []budget.Shift{{D: nan}} }), cog.Options{}},
		"strengths":       {with(func(p *cog.Point) { p.Line.Parts = []atomic.Part{{Strength: 0.5}} }), cog.Options{}},
		"bounds":          {[]cog.Point{good}, cog.Options{BMin: 3, BMax: 1}},
		"assumed outside": {[]cog.Point{good}, cog.Options{B: 50}},
		"sigma":           {[]cog.Point{good}, cog.Options{Sigma: -3}},
	} {
		if r, err := cog.Fit("Fe II", tc.pts, tc.o); err == nil {
			t.Errorf("%s: accepted, log N = %v", name, r.LogN)
		} else if !strings.HasPrefix(err.Error(), "Fe II: ") {
			t.Errorf("%s: %v does not name the species", name, err)
		}
	}
}

func TestResultJSON(t *testing.T) {
	pts := append(widths(fourLines, 14, 3, 0.03), cog.Point{Line: ladder(1e-5)[0], W: -0.001, Err: 0.001})
	r := mustFit(t, pts, cog.Options{})
	one, err := json.Marshal(r)
	if err != nil {
		t.Fatal(err)
	}
	var back cog.Result
	if err := json.Unmarshal(one, &back); err != nil {
		t.Fatal(err)
	}
	two, _ := json.Marshal(back)
	if string(one) != string(two) {
		t.Error("a result does not read back as it was written")
	}
	if l := back.Lines[4]; !math.IsNaN(l.LogNLinear) || l.W != -0.001 {
		t.Errorf("a negative width came back as %+v", l)
	}
	single := mustFit(t, pts[:1], cog.Options{}) // b is none: NaN
	if _, err := json.Marshal(single); err != nil {
		t.Error(err)
	}
}

func ExampleFit() {
	// Two lines of an invented sightline, 2:1 in fλ.
	strong := atomic.Line{Name: "Na I 5889.95", Species: "Na I", Wave: 5891.5833, F: 0.6408, Gamma: 6.16e7}
	weak := atomic.Line{Name: "Na I 5895.92", Species: "Na I", Wave: 5897.5581, F: 0.3201, Gamma: 6.14e7}
	r, err := cog.Fit("Na I", []cog.Point{{Line: strong, W: 0.0900, Err: 0.0010}, {Line: weak, W: 0.0600, Err: 0.0010}}, cog.Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	n := r.LogN[0]
	fmt.Printf("log N = %.2f +%.2f −%.2f, b = %.1f km/s\n", n.X, n.ErrUp(), n.ErrLo(), r.B.X)
	// Output: log N = 11.94 +0.02 −0.02, b = 2.2 km/s
}
