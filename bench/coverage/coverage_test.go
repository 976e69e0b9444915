package main

import (
	"bytes"
	"go/parser"
	"go/token"
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

// A small version of the study, on two classes that carry the promise. The tolerances are
// four times what 100 sightlines leave open: a coverage of 68.3 % is known to 2.8 % from
// the values of 300 clouds, to 4.6 % from one sum a sightline; a scatter to 7 %.
func TestIntervalsHold(t *testing.T) {
	for _, tc := range []struct {
		class string
		snr   float64
	}{{"apart >2; τ₀ 0.5", 100}, {"touching 1–2; τ₀ 0.5", 500}} {
		st := study{how: linear, trials: 100, most: 3, seed: 11, snr: []float64{tc.snr}, only: []string{tc.class}, workers: 2}
		chosen := st.chosen()
		if len(chosen) != 1 {
			t.Fatalf("%q names %d classes", tc.class, len(chosen))
		}
		trials, refused := st.trialsOf(chosen[0], tc.snr)
		for _, r := range refused {
			t.Error(r)
		}
		for q := range quantities {
			c := count(trials, q, firm)
			t.Logf("%s, S/N %g, %s: %d sightlines, bias %+.3f, scatter %.3f, core %.3f, error %.3f, 68 %%: %s, 95 %%: %s",
				tc.class, tc.snr, quantityNames[q], c.sightlines, c.bias, c.scatter, c.core, c.ratio, c.in68, c.in95)
			if c.sightlines < 90 {
				t.Fatalf("only %d sightlines", c.sightlines)
			}
			if !(math.Abs(c.in68.x-0.6827) <= 0.18) || !(math.Abs(c.in95.x-0.95) <= 0.08) {
				t.Errorf("%s, S/N %g, %s: intervals hold %s and %s of the truth", tc.class, tc.snr, quantityNames[q], c.in68, c.in95)
			}
			if !(math.Abs(c.core-1) <= 0.3) || !(math.Abs(c.bias) <= 0.5) {
				t.Errorf("%s, S/N %g, %s: scatter %.3f, bias %.3f of the Cramér–Rao bound", tc.class, tc.snr, quantityNames[q], c.core, c.bias)
			}
			// The errors of the fit against bounds from the other model's slopes: the median
			// hides the noise of each.
			if !(math.Abs(c.ratio-1) <= 0.03) {
				t.Errorf("%s, S/N %g, %s: errors are %.3f of the Cramér–Rao bound", tc.class, tc.snr, quantityNames[q], c.ratio)
			}
		}
	}
}

// The forward model, its Voigt function and the bounds use nothing of what they check.
func TestIndependent(t *testing.T) {
	for _, name := range []string{"voigt.go", "forward.go", "fisher.go"} {
		f, err := parser.ParseFile(token.NewFileSet(), name, nil, parser.ImportsOnly)
		if err != nil {
			t.Fatal(err)
		}
		for _, im := range f.Imports {
			if strings.Contains(im.Path.Value, "lacuna/") && im.Path.Value != `"lacuna/atomic"` {
				t.Errorf("%s imports %s", name, im.Path.Value)
			}
		}
	}
}

// Numbers that are Gaussian about the truth with the stated errors, and with errors
// that are a fifth too small: what the count must say is erf(1/√2), erf(0.8/√2) and so on.
// The values of one sightline are equal, so the intervals must be those of 3,000 values,
// not of 12,000.
func TestCount(t *testing.T) {
	for _, k := range []float64{1, 0.8} {
		rng := rand.New(rand.NewPCG(5, 5))
		var trials []trial
		for range 3000 {
			tr := trial{bin: firm}
			x := rng.NormFloat64()
			for range 4 {
				sc := score{quantity: column, bound: 1}
				sc.interval(x+10, k, k, 10)
				tr.scores = append(tr.scores, sc)
			}
			trials = append(trials, tr)
		}
		c := count(trials, column, firm)
		want68, want95 := math.Erf(k/math.Sqrt2), math.Erf(k*z95/math.Sqrt2)
		se := math.Sqrt(want68 * (1 - want68) / 3000)
		if !(math.Abs(c.in68.x-want68) <= 4*se) || !(math.Abs(c.in95.x-want95) <= 4*se) {
			t.Errorf("errors %g: %s and %s, want %.3f and %.3f", k, c.in68, c.in95, want68, want95)
		}
		if w := c.in68.hi - c.in68.lo; !(math.Abs(w/(2*z95*se)-1) <= 0.15) { // 1000 resamplings: 5 %, three times that
			t.Errorf("errors %g: the interval is %.4f wide, want %.4f", k, w, 2*z95*se)
		}
		if !(math.Abs(c.scatter-1) <= 0.06) || !(math.Abs(c.core-1) <= 0.08) || !(math.Abs(c.ratio-k) <= 1e-9) || c.sightlines != 3000 || c.values != 12000 {
			t.Errorf("errors %g: %+v", k, c)
		}
	}
}

// The same bytes on one worker and on two; every method runs; words for what is wrong.
func TestCommand(t *testing.T) {
	var out [3]bytes.Buffer
	base := []string{"-class", "touching 1–2; τ₀ 0.5", "-snr", "100", "-trials", "20", "-faint", "0", "-most", "5"}
	for i, w := range []string{"1", "2"} {
		var log bytes.Buffer
		if code := run(append([]string{"-workers", w}, base...), &out[i], &log); code != 0 {
			t.Fatal(code, log.String())
		}
	}
	if !bytes.Equal(out[0].Bytes(), out[1].Bytes()) || !strings.Contains(out[0].String(), "log ΣN") {
		t.Errorf("two workers print\n%s\nand one\n%s", out[1].String(), out[0].String())
	}
	for _, bad := range [][]string{{"-snr", "x"}, {"-method", "guess"}, {"-trials", "0"}, {"-class", "none"}, {"more"}} {
		var log bytes.Buffer
		if code := run(bad, &out[2], &log); code != 2 || log.Len() == 0 {
			t.Errorf("%v: code %d, %q", bad, code, log.String())
		}
	}
}
