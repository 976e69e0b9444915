package measure

import (
	"fmt"
	"math"
	"slices"

	"lacuna/atomic"
	"lacuna/budget"
)

// Surroundings is what may absorb near a line, on one sightline.
type Surroundings struct {
	Gas      [2]float64    // km/s, where interstellar gas may absorb, in the frame of the piece
	Lines    []atomic.Line // transitions
	Bands    []atomic.Band // diffuse bands
	Stellar  []atomic.StellarLine
	Air      []AirLine // telluric lines
	AirV     float64   // km/s to add to the velocity of a telluric line (at rest in the observer's frame) to reach the frame of the piece
	AirKnown bool      // false: AirV is unknown, and telluric lines may lie within ±35 km/s
	StarV    float64   // km/s, of the star in the frame of the piece
	StarHalf float64   // km/s, half-width of its lines; 0: 150
	StarSeen bool      // StarV is known; false: any velocity within ±300 km/s
	// Expect returns the equivalent width (Å) expected of a transition, from a
	// sister line that was measured; nil or false: unknown.
	Expect func(l atomic.Line) (w float64, ok bool)
}

// An AirLine is a line of the Earth's atmosphere.
type AirLine struct {
	Name string
	Wave float64 // vacuum Å, observer's frame
	Half float64 // km/s, half-width; 0: 8
	Note string
}

// Neighbours lists everything that may absorb within the window (km/s) of a line:
// transitions at the velocities of the gas, of any species and of the line's own,
// diffuse bands, lines of the air and of the star.
//
// Each gets what is known of its strength. Negligible is set where even a cosmic
// abundance without any dust gives less than 0.1 mÅ: N = 10^(ε−12) × 10^21.5
// (Asplund 2009), 1/100 of that for trace ions, 10^14 for molecules, and the
// weak-line relation. Such features are listed, but flag nothing. So is a diffuse
// band wider than four windows, which the continuum follows. (Common practice, no
// source.)
func Neighbours(target atomic.Line, window [2]float64, s Surroundings) []Feature {
	var out []Feature
	add := func(f Feature) {
		if a, b := f.about(target.Wave); a <= window[1] && b >= window[0] {
			f.Note = join(fmt.Sprintf("%+.0f km/s", velocity(f.Wave, target.Wave)), f.Note)
			out = append(out, f)
		}
	}
	for _, l := range s.Lines {
		if l.Name == target.Name || l.Species == target.Species && l.Level == target.Level && math.Abs(l.Wave-target.Wave) < 1e-3*target.Wave/1000 {
			continue
		}
		f := Feature{Kind: "transition", Name: l.Name, Wave: l.Wave, Range: s.Gas}
		if l.Species == target.Species {
			f.Note = "same species"
		}
		if s.Expect != nil {
			if w, ok := s.Expect(l); ok {
				f.W = w
				f.Note = join(f.Note, fmt.Sprintf("W = %.1f mÅ expected from another line", 1e3*w))
			}
		}
		if w := most(l); f.W == 0 && w < 1e-4 {
			f.Negligible = true
			f.Note = join(f.Note, "too weak to matter at any likely column")
		}
		add(f)
	}
	for _, b := range s.Bands {
		half := 0.0
		if b.FWHM > 0 {
			half = b.FWHM / b.Wave * atomic.C
		}
		f := Feature{Kind: "band", Name: b.Name, Wave: b.Wave, Range: [2]float64{s.Gas[0] - half, s.Gas[1] + half}}
		if half > 4*(window[1]-window[0]) {
			f.Negligible = true
			f.Note = "much wider than the window: part of the continuum"
		}
		add(f)
	}
	for _, a := range s.Air {
		half := a.Half
		if half == 0 {
			half = 8
		}
		f := Feature{Kind: "telluric", Name: a.Name, Wave: a.Wave, Range: [2]float64{-half, half}, Note: a.Note}
		if s.AirKnown {
			f.Wave = wavelength(a.Wave, s.AirV)
		} else {
			f.Range = [2]float64{-half - 35, half + 35}
			f.Note = join(f.Note, "the observer's velocity is unknown: may lie ±35 km/s from here")
		}
		add(f)
	}
	for _, l := range s.Stellar {
		half := s.StarHalf
		if half == 0 {
			half = 150
		}
		f := Feature{Kind: "stellar", Name: "stellar " + l.Name, Wave: l.Wave, Range: [2]float64{-half, half}, Note: l.Note}
		if s.StarSeen {
			f.Wave = wavelength(l.Wave, s.StarV)
		} else {
			f.Range = [2]float64{-half - 300, half + 300}
			f.Note = join(f.Note, "the star's velocity is unknown")
		}
		add(f)
	}
	slices.SortStableFunc(out, func(a, b Feature) int {
		switch {
		case a.Wave < b.Wave:
			return -1
		case a.Wave > b.Wave:
			return 1
		}
		return 0
	})
	return out
}

// about returns the velocities, in the frame of a line at rest wavelength wave,
// between which the feature may absorb.
func (f Feature) about(wave float64) (lo, hi float64) {
	return velocity(wavelength(f.Wave, f.Range[0]), wave), velocity(wavelength(f.Wave, f.Range[1]), wave)
}

func join(a, b string) string {
	if a == "" || b == "" {
		return a + b
	}
	return a + "; " + b
}

// most is the largest width (Å) that a transition could have by the weak-line
// relation, see Neighbours. An element without a solar abundance counts as
// log ε = 3.
func most(l atomic.Line) float64 {
	n := 1e14
	if el, _, ok := atomic.SplitSpecies(l.Species); ok {
		eps := 3.0
		if el == "H" || el == "D" {
			eps = 12
		} else if r, err := atomic.Solar("asplund2009", el); err == nil && !math.IsNaN(r.LogEps) {
			eps = r.LogEps
		}
		n = math.Pow(10, eps-12+21.5)
		switch atomic.Dominance(l.Species).Kind {
		case atomic.Trace, atomic.Never:
			n /= 100
		}
	}
	return n * l.F * l.Wave * l.Wave / perWidth
}

// blends keeps the neighbours that reach into the window used and sets flags. A
// transition known to be weaker than half of the error of W flags nothing.
func (w *work) blends() {
	o := &w.out
	for _, f := range w.p.Neighbours {
		a, b := f.about(w.p.Line.Wave)
		if a > o.Window[1] || b < o.Window[0] {
			continue
		}
		o.Blends = append(o.Blends, f)
		switch {
		case f.Negligible || f.W > 0 && f.W < o.W.Err()/2:
		case f.Kind == "telluric":
			o.Flag |= budget.InTelluric
		case f.Kind == "stellar":
			o.Flag |= budget.InStellar
		default:
			o.Flag |= budget.Blended
		}
	}
}
