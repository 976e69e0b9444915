package cog

import (
	"fmt"
	"math"
	"slices"

	"lacuna/budget"
	"lacuna/internal/lsq"
)

// Δχ² of the quantities that a fit reports.
const (
	OneSigma  = 1.00 // 68.27 %, one parameter
	TwoInOne  = 2.30 // 68.27 %, two parameters together
	TwoInTwo  = 6.17 // 95.45 %, two parameters together
	scanSteps = 28   // values of ln b at which the valley is first looked at
	// From this change of log N per dex of b a column hangs on a bound of b.
	hangs = 0.2
	// A column that b between the least assumed and the largest allowed moves by more
	// is only a lower limit (dex).
	assumedMost = 0.3
)

// Fit finds N and b of one species from measured widths; lines that start from
// different levels get a column each (FitLevels), named by their carriers in the
// order in which they first appear.
func Fit(species string, pts []Point, o Options) (Result, error) {
	var levels []Level
	for _, p := range pts {
		name := p.Line.Carrier()
		k := slices.IndexFunc(levels, func(l Level) bool { return l.Name == name })
		if k < 0 {
			k = len(levels)
			levels = append(levels, Level{Name: name})
		}
		levels[k].Points = append(levels[k].Points, p)
	}
	return FitLevels(species, levels, o)
}

// FitLevels finds the column of each level and one Doppler parameter for all, by
// least squares on exact widths:
//
//	χ² = (W − M)ᵀ C⁻¹ (W − M) − 2 Σ ln Φ((W_lim − M)/σ)
//
// C holds the private errors and the shifts that lines share (Common, by key).
// Non-detections of our own (W ± σ, W may be negative) count as the Gaussians that
// they are; other people's upper limits (Limit) through the probability Φ that the
// data stay below them.
//
// Method: the valley of χ² is followed over all b between the bounds, its lowest
// point polished on exact widths; errors are where χ² has risen by 1 with all else
// free (profile likelihood; Wilks 1938, Ann. Math. Stat. 9, 60), contours where it
// has risen by 2.30 and 6.17. Errors of f are no part of χ²: each is a Shift with
// its line's own key, and part of the totals. Nothing is rescaled by χ².
//
// What the data cannot say is said:
//
//   - b open on one side is a limit, at the largest of Sigma, 2 and 1σ at which it
//     closes; open on both it is none, and N is taken at the assumed b, with the
//     range of b as a Profile shift, or, where b up to its upper bound moves N by more
//     than 0.3 dex, as a lower limit at that bound;
//   - N that hangs on the lower bound of b is a lower limit;
//   - a level without a detection at 3σ gets an upper limit, N ± σ behind it;
//   - two solutions that are equally good at 1σ (a flat and a damped one) give
//     intervals for N and b;
//   - a second minimum, widths that contradict each other, a solution at a bound
//     are named in Notes.
//
// Errors: no points, a width or an error that is not a number, a line without f,
// bounds in the wrong order, errors that fix some combination of widths exactly.
func FitLevels(species string, levels []Level, o Options) (Result, error) {
	o, err := o.check(levels)
	if err != nil {
		return Result{}, fmt.Errorf("%s: %w", species, err)
	}
	f := &fit{o: o, species: species, levels: levels}
	f.res = Result{Species: species, Stop: string(lsq.Converged), DOF: 0, B: budget.Number{X: math.NaN()},
		LogN: make([]budget.Number, len(levels)), BestLogN: make([]float64, len(levels)), BestB: o.B,
		Cov: make([]float64, (len(levels)+1)*(len(levels)+1))}
	for _, l := range levels {
		f.res.Levels = append(f.res.Levels, l.Name)
	}
	for k, l := range levels {
		if detected(l) {
			f.use = append(f.use, k)
		}
	}
	if len(f.use) > 0 {
		if err := f.detections(); err != nil {
			return Result{}, fmt.Errorf("%s: %w", species, err)
		}
	}
	for k := range levels {
		if !slices.Contains(f.use, k) {
			if err := f.limit(k); err != nil {
				return Result{}, fmt.Errorf("%s: %w", species, err)
			}
		}
	}
	f.lines()
	return f.res, nil
}

// fit is the state of one FitLevels.
type fit struct {
	o       Options
	species string
	levels  []Level
	use     []int // the levels with a detection

	d       *data
	exact   *exact
	valley  *valley
	best    []float64 // log₁₀N of the used levels, ln b
	chi2    float64
	bottom  bottom   // of the valley at the best b: its χ² is the zero of all Δχ²
	others  []bottom // other solutions with Δχ² below 6.17
	first   float64  // first step in ln b when looking for a crossing
	lo, hi  float64  // ln b where χ² has risen by 1
	loOpen  bool     // there is no such place above the lower bound
	hiOpen  bool
	res     Result
	corrMin float64 // smallest and largest correction of the detected lines, dex
	corrMax float64
}

// detections fits the levels that have one.
func (f *fit) detections() error {
	var err error
	if f.d, err = newData(f.levels, f.use); err != nil {
		return err
	}
	f.exact = newExact(f.d)
	f.valley = newValley(f.d, f.o.BMin, f.o.BMax)
	if err := f.minimum(); err != nil {
		return err
	}
	f.res.Chi2 = f.chi2
	f.lo, f.loOpen = f.closing(f.bottom, OneSigma, -1)
	f.hi, f.hiOpen = f.closing(f.bottom, OneSigma, 1)
	free := 1
	if f.loOpen && f.hiOpen {
		free = 0
	}
	f.res.DOF = max(f.d.gauss-len(f.use)-free, 0)
	if free == 0 {
		if err := f.assumed(); err != nil {
			return err
		}
	} else {
		f.constrained()
	}
	f.contradictions()
	if !f.o.NoContours {
		for _, delta := range []float64{TwoInOne, TwoInTwo} {
			f.contours(delta)
		}
	}
	return nil
}

func (f *fit) note(format string, a ...any) {
	f.res.Notes = append(f.res.Notes, fmt.Sprintf(format, a...))
}

// detected reports whether a width of the level, or their weighted sum on the
// linear part, stands 3σ above 0.
func detected(l Level) bool {
	for _, p := range l.Points {
		if !p.Limit && p.W >= budget.DetectionSigma*total(p) {
			return true
		}
	}
	n, ok := thin(l)
	return ok && n.X >= budget.DetectionSigma*n.Err()
}

func total(p Point) float64 {
	return budget.Number{Shifts: append([]budget.Shift{{Cause: budget.Photon, D: p.Err}}, p.Common...)}.Err()
}
