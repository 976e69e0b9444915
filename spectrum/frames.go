package spectrum

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/spectrum/frame"
)

// An instrument is what is known of a family of files beyond their keywords.
type instrument struct {
	name   string
	medium frame.Medium
	frame  frame.Kind // "" where the family leaves it to keywords
}

// family recognises the instrument rules.
func family(c cards, layout string) instrument {
	tel, origin := strings.ToUpper(c.str("TELESCOP")), strings.ToUpper(c.str("ORIGIN"))
	switch {
	case strings.HasPrefix(tel, "HST"):
		return instrument{"HST", frame.Vacuum, ""}
	case strings.HasPrefix(tel, "FUSE"):
		return instrument{"FUSE", frame.Vacuum, frame.Heliocent}
	case strings.HasPrefix(tel, "IUE"), layout == layoutMXHI, layout == layoutMXLO:
		return instrument{"IUE", frame.Vacuum, frame.Heliocent}
	case strings.HasPrefix(tel, "SDSS") || layout == layoutLogLam:
		return instrument{"SDSS", frame.Vacuum, frame.Heliocent}
	case layout == layoutKOA, layout == layoutOrders && strings.HasPrefix(strings.ToUpper(c.str("INSTRUME")), "HIRES"):
		return instrument{"KOA", frame.Vacuum, frame.Heliocent}
	case layout == layoutE2DS:
		return instrument{"DRS pipeline, e2ds", frame.Air, frame.Topocentric}
	case layout == layoutWaveImage:
		return instrument{"", frame.UnknownMedium, frame.Unknown}
	case drs(c) != "":
		return instrument{"DRS pipeline, s1d", frame.Air, frame.Barycentric}
	case c.has("ESO QC BERV"): // newer pipelines say the medium in the names of columns
		return instrument{"DRS pipeline, s1d", frame.UnknownMedium, frame.Barycentric}
	case c.match(func(k string) bool { return strings.HasPrefix(k, "ESO PRO ") }) != "" || origin == "ESO" && c.has("PRODCATG"):
		return instrument{"ESO pipeline", frame.Air, ""}
	case c.has("WAT0_001") || strings.Contains(origin, "IRAF") && c.has("DC-FLAG"):
		return instrument{"IRAF dispersion solution (arc lists in air)", frame.Air, ""}
	}
	return instrument{}
}

// drs returns the prefix of HIERARCH keywords of the fibre-fed DRS family, as
// "ESO DRS" or "TNG DRS".
func drs(c cards) string {
	key := c.match(func(k string) bool { return strings.HasSuffix(k, " DRS BERV") })
	return strings.TrimSuffix(key, " BERV")
}

// clue is what the layout itself says of medium and frame.
type clue struct {
	ctype, ucd, column string
	meta               map[string]string // of a text header: "medium", "frame"
	z                  float64           // Doppler factor 1+z of a multispec line, already divided out

	medium frame.Medium // of a layout whose names say it
	frame  frame.Kind
	by     string
}

// decide sets medium, frame and corrections of a segment whose wavelengths are read.
func (r *reader) decide(s *Segment, c cards, k clue, first float64) {
	in := family(c, r.s.Layout)
	s.Medium, s.MediumBy = r.medium(c, k, in, first)
	s.Frame, s.FrameBy = r.velocityFrame(s, c, k, in)
	r.corrections(s, c, k)
	s.Resolution = resolution(c, r.o)
	s.Normalised = r.o.Normalised || strings.EqualFold(c.str("CONTNORM"), "T")
	s.Coord = r.s.Coord
}

