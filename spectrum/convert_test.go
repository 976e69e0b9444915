package spectrum

import (
	"math"
	"strings"
	"testing"

	"lacuna/internal/oops"
	"lacuna/spectrum/frame"
)

func observed(kind frame.Kind, shifts ...frame.Applied) *Segment {
	return &Segment{Wave: []float64{4000, 5000}, Flux: []float64{1, 1}, Mask: make([]Reason, 2), Medium: frame.Vacuum, Frame: kind, Shift: shifts, Label: "row 1"}
}

func TestToFrameOnceAndBack(t *testing.T) {
	s := observed(frame.Topocentric, frame.Applied{Keyword: "H", To: frame.Heliocent, V: 13.888}, frame.Applied{Keyword: "B", To: frame.Barycentric, V: 13.881})
	for range 3 {
		if err := s.ToFrame(frame.Heliocent); err != nil {
			t.Fatal(err)
		}
	}
	// λ (1 + v/c), once: 4000 Å · 13.888/299792.458 = 0.185301 Å.
	if !(math.Abs(s.Wave[0]-4000.185301) < 1e-6) || s.Frame != frame.Heliocent {
		t.Errorf("%.6f Å, %s; want 4000.185301, HELIOCEN", s.Wave[0], s.Frame)
	}
	// The barycentric one is the same motion: it must not come on top.
	if err := s.ToFrame(frame.Barycentric); err != nil {
		t.Fatal(err)
	}
	if !(math.Abs(s.Wave[0]-4000.185301) < 1e-6) || len(s.Notes) == 0 || !strings.Contains(s.Notes[0], "16 m/s") {
		t.Errorf("%.6f Å, notes %q", s.Wave[0], s.Notes)
	}
	if v, ok := s.Motion(); !ok || !(math.Abs(v-13.881) < 0.01) {
		t.Errorf("motion %g, %v", v, ok)
	}
	s.Frame = frame.Heliocent
	if err := s.ToFrame(frame.Topocentric); err != nil {
		t.Fatal(err)
	}
	if !(math.Abs(s.Wave[0]-4000) < 1e-9) || s.Shift[0].Done || s.Shift[1].Done {
		t.Errorf("back: %.9f Å, %+v", s.Wave[0], s.Shift)
	}
}

func TestToFrameRefuses(t *testing.T) {
	for name, tc := range map[string]struct {
		s  *Segment
		to frame.Kind
	}{
		"unknown frame":      {observed(frame.Unknown, frame.Applied{To: frame.Heliocent, V: 1}), frame.Heliocent},
		"no correction":      {observed(frame.Topocentric), frame.Heliocent},
		"only one done":      {observed(frame.Topocentric, frame.Applied{To: frame.Heliocent, V: 1, Done: true}), frame.Heliocent},
		"star":               {observed(frame.Source), frame.Heliocent},
		"LSRK unknown place": {observed(frame.Heliocent), frame.LSRK},
		"back unknown":       {observed(frame.Heliocent), frame.Topocentric},
		"LSRD":               {observed(frame.Heliocent), frame.LSRD},
		"nowhere":            {observed(frame.Heliocent), frame.Unknown},
	} {
		if err := tc.s.ToFrame(tc.to); !oops.IsInput(err) || tc.s.Wave[0] != 4000 {
			t.Errorf("%s: %v, %g Å", name, err, tc.s.Wave[0])
		}
	}
}

// frames.md §3: LSRK term +16.307 km/s towards RA 312.2345, Dec +44.1234.
func TestLSRK(t *testing.T) {
	s := observed(frame.Barycentric)
	s.Coord = &Coord{312.2345, 44.1234}
	if err := s.ToFrame(frame.LSRK); err != nil {
		t.Fatal(err)
	}
	if v := frame.Velocity(s.Wave[0], 4000); !(math.Abs(v-16.307) < 0.0006) {
		t.Errorf("LSRK term %.4f km/s, want 16.307", v)
	}
	if err := s.ToFrame(frame.Heliocent); err != nil || !(math.Abs(s.Wave[0]-4000) < 1e-9) || s.Frame != frame.Heliocent {
		t.Errorf("back: %v, %.9f Å, %s", err, s.Wave[0], s.Frame)
	}
}

