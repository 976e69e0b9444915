package survey

import (
	"fmt"
	"slices"
	"strings"

	"lacuna/atomic"
	"lacuna/internal/oops"
	"lacuna/measure"
	"lacuna/spectrum"
	"lacuna/spectrum/continuum"
	"lacuna/spectrum/frame"
	"lacuna/spectrum/telluric"
)

// A LineTask asks for one line in every segment that holds it.
type LineTask struct {
	Line       atomic.Line
	Window     [2]float64   // km/s
	AutoWindow bool         // Window is the range to search
	Continuum  [][2]float64 // km/s; nil: automatic
	Degree     int          // −1: by information criterion
	MaxDegree  int          // 0: 3
	B          float64      // km/s, assumed where nothing is detected; 0: by kind
	Detection  float64      // σ; 0: 3
	LimitSigma float64      // 0: 3
	LimitWidth float64      // km/s; 0: twice the observed FWHM
	Velocity   [2]float64   // km/s, where gas of the sightline is expected (for blends)
	File       string       // "": every file
	Order      *int         // nil: every order
	Optional   bool         // no error where no spectrum holds it
	Also       []string     // other transitions asked for on this sightline

	Zero    func(file string) measure.Zero // prior, where no black core measures it
	ContErr func(file string) float64      // relative error of a given continuum
}

// A Light is one segment on vacuum wavelengths in the frame of the results, with
// what is needed to place telluric lines on it.
type Light struct {
	Seg    spectrum.Segment
	Index  int     // of the segment in its file
	Earth  float64 // km/s, the observer's velocity towards the star in that frame
	Placed bool    // Earth is known
	R      float64 // λ/FWHM, 0 unknown
	RErr   float64 // relative
}

// covers reports whether the window of a line lies inside the segment.
func (l Light) covers(line atomic.Line, window [2]float64) bool {
	w := l.Seg.Wave
	return len(w) > 1 && frame.Wavelength(line.Wave, window[0]) >= w[0] && frame.Wavelength(line.Wave, window[1]) <= w[len(w)-1]
}

// piece cuts a line's neighbourhood out of a segment and places its continuum.
func (l Light) piece(t LineTask, table *atomic.Table) (measure.Piece, error) {
	lo, hi := l.reach(t, table)
	cut := l.Seg.Cut(frame.Wavelength(t.Line.Wave, lo), frame.Wavelength(t.Line.Wave, hi))
	p := measure.Piece{
		Line: t.Line, Wave: cut.Wave, Flux: cut.Flux, Err: cut.Err, Mask: cut.Mask,
		Window: t.Window, AutoWindow: t.AutoWindow, B: t.B, Detection: t.Detection, LimitSigma: t.LimitSigma, LimitWidth: t.LimitWidth, File: l.Seg.Source.File, Order: l.Seg.Order,
	}
	if t.Zero != nil {
		p.Zero = t.Zero(l.Seg.Source.File)
	}
	contErr := 0.0
	if t.ContErr != nil {
		contErr = t.ContErr(l.Seg.Source.File)
	}
	if l.R > 0 {
		p.FWHM = atomic.C / l.R
	}
	p.Neighbours = l.neighbours(t, table)
	o := continuum.Options{Degree: t.Degree, MaxDegree: t.MaxDegree, Exclude: l.exclude(t, lo, hi, table)}
	o.Target = [2]float64{frame.Wavelength(t.Line.Wave, t.Window[0]), frame.Wavelength(t.Line.Wave, t.Window[1])}
	o.Noise = l.noise(t, table)
	for _, c := range t.Continuum {
		o.Windows = append(o.Windows, [2]float64{frame.Wavelength(t.Line.Wave, c[0]), frame.Wavelength(t.Line.Wave, c[1])})
	}
	var err error
	switch {
	case cut.Continuum != nil:
		p.Continuum, err = continuum.Given(cut.Wave, cut.Flux, cut.Err, cut.Continuum, cut.Mask, contErr, o)
	case cut.Normalised:
		one := make([]float64, len(cut.Wave))
		for i := range one {
			one[i] = 1
		}
		p.Continuum, err = continuum.Given(cut.Wave, cut.Flux, cut.Err, one, cut.Mask, contErr, o)
	default:
		p.Continuum, err = continuum.Fit(cut.Wave, cut.Flux, cut.Err, cut.Mask, o)
	}
	if err != nil {
		return p, fmt.Errorf("%s in %s: %w", t.Line.Name, l.Seg.Label, err)
	}
	return p, nil
}

// notCovered says where the nearest data are.
func notCovered(lights []Light, t LineTask) error {
	lo, hi := frame.Wavelength(t.Line.Wave, t.Window[0]), frame.Wavelength(t.Line.Wave, t.Window[1])
	var have []string
	for _, l := range lights {
		if t.File != "" && l.Seg.Source.File != t.File {
			continue
		}
		w := l.Seg.Wave
		have = append(have, fmt.Sprintf("%s, %.2f to %.2f Å", l.Seg.Label, w[0], w[len(w)-1]))
	}
	if len(have) > 6 {
		have = append(have[:6], "…")
	}
	what := fmt.Sprintf("no spectrum holds its window, %.2f to %.2f Å in vacuum", lo, hi)
	if t.Order != nil {
		what = fmt.Sprintf("order %d does not hold its window, %.2f to %.2f Å in vacuum", *t.Order, lo, hi)
		known := false
		for _, l := range lights {
			known = known || l.Seg.Order == *t.Order
		}
		if !known {
			what = fmt.Sprintf("there is no order %d", *t.Order)
		}
	}
	return oops.Input("", t.Line.Name, what, "the data hold "+strings.Join(have, "; "))
}

