package measure

import (
	"fmt"
	"math"
	"slices"

	"lacuna/budget"
	"lacuna/voigt"
)

// Where the correction for unresolved saturation stops.
const (
	mostDelta = 0.20 // dex; beyond, small errors of δ move the column by more than a factor of 2
	mostWings = 0.01 // part of W in Lorentz wings
	mostSplit = 0.03 // relative difference of the widths by hyperfine structure
	ratioTol  = 0.05 // of the ratio of fλ about 2
)

// CompareDoublet compares the apparent columns of the two lines of a doublet,
//
//	δ = log N_a(weak) − log N_a(strong).
//
// Without saturation that the instrument hides, δ = 0. With it the stronger line
// misses more, and log N = log N_a(weak) + correction(δ): the correction is that of
// one Gaussian component much narrower than the instrument, from its exact growth
// (0.118 dex at δ = 0.10, 0.330 at 0.20 for fλ in the ratio 2). An error of
// structure is how far a component with half the instrument's width lies from that.
//
// The correction is refused, and Corrected is NaN with the reason in Refused: δ above
// 0.20; σ_δ above δ/2, or δ negative; fλ ratio not 2 within 5 %; a line black
// (its column a limit) or not detected; hyperfine structure that makes the widths of
// the two lines differ by more than 3 % at the b assumed; Lorentz wings with more than
// 1 % of the strong line.
//
// Sources: Savage & Sembach 1991, ApJ 379, 245; Jenkins 1996, ApJ 471, 292 (the
// method and its limits); the curve is our own computation.
func CompareDoublet(strong, weak Width) Doublet {
	d := Doublet{Species: strong.Species, Strong: strong.Line, Weak: weak.Line, Delta: none(), Corrected: none()}
	ratio := strong.F * strong.Wave / (weak.F * weak.Wave)
	switch {
	case strong.Species != weak.Species || strong.Level != weak.Level:
		d.Refused = fmt.Sprintf("%s and %s do not start from the same level", strong.Line, weak.Line)
		return d
	case !(ratio > 1):
		d.Refused = fmt.Sprintf("%s is not the stronger line", strong.Line)
		return d
	case !strong.Detected || !weak.Detected:
		d.Refused = "both lines must be detected"
		return d
	case !(strong.AOD.X > 0) || !(weak.AOD.X > 0):
		d.Refused = "no apparent column"
		return d
	}
	if strong.Floored > 0 || weak.Floored > 0 {
		d.Refused = "a core is black: its apparent column is a lower limit"
		return d
	}
	ls, lw := plainLog(strong.AOD), plainLog(weak.AOD)
	d.Delta = budget.Combine([]float64{1, -1}, lw, ls)
	x, e := d.Delta.X, d.Delta.Err()
	d.Saturated = x > 0.05+2*e
	switch b := min(orB(strong.B), orB(weak.B)); {
	case math.Abs(ratio/2-1) > ratioTol:
		d.Refused = fmt.Sprintf("fλ differ by a factor of %.3g, not 2", ratio)
	case x > mostDelta:
		d.Refused = fmt.Sprintf("δ = %.3f is above %.2f: the column hardly depends on it there", x, mostDelta)
	case !(x > 0) || !(e <= x/2):
		d.Refused = fmt.Sprintf("δ = %.3f ± %.3f is not measured to better than half of it", x, e)
	case math.Abs(widen(b, strong.Split)/widen(b, weak.Split)-1) > mostSplit:
		d.Refused = "hyperfine structure differs between the lines"
	}
	if d.Refused != "" {
		return d
	}
	tau := inverse(x, func(t float64) float64 { d, _, _ := unresolved(t, ratio); return d })
	_, corr, _ := unresolved(tau, ratio)
	if b := min(orB(strong.B), orB(weak.B)); wings(ratio*tau, strong.Gamma, strong.Wave, b) > mostWings {
		d.Refused = "Lorentz wings carry more than 1 % of the strong line"
		return d
	}
	const h = 1e-3
	up := inverse(x+h, func(t float64) float64 { d, _, _ := unresolved(t, ratio); return d })
	_, more, _ := unresolved(up, ratio)
	slope := (more - corr) / h
	d.Corrected = budget.Combine([]float64{1 + slope, -slope}, lw, ls)
	d.Corrected.X = lw.X + corr
	if t := inverse(x, func(t float64) float64 { d, _, _ := resolved(t, ratio, 2); return d }); !math.IsNaN(t) {
		_, other, _ := resolved(t, ratio, 2)
		d.Corrected.Shifts = append(d.Corrected.Shifts, budget.Shift{Cause: budget.Structure, D: other - corr})
	}
	d.Corrected.Flag &^= budget.Saturated | budget.Lower
	return d
}

// plainLog is log₁₀ of a column with its shifts; that a line is saturated is what
// the comparison is for, so limit flags are taken off.
// plainLog is the log of an apparent column as it was seen: without flags of
// saturation, and without the error for what it may hide, which is what δ measures.
func plainLog(n budget.Number) budget.Number {
	n.Flag &^= budget.Lower | budget.Saturated
	n.Shifts = slices.DeleteFunc(slices.Clone(n.Shifts), func(s budget.Shift) bool { return s.Cause == budget.Structure })
	return budget.Log10(n)
}

func orB(b float64) float64 {
	if b > 0 {
		return b
	}
	return 1
}

// widen is b with structure of the rms split folded in.
func widen(b, split float64) float64 { return math.Hypot(b, math.Sqrt2*split) }

// wings is how much wider (relative) a line of central optical depth tau0 is by
// natural damping gamma (s⁻¹): the growth of H(a, u) over that of a Gaussian, minus 1.
// Integrated in u = sinh t, which reaches 1e6 Doppler widths.
func wings(tau0, gamma, wave, b float64) float64 {
	if !(gamma > 0) || !(tau0 > 0) {
		return 0
	}
	a := voigt.Damping(gamma, wave, b)
	const step = 0.02
	gauss, damped := 0.0, 0.0
	for k := 0; float64(k)*step < 14.5; k++ {
		t := float64(k) * step
		u, du := math.Sinh(t), math.Cosh(t)
		if k == 0 {
			du /= 2
		}
		gauss -= math.Expm1(-tau0*math.Exp(-u*u)) * du
		damped -= math.Expm1(-tau0*voigt.H(a, u)) * du
	}
	return damped/gauss - 1
}
