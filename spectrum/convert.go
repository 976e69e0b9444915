package spectrum

import (
	"fmt"

	"lacuna/internal/oops"
	"lacuna/spectrum/frame"
)

// ToVacuum puts the wavelengths into vacuum by the given formula. An unknown
// medium is an error, never a guess: it moves lines by 83 km/s. Air wavelengths
// below 1999.35 Å are refused as well. A segment in vacuum stays as it is.
func (s *Segment) ToVacuum(f frame.Formula) error {
	switch s.Medium {
	case frame.Vacuum:
		return nil
	case frame.Air:
	default:
		return s.fail("it is not known whether the wavelengths are in air or vacuum", `say medium = "air" or "vacuum"`)
	}
	if len(s.Wave) > 0 && s.Wave[0] < frame.MinAir {
		return s.fail(fmt.Sprintf("the wavelengths are said to be in air (%s) but begin at %.3f Å; below %.2f Å they are in vacuum by convention", s.MediumBy, s.Wave[0], frame.MinAir),
			`say medium = "vacuum", or cut the segment`)
	}
	for i, w := range s.Wave {
		s.Wave[i] = frame.ToVacuum(w, f)
	}
	s.Medium = frame.Vacuum
	s.MediumBy = fmt.Sprintf("air by %s, converted to vacuum with %s", s.MediumBy, f)
	return nil
}

// ToFrame puts the wavelengths into another velocity frame with the corrections
// of Shift, λ_new = λ (1 + V/c), and back by division. It changes nothing where
// the segment is in that frame already, so no correction can be applied twice.
// Heliocentric and barycentric stand in for each other (16 m/s at most), which
// leaves a note. LSRK is reached from either by way of Coord. Everything else
// that is not known is an error, never a guess.
func (s *Segment) ToFrame(to frame.Kind) error {
	if s.Frame == frame.Unknown {
		return s.fail("the velocity frame of the wavelengths is not known", `say frame = "topocentric", "heliocentric" or "barycentric"`)
	}
	if s.Frame == to {
		return nil
	}
	switch {
	case to == frame.Unknown:
		return s.fail("no velocity frame is given to go to", `say frame = "heliocentric"`)
	case solar(s.Frame) && solar(to):
		s.note("%s wavelengths taken for %s: the Sun moves by 16 m/s at most", s.Frame, to)
		s.Frame = to
		return nil
	case observer(s.Frame) && s.exact(to):
		return s.apply(to)
	case to == frame.LSRK:
		return s.toLSRK()
	case s.Frame == frame.LSRK && !(observer(to) && s.find(frame.LSRK, true) >= 0):
		return s.fromLSRK(to)
	case observer(s.Frame) && solar(to):
		return s.apply(to)
	case observer(to) && s.Frame != frame.Source:
		return s.undo(to)
	}
	return s.fail(fmt.Sprintf("there is no way from frame %s to %s", s.Frame, to), "give the spectrum in one of the solar frames")
}

// Motion returns the velocity (km/s) that took the wavelengths from the
// observer's frame to the segment's own, λ = λ_observer (1 + V/c), 0 in the
// observer's frame; false where it is not known.
func (s *Segment) Motion() (float64, bool) {
	if observer(s.Frame) {
		return 0, true
	}
	if k := s.find(s.Frame, true); k >= 0 && s.Frame != frame.Source {
		return s.Shift[k].V, true
	}
	if k := s.find(frame.Barycentric, true); k >= 0 && s.Frame == frame.LSRK && s.Coord != nil {
		return frame.AddVelocity(s.Shift[k].V, frame.LSRKTerm(s.Coord.RA, s.Coord.Dec)), true
	}
	return 0, false
}

// exact reports whether a correction leads straight to a frame and is not done.
func (s *Segment) exact(to frame.Kind) bool {
	k := s.find(to, false)
	return k >= 0 && s.Shift[k].To == to
}

func solar(k frame.Kind) bool    { return k == frame.Heliocent || k == frame.Barycentric }
func observer(k frame.Kind) bool { return k == frame.Topocentric || k == frame.Geocentric }

