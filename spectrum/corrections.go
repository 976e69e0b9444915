package spectrum

import (
	"fmt"
	"math"
	"strings"

	"lacuna/spectrum/frame"
)

// dopcor reads the record of Doppler tasks, DOPCOR01 …: a velocity in km/s or a
// redshift that was taken out of the wavelengths, λ_new = λ/(1+z). Where they add
// up to more than the Earth can move, the frame is that of the source. The factor
// of a multispec line (z) is the same record once more.
func dopcor(s *Segment, c cards, own float64) (frame.Kind, string) {
	z, found := 1.0, 0
	for n := 1; n < 100; n++ {
		words := strings.Fields(c.str(fmt.Sprintf("DOPCOR%02d", n)))
		if len(words) == 0 {
			break
		}
		x, ok := parseFloat(words[0])
		if !ok {
			continue
		}
		if math.Abs(x) >= 1 { // km/s; a redshift of 1 is no star
			x /= frame.C
		}
		z *= 1 + x
		found++
	}
	switch {
	case found == 0 && own == 0:
		return frame.Unknown, ""
	case found == 0:
		return doppler(s, c, frame.C*(1/(1+own)-1), "z of WAT2", "Doppler factor of the dispersion")
	case own != 0 && math.Abs(z-(1+own)) > 1e-7:
		s.note("DOPCOR says 1+z = %.9f, the dispersion in WAT2 %.9f: the latter was divided out", z, 1+own)
		z = 1 + own
	}
	return doppler(s, c, frame.C*(1/z-1), "DOPCOR01", "record of a Doppler task")
}

// solarKeys are corrections to be added to a velocity at the telescope.
var solarKeys = []struct {
	name string
	to   frame.Kind
}{

	{"ESO QC VRAD HELICOR", frame.Heliocent}, {"ESO QC VRAD BARYCOR", frame.Barycentric}, {"ESO QC BERV", frame.Barycentric},
	{"VHELIO", frame.Heliocent}, {"HELVEL", frame.Heliocent}, {"BARYCORR", frame.Barycentric}, {"BERV", frame.Barycentric}, {"BVC", frame.Barycentric},
	{"BARYVEL", frame.Barycentric},
}

// corrections records every velocity correction that is printed with the
// spectrum, whether it is in the wavelengths, and by whose word.
func (r *reader) corrections(s *Segment, c cards, k clue) {
	add := func(keyword string, to frame.Kind, v float64) {
		a := frame.Applied{Keyword: keyword, To: to, V: v}
		switch {
		case observer(s.Frame):
			a.By = "wavelengths are " + string(s.Frame) + " (" + s.FrameBy + ")"
		case s.Frame == frame.Unknown:
			a.By = "the file does not say whether it is applied"
		default:
			a.Done, a.By = true, "wavelengths are "+string(s.Frame)+" ("+s.FrameBy+")"
		}
		s.Shift = append(s.Shift, a)
	}
	if r.o.Correction != nil {
		to := r.o.CorrectionTo
		if to == frame.Unknown {
			to = frame.Heliocent
		}
		add(byUserWord, to, *r.o.Correction)
		if !observer(s.Frame) {
			s.note("the user's correction of %+.3f km/s is not applied: wavelengths are %s (%s)", *r.o.Correction, s.Frame, s.FrameBy)
		}
	}
	for _, key := range solarKeys {
		if v, ok := r.kms(s, c, key.name); ok {
			add(key.name, key.to, v)
		}
	}
	if p := drs(c); p != "" {
		if v, ok := r.kms(s, c, p+" BERV"); ok {
			add(p+" BERV", frame.Barycentric, v)
		}
	}
	// HST signs V_HELIO as a velocity away: its pipeline multiplies by 1 − V_HELIO/c.
	if strings.HasPrefix(strings.ToUpper(c.str("TELESCOP")), "HST") {
		if v, ok := c.maybe("V_HELIO"); ok {
			add("V_HELIO (sign turned)", frame.Heliocent, -v)
		}
	} else if v, ok := c.maybe("HELIO_RV"); ok {
		add("HELIO_RV", frame.Heliocent, v)
	}
	if v, ok := k.meta["correction"]; ok {
		if x, ok := parseFloat(v); ok {
			to := frame.Heliocent
			if kind, err := frame.ParseKind(k.meta["correction_to"]); err == nil {
				to = kind
			}
			add("correction in the header", to, x)
		}
	}
	s.doubtful()
}

const (
	earthSpeed = 31.0 // km/s: the Earth's orbit (30.3 at most) and its rotation (0.5)
	sunSpeed   = 0.03 // km/s: twice what the Sun moves about the barycentre, for rounding
)

// doubtful says where a correction cannot be right: it is more than the Earth
// moves, or two of the same motion differ by more than the Sun moves.
func (s *Segment) doubtful() {
	first := -1
	for i, a := range s.Shift {
		if !solar(a.To) || a.Keyword == byUserWord {
			continue
		}
		if math.Abs(a.V) > earthSpeed {
			s.note("%s = %+.3f km/s is more than the Earth moves: the number is wrong", a.Keyword, a.V)
		}
		if first < 0 {
			first = i
		} else if b := s.Shift[first]; math.Abs(a.V-b.V) > sunSpeed {
			s.note("%s = %+.3f and %s = %+.3f km/s differ by more than the Sun moves: one of them is wrong", b.Keyword, b.V, a.Keyword, a.V)
		}
	}
}

// kms reads a velocity; numbers beyond 100 are taken for m/s with a note, for
// the Earth moves by no more than 30.8 km/s.
func (r *reader) kms(s *Segment, c cards, key string) (float64, bool) {
	v, ok := c.maybe(key)
	if !ok {
		return 0, false
	}
	if math.Abs(v) > 100 {
		if math.Abs(v) > 1e5 {
			s.note("%s = %g is no velocity and was left out", key, v)
			return 0, false
		}
		s.note("%s = %g was taken for m/s", key, v)
		v /= 1000
	}
	return v, true
}

// doppler records a velocity that was taken out of the wavelengths, and finds
// the frame that it leads to: that of a correction of the same size in the
// header, or the source's where it is more than the Earth can move.
func doppler(s *Segment, c cards, v float64, keyword, by string) (frame.Kind, string) {
	kind, why := frame.Unknown, keyword+" says that a velocity was taken out, not to which frame"
	if math.Abs(v) > 35 {
		kind, why = frame.Source, fmt.Sprintf("%s: %+.1f km/s applied, more than the Earth moves", keyword, v)
	}
	for _, key := range solarKeys {
		if w, ok := c.maybe(key.name); ok && math.Abs(w-v) < 0.05 {
			kind, why = key.to, fmt.Sprintf("%s applied the %+.3f km/s of %s", keyword, v, key.name)
		}
	}
	s.Shift = append(s.Shift, frame.Applied{Keyword: keyword, V: v, Done: true, By: by, To: kind})
	s.note("%s; the wavelengths were shifted by %+.3f km/s", why, v)
	return kind, why
}