func (r *reader) medium(c cards, k clue, in instrument, first float64) (frame.Medium, string) {
	if r.o.Medium != frame.UnknownMedium {
		return r.o.Medium, "user"
	}
	switch strings.ToUpper(strings.TrimSpace(firstPart(k.ctype, "-"))) {
	case "WAVE":
		return frame.Vacuum, "CTYPE1 = " + k.ctype
	case "AWAV":
		return frame.Air, "CTYPE1 = " + k.ctype
	case "FREQ", "ENER", "WAVN":
		return frame.Vacuum, "CTYPE1 = " + k.ctype
	}
	if k.medium != frame.UnknownMedium {
		return k.medium, k.by
	}
	if m := ucdMedium(k.ucd); m != frame.UnknownMedium {
		return m, "UCD " + k.ucd
	}
	for _, key := range []string{"AIRORVAC", "WAVETYPE", "VACUUM"} {
		v := strings.ToLower(c.str(key))
		switch {
		case v == "air":
			return frame.Air, key
		case strings.HasPrefix(v, "vac"), key == "VACUUM" && v == "t":
			return frame.Vacuum, key
		case key == "VACUUM" && v == "f":
			return frame.Air, key
		}
	}
	if v, ok := k.meta["medium"]; ok {
		m, err := frame.ParseMedium(v)
		if err == nil {
			return m, "medium in the header"
		}
		r.s.Notes = append(r.s.Notes, fmt.Sprintf("medium '%s' in the header is not known", v))
	}
	switch col := strings.ToLower(k.column); {
	case strings.HasSuffix(col, "_air"), strings.Contains(col, "air_"), strings.HasPrefix(col, "awav"):
		return frame.Air, "column " + k.column
	case strings.HasSuffix(col, "_vac"), strings.Contains(col, "vac_"), strings.HasSuffix(col, "vacuum"):
		return frame.Vacuum, "column " + k.column
	}
	if in.medium != frame.UnknownMedium {
		return in.medium, "rule: " + in.name
	}
	if first < 2000 {
		return frame.Vacuum, "rule: wavelengths below 2000 Å are in vacuum"
	}
	return frame.UnknownMedium, "the file does not say"
}

// ucdMedium reads the medium from a UCD: em.wl is vacuum, em.wl;obs.atmos air. A
// word that is not known may be a damaged obs.atmos: then it says nothing.
func ucdMedium(ucd string) frame.Medium {
	m := frame.UnknownMedium
	for i, word := range strings.Split(strings.ToLower(strings.ReplaceAll(ucd, " ", "")), ";") {
		switch {
		case i == 0 && word == "em.wl":
			m = frame.Vacuum
		case i == 0:
			return frame.UnknownMedium
		case word == "obs.atmos":
			m = frame.Air
		case !strings.HasPrefix(word, "meta.") && word != "em.wl.central" && word != "src.main":
			return frame.UnknownMedium
		}
	}
	return m
}

func (r *reader) velocityFrame(s *Segment, c cards, k clue, in instrument) (frame.Kind, string) {
	if r.o.Frame != frame.Unknown {
		return r.o.Frame, "user"
	}
	for _, key := range []string{"SPECSYS", "SPECSYSA"} {
		if v := c.str(key); v != "" {
			kind, err := frame.ParseKind(v)
			if err == nil {
				return kind, key
			}
			s.note("%s = '%s' is not a frame that is known here", key, v)
		}
	}
	if v, ok := k.meta["frame"]; ok {
		kind, err := frame.ParseKind(v)
		if err == nil {
			return kind, "frame in the header"
		}
		s.note("frame '%s' in the header is not known", v)
	}
	if k.frame != frame.Unknown {
		return k.frame, k.by
	}
	if in.name == "HST" {
		switch v := strings.ToUpper(c.str("HELCORR")); v {
		case "COMPLETE":
			return frame.Heliocent, "HELCORR = COMPLETE"
		case "OMIT", "PERFORM", "SKIPPED":
			return frame.Geocentric, "HELCORR = " + v
		}
	}
	if kind, by := dopcor(s, c, k.z); by != "" {
		return kind, by
	}
	if in.frame != frame.Unknown {
		return in.frame, "rule: " + in.name
	}
	if c.has("ESO QC VRAD BARYCOR") || c.has("ESO QC VRAD HELICOR") {
		return frame.Topocentric, "rule: ESO QC VRAD is applied only where SPECSYS says so"
	}
	if v, ok := c.maybe("BSS_VHEL"); ok && v == 0 {
		return frame.Topocentric, "BSS_VHEL = 0"
	}
	if r.o.Correction != nil {
		return frame.Topocentric, "user: a correction is given"
	}
	return frame.Unknown, "the file does not say"
}

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

func firstPart(s, sep string) string { a, _, _ := strings.Cut(s, sep); return a }

// sameText compares without case.
func sameText(a string, among ...string) bool {
	return slices.ContainsFunc(among, func(b string) bool { return strings.EqualFold(a, b) })
}