// The continuum of a line reaches to continuumWidths line widths and
// continuumPixels clean pixels on each side, but never farther than farthest.
// (The first two are common practice, no source.)
const (
	continuumWidths = 3
	continuumPixels = 60
	farthest        = 1500 // km/s
)

// reach returns the range (km/s) that the piece of a line needs: the user's
// continuum ranges, or enough clean pixels on both sides of the window.
func (l Light) reach(t LineTask, table *atomic.Table) (lo, hi float64) {
	if len(t.Continuum) > 0 {
		lo, hi = t.Window[0], t.Window[1]
		for _, c := range t.Continuum {
			more := 0.1 * (c[1] - c[0]) // room for the placement with wider windows
			lo, hi = min(lo, c[0]-more), max(hi, c[1]+more)
		}
		return lo, hi
	}
	span := continuumWidths * (t.Window[1] - t.Window[0])
	taken := l.exclude(t, t.Window[0]-farthest, t.Window[1]+farthest, table)
	wave, rest := l.Seg.Wave, t.Line.Wave
	clean := func(i int) bool {
		if l.Seg.Mask[i].Bad() {
			return false
		}
		for _, r := range taken {
			if wave[i] >= r[0] && wave[i] <= r[1] {
				return false
			}
		}
		return true
	}
	first, _ := slices.BinarySearch(wave, frame.Wavelength(rest, t.Window[0]))
	lo = t.Window[0]
	for i, n := first-1, 0; i >= 0 && lo > t.Window[0]-farthest && (n < continuumPixels || lo > t.Window[0]-span); i-- {
		if lo = frame.Velocity(wave[i], rest); clean(i) {
			n++
		}
	}
	last, _ := slices.BinarySearch(wave, frame.Wavelength(rest, t.Window[1]))
	hi = t.Window[1]
	for i, n := last, 0; i < len(wave) && hi < t.Window[1]+farthest && (n < continuumPixels || hi < t.Window[1]+span); i++ {
		if hi = frame.Velocity(wave[i], rest); clean(i) {
			n++
		}
	}
	return lo, hi
}

// noiseReach is how many pixels on each side of a line its noise is measured on:
// enough for the correlation, near enough for the same detector and blaze.
const noiseReach = 1500

// noise measures the noise about a line on many short stretches of continuum: its
// correlation rests on far more pixels than the continuum of the line. nil where
// there is too little continuum.
func (l Light) noise(t LineTask, table *atomic.Table) *continuum.Noise {
	at, _ := slices.BinarySearch(l.Seg.Wave, t.Line.Wave)
	a, b := max(0, at-noiseReach), min(len(l.Seg.Wave), at+noiseReach)
	w := l.Seg.Wave[a:b]
	taken := l.exclude(t, frame.Velocity(w[0], t.Line.Wave), frame.Velocity(w[len(w)-1], t.Line.Wave), table)
	var err []float64
	if l.Seg.Err != nil {
		err = l.Seg.Err[a:b]
	}
	_, n, e := continuum.Audit(w, l.Seg.Flux[a:b], err, l.Seg.Mask[a:b], taken)
	if e != nil {
		return nil
	}
	n.Ratio = 0 // the level of the noise is the line's own
	return &n
}

// neighbours lists what else may absorb in the window of a line.
func (l Light) neighbours(t LineTask, table *atomic.Table) []measure.Feature {
	return measure.Neighbours(t.Line, t.Window, l.surroundings(t, t.Window[0], t.Window[1], table))
}

// surroundings gathers everything known that may absorb between lo and hi km/s of
// a line, with a margin for velocities.
func (l Light) surroundings(t LineTask, lo, hi float64, table *atomic.Table) measure.Surroundings {
	const margin = 1500 // km/s: gas, star and Earth together
	a, b := frame.Wavelength(t.Line.Wave, lo-margin), frame.Wavelength(t.Line.Wave, hi+margin)
	s := measure.Surroundings{Gas: t.Velocity, Lines: table.Between(a, b), AirV: l.Earth, AirKnown: l.Placed}
	for _, band := range atomic.Bands() {
		if band.Wave > a && band.Wave < b {
			s.Bands = append(s.Bands, band)
		}
	}
	for _, st := range atomic.StellarLines() {
		if st.Wave > a && st.Wave < b {
			s.Stellar = append(s.Stellar, st)
		}
	}
	for _, tl := range telluric.Near(a, b) {
		s.Air = append(s.Air, measure.AirLine{Name: tl.Name, Wave: tl.Wave, Note: string(tl.Strength)})
	}
	return s
}

// exclude lists the ranges that are never continuum, in Å: the line's own window
// and, between lo and hi km/s, lines of the air and those transitions that are
// likely to be there: of the same species, or asked for in this run. Others are
// left to the search for line-free regions.
func (l Light) exclude(t LineTask, lo, hi float64, table *atomic.Table) [][2]float64 {
	out := [][2]float64{{frame.Wavelength(t.Line.Wave, t.Window[0]), frame.Wavelength(t.Line.Wave, t.Window[1])}}
	for _, f := range measure.Neighbours(t.Line, [2]float64{lo, hi}, l.surroundings(t, lo, hi, table)) {
		likely := f.Kind == "telluric" && l.Placed
		if f.Kind == "transition" && !f.Negligible {
			line, err := table.Find(f.Name)
			likely = err == nil && line.Carrier() == t.Line.Carrier() || slices.Contains(t.Also, f.Name)
		}
		if likely {
			out = append(out, [2]float64{frame.Wavelength(f.Wave, f.Range[0]), frame.Wavelength(f.Wave, f.Range[1])})
		}
	}
	return out
}