func TestUserCorrectionWins(t *testing.T) {
	s := observed(frame.Topocentric, frame.Applied{Keyword: byUserWord, To: frame.Heliocent, V: 5}, frame.Applied{Keyword: "B", To: frame.Barycentric, V: 13})
	if err := s.ToFrame(frame.Barycentric); err != nil {
		t.Fatal(err)
	}
	if v := frame.Velocity(s.Wave[0], 4000); !(math.Abs(v-5) < 1e-6) {
		t.Errorf("%.4f km/s applied, want the user's 5", v)
	}
}

func TestToVacuum(t *testing.T) {
	s := observed(frame.Heliocent)
	s.Medium = frame.Air
	s.Wave = []float64{3933.661293, 5889.950603} // frames.md §1, Ciddor: 3934.7750 and 5891.5830 in vacuum
	for range 2 {
		if err := s.ToVacuum(frame.Ciddor1996); err != nil {
			t.Fatal(err)
		}
	}
	if !(math.Abs(s.Wave[0]-3934.775) < 1e-6) || !(math.Abs(s.Wave[1]-5891.583) < 1e-6) || !strings.Contains(s.MediumBy, "Ciddor 1996") {
		t.Errorf("%v, %s", s.Wave, s.MediumBy)
	}
	s.Medium = frame.UnknownMedium
	if err := s.ToVacuum(frame.Ciddor1996); !oops.IsInput(err) {
		t.Errorf("unknown medium: %v", err)
	}
	s.Medium, s.Wave = frame.Air, []float64{1216, 3000}
	if err := s.ToVacuum(frame.Ciddor1996); !oops.IsInput(err) || s.Wave[0] != 1216 {
		t.Errorf("air below 2000 Å: %v", err)
	}
}

// A correction that the user gives straight to LSRK is applied as it is, and only once.
func TestCorrectionStraightToLSRK(t *testing.T) {
	s := observed(frame.Topocentric, frame.Applied{Keyword: byUserWord, To: frame.LSRK, V: 30}, frame.Applied{Keyword: "B", To: frame.Barycentric, V: 13})
	for range 2 {
		if err := s.ToFrame(frame.LSRK); err != nil {
			t.Fatal(err)
		}
	}
	if v := frame.Velocity(s.Wave[0], 4000); !(math.Abs(v-30) < 1e-6) || s.Frame != frame.LSRK {
		t.Errorf("%.4f km/s, %s; want 30, LSRK", v, s.Frame)
	}
	if v, ok := s.Motion(); !ok || v != 30 {
		t.Errorf("motion %g, %v", v, ok)
	}
	if err := s.ToFrame(frame.Topocentric); err != nil || !(math.Abs(s.Wave[0]-4000) < 1e-9) {
		t.Errorf("back: %v, %.9f Å", err, s.Wave[0])
	}
}

// The motion in LSRK is that of the observer and the Sun together, as a product.
func TestMotionInLSRK(t *testing.T) {
	s := observed(frame.Topocentric, frame.Applied{Keyword: "B", To: frame.Barycentric, V: 13})
	s.Coord = &Coord{312.2345, 44.1234}
	if err := s.ToFrame(frame.LSRK); err != nil {
		t.Fatal(err)
	}
	v, ok := s.Motion()
	if want := frame.Velocity(s.Wave[0], 4000); !ok || !(math.Abs(v-want) < 1e-9) || !(math.Abs(want-29.307) < 0.01) {
		t.Errorf("motion %.6f, %v; the wavelengths moved by %.6f", v, ok, want)
	}
}
