package spectrum

import (
	"fmt"
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

func firstPart(s, sep string) string { a, _, _ := strings.Cut(s, sep); return a }

// sameText compares without case.
func sameText(a string, among ...string) bool {
	return slices.ContainsFunc(among, func(b string) bool { return strings.EqualFold(a, b) })
}
