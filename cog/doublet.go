package cog

import (
	"fmt"
	"math"

	"lacuna/atomic"
)

// DoubletRatio solves two widths (Å) of one level for the column and the Doppler
// parameter that give both (the doublet-ratio method; Strömgren 1948, ApJ 108,
// 242, from memory). strong is the line with the larger fλ. Where damping allows two answers
// (the ratio falls and rises again towards the wings), it returns the one with
// the larger b and the smaller N.
//
// It refuses ratios (W/λ of strong over weak) that no cloud gives: at or below 1,
// at or above the ratio of fλ (2 in most resonance doublets), or below what b
// of 0.05 km/s gives. Such widths contradict each other or have errors that
// forbid the method; Fit weighs them with their errors.
func DoubletRatio(strong, weak atomic.Line, ws, ww float64) (logN, b float64, err error) {
	nan := math.NaN()
	for _, l := range []*atomic.Line{&strong, &weak} {
		if err := checkLine(l); err != nil {
			return nan, nan, err
		}
	}
	if !(ws > 0 && ww > 0) || math.IsInf(ws, 0) || math.IsInf(ww, 0) {
		return nan, nan, fmt.Errorf("doublet %s and %s: widths %g and %g Å; both must be above 0", strong.Name, weak.Name, ws, ww)
	}
	most := strong.F * strong.Wave / (weak.F * weak.Wave)
	if !(most > 1) {
		return nan, nan, fmt.Errorf("doublet %s and %s: fλ of the first is %.4g of the second; name the stronger line first", strong.Name, weak.Name, most)
	}
	ratio := ws / strong.Wave / (ww / weak.Wave)
	if !(ratio > 1 && ratio < most) {
		return nan, nan, fmt.Errorf("doublet %s and %s: the widths have the ratio %.4g, outside 1 .. %.4g: no cloud gives both", strong.Name, weak.Name, ratio, most)
	}
	// excess(b) = W_strong − ws for the column that gives ww; above 0 where b is
	// too large. Down from thin lines to the first b where it changes sign.
	excess := func(y float64) (float64, float64, error) {
		x, err := Invert(weak, ww, math.Exp(y))
		if err != nil {
			return nan, nan, err
		}
		return Width(strong, x, math.Exp(y)) - ws, x, nil
	}
	// At this b both lines are thin and their widths have the ratio most.
	hi := math.Log(atomic.C * ww / weak.Wave * 1e3)
	lowest := math.Log(0.05)
	if hi < lowest+1 {
		hi = lowest + 1
	}
	fh, x, err := excess(hi)
	if err != nil {
		return nan, nan, err
	}
	for fh < 0 && hi < 25 { // a ratio within 1e-4 of the thin limit
		hi++
		if fh, x, err = excess(hi); err != nil {
			return nan, nan, err
		}
	}
	lo := hi
	for {
		if lo <= lowest {
			return nan, nan, fmt.Errorf("doublet %s and %s: the ratio %.4g is not reached above b = 0.05 km/s", strong.Name, weak.Name, ratio)
		}
		lo -= 0.1
		f, _, err := excess(lo)
		if err != nil {
			return nan, nan, err
		}
		if f <= 0 {
			break
		}
		hi = lo
	}
	for hi-lo > 1e-13*math.Max(1, math.Abs(hi)) {
		mid := lo + (hi-lo)/2
		f, at, err := excess(mid)
		if err != nil {
			return nan, nan, err
		}
		x = at
		if f > 0 {
			hi = mid
		} else {
			lo = mid
		}
		if mid == lo && mid == hi {
			break
		}
	}
	return x, math.Exp(hi), nil
}