// byUserWord is the keyword of a correction that the user gave: it comes first in
// Shift and wins.
const byUserWord = "user"

// find returns the index of a correction to that frame, done or not, or of one
// to the other solar frame; −1 if there is none.
func (s *Segment) find(to frame.Kind, done bool) int {
	other := -1
	for i, a := range s.Shift {
		if a.Done != done {
			continue
		}
		if a.To == to || a.Keyword == byUserWord && solar(a.To) && solar(to) {
			return i
		}
		if solar(a.To) && solar(to) && other < 0 {
			other = i
		}
	}
	return other
}

// apply goes from the observer to the frame of a correction.
func (s *Segment) apply(to frame.Kind) error {
	k := s.find(to, false)
	if k < 0 {
		return s.fail(fmt.Sprintf("wavelengths are %s and no correction to %s is known", s.Frame, to), "give it: correction = km/s to be added")
	}
	a := s.Shift[k]
	if a.To != to {
		s.note("the correction to %s (%s) was used for %s: they differ by 16 m/s at most", a.To, a.Keyword, to)
	}
	for i := range s.Wave {
		s.Wave[i] *= 1 + a.V/frame.C
	}
	s.settle(true)
	s.Shift[k].Done = true
	s.FrameBy = fmt.Sprintf("%s (%s), then %+.3f km/s of %s applied", s.Frame, s.FrameBy, a.V, a.Keyword)
	s.Frame = to
	return nil
}

// undo goes back to the observer.
func (s *Segment) undo(to frame.Kind) error {
	k := s.find(s.Frame, true)
	if k < 0 {
		return s.fail(fmt.Sprintf("wavelengths are %s and the correction that was applied is not known", s.Frame), "give it: correction = km/s that was added")
	}
	a := s.Shift[k]
	for i := range s.Wave {
		s.Wave[i] /= 1 + a.V/frame.C
	}
	s.settle(false)
	s.Shift[k].Done = false
	s.FrameBy = fmt.Sprintf("%s (%s), then %+.3f km/s of %s undone", s.Frame, s.FrameBy, a.V, a.Keyword)
	s.Frame = to
	return nil
}

// settle marks all corrections between observer and Sun: they are one motion,
// and after one of them none may be applied again.
func (s *Segment) settle(done bool) {
	for i := range s.Shift {
		if solar(s.Shift[i].To) {
			s.Shift[i].Done = done
		}
	}
}

func (s *Segment) toLSRK() error {
	if s.Coord == nil {
		return s.fail("LSRK needs the direction of the star", "give ra and dec")
	}
	if !solar(s.Frame) {
		if err := s.ToFrame(frame.Barycentric); err != nil {
			return err
		}
	}
	v := frame.LSRKTerm(s.Coord.RA, s.Coord.Dec)
	for i := range s.Wave {
		s.Wave[i] *= 1 + v/frame.C
	}
	s.FrameBy = fmt.Sprintf("%s (%s), then %+.3f km/s to LSRK from the coordinates", s.Frame, s.FrameBy, v)
	s.Frame = frame.LSRK
	return nil
}

func (s *Segment) fromLSRK(to frame.Kind) error {
	if s.Coord == nil {
		return s.fail("leaving LSRK needs the direction of the star", "give ra and dec")
	}
	v := frame.LSRKTerm(s.Coord.RA, s.Coord.Dec)
	for i := range s.Wave {
		s.Wave[i] /= 1 + v/frame.C
	}
	s.FrameBy = fmt.Sprintf("%s (%s), then %+.3f km/s of LSRK undone from the coordinates", s.Frame, s.FrameBy, v)
	s.Frame = frame.Barycentric
	return s.ToFrame(to)
}

func (s *Segment) note(format string, a ...any) { s.Notes = append(s.Notes, fmt.Sprintf(format, a...)) }

// fail is the user's error at this segment.
func (s *Segment) fail(what, fix string) error {
	return oops.Input(s.Source.File, s.Label, what, fix)
}
