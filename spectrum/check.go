package spectrum

import (
	"fmt"
	"math"
	"slices"
)

// Check reports the first thing that a reader must never hand on: slices of
// different length, wavelengths that are not finite, positive and ascending, or
// a pixel that counts as good with a flux or error that is no number.
func (s *Segment) Check() error {
	n := len(s.Wave)
	if n == 0 {
		return fmt.Errorf("segment %s: no pixels", s.Label)
	}
	if len(s.Flux) != n || len(s.Mask) != n || s.Err != nil && len(s.Err) != n || s.ErrLow != nil && (s.Err == nil || len(s.ErrLow) != n) || s.Continuum != nil && len(s.Continuum) != n {
		return fmt.Errorf("segment %s: %d wavelengths, %d fluxes, %d errors, %d masks, %d continuum values", s.Label, n, len(s.Flux), len(s.Err), len(s.Mask), len(s.Continuum))
	}
	for i, w := range s.Wave {
		if !(w > 0) || math.IsInf(w, 1) || i > 0 && !(w > s.Wave[i-1]) {
			return fmt.Errorf("segment %s: wavelength %g at pixel %d is not ascending", s.Label, w, i+1)
		}
		if s.Mask[i].Bad() {
			continue
		}
		if !finite(s.Flux[i]) {
			return fmt.Errorf("segment %s: flux %g at pixel %d counts as good", s.Label, s.Flux[i], i+1)
		}
		if s.Err != nil && !(s.Err[i] > 0 && finite(s.Err[i])) {
			return fmt.Errorf("segment %s: error %g at pixel %d counts as good", s.Label, s.Err[i], i+1)
		}
		if s.ErrLow != nil && !(s.ErrLow[i] > 0 && finite(s.ErrLow[i])) {
			return fmt.Errorf("segment %s: lower error %g at pixel %d counts as good", s.Label, s.ErrLow[i], i+1)
		}
	}
	return nil
}

// Cut returns a copy of the pixels with lo ≤ λ ≤ hi (Å, in the segment's own
// medium and frame); it may have none.
func (s *Segment) Cut(lo, hi float64) Segment {
	i, _ := slices.BinarySearch(s.Wave, lo)
	j := len(s.Wave)
	for j > i && s.Wave[j-1] > hi {
		j--
	}
	out := *s
	out.Wave, out.Flux, out.Mask = slices.Clone(s.Wave[i:j]), slices.Clone(s.Flux[i:j]), slices.Clone(s.Mask[i:j])
	if s.Err != nil {
		out.Err = slices.Clone(s.Err[i:j])
	}
	if s.ErrLow != nil {
		out.ErrLow = slices.Clone(s.ErrLow[i:j])
	}
	if s.Continuum != nil {
		out.Continuum = slices.Clone(s.Continuum[i:j])
	}
	out.Shift, out.Notes = slices.Clone(s.Shift), slices.Clone(s.Notes)
	return out
}

// Good returns how many pixels are usable.
func (s *Segment) Good() int {
	n := 0
	for _, m := range s.Mask {
		if !m.Bad() {
			n++
		}
	}
	return n
}

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }
