package spectrum

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"lacuna/spectrum/fits"
)

// cards looks keywords up in the headers that belong to a segment: the extension
// first, then the primary.
type cards []*fits.Header

func (c cards) lookup(key string) (fits.Card, *fits.Header, bool) {
	for _, h := range c {
		if card, ok := h.Lookup(key); ok {
			return card, h, true
		}
	}
	return fits.Card{}, nil, false
}

func (c cards) has(key string) bool { _, _, ok := c.lookup(key); return ok }

// str returns text, "" where there is none.
func (c cards) str(key string) string {
	card, _, _ := c.lookup(key)
	return strings.TrimSpace(card.Value)
}

// number returns a number that matters: an error where the card is damaged.
func (c cards) number(key string, def float64) (float64, error) {
	if _, h, ok := c.lookup(key); ok {
		return h.Float(key, def)
	}
	return def, nil
}

// maybe returns a number that does not: false where it is absent or damaged.
func (c cards) maybe(key string) (float64, bool) {
	card, _, ok := c.lookup(key)
	if !ok {
		return 0, false
	}
	return fits.ParseNumber(card.Value)
}

// match returns the first key, in header order, that f takes.
func (c cards) match(f func(key string) bool) string {
	for _, h := range c {
		for _, card := range h.Cards {
			if f(card.Key) && h.Has(card.Key) {
				return card.Key
			}
		}
	}
	return ""
}

// kept are the cards that go into Spectrum.Header.
var kept = []string{"OBJECT", "TARGNAME", "OBJNAME", "ESO OBS TARG NAME", "TELESCOP", "INSTRUME", "DETECTOR", "OPT_ELEM", "DISPELEM", "CENWAVE", "CENTRWV",
	"APERTURE", "DATE-OBS", "TDATEOBS", "MJD-OBS", "MJD-END", "EXPSTART", "EXPTIME", "TEXPTIME", "RA", "DEC", "RA_TARG", "DEC_TARG", "EQUINOX", "RADESYS", "RADECSYS",
	"SPECSYS", "SSYSOBS", "VELOSYS", "HELCORR", "V_HELIO", "SPEC_RES", "SPECRES", "SPE_RPOW", "SNR", "ORIGIN", "PROG_ID", "PROPOSID", "ROOTNAME", "ARCFILE", "PRODCATG", "FLUXCAL", "CONTNORM",
	"ESO QC VRAD BARYCOR", "ESO QC VRAD HELICOR", "BUNIT"}

// describe stores what a person wants to know of a file: cards, object, direction.
func (r *reader) describe(c cards) {
	for _, key := range kept {
		if v := c.str(key); v != "" {
			if _, dup := r.s.Header[key]; !dup {
				r.s.Header[key] = v
			}
		}
	}
	if r.s.Object == "" {
		// Calibration templates put a job name into OBJECT: ESO keeps the star apart.
		for _, key := range []string{"ESO OBS TARG NAME", "TARGNAME", "OBJECT", "OBJNAME", "TARGET", "LTARGET", "STARGET"} {
			if v := c.str(key); v != "" {
				_, r.s.Object = orderInTitle(v)
				break
			}
		}
	}
	if r.s.Coord == nil {
		var note string
		if r.s.Coord, note = direction(c); note != "" {
			r.s.Notes = append(r.s.Notes, note)
		}
	}
}

// orderInTitle takes the number of an order off a title: "ORDER:  7 HD 222259A".
func orderInTitle(title string) (order int, rest string) {
	after, ok := strings.CutPrefix(title, "ORDER:")
	if !ok {
		return 0, title
	}
	number, rest, _ := strings.Cut(strings.TrimSpace(after), " ")
	n, err := strconv.Atoi(number)
	if err != nil || n < 1 {
		return 0, title
	}
	return n, strings.TrimSpace(rest)
}

// direction reads RA and Dec in degrees or as hours and degrees with colons. Some
// writers put decimal hours into RA: the telescope's own hours and minutes show it.
func direction(c cards) (*Coord, string) {
	if eq, ok := c.maybe("EQUINOX"); ok && (eq < 1999 || eq > 2001) {
		return nil, "" // not J2000: precession is not done here
	}
	for _, k := range [][2]string{{"RA_TARG", "DEC_TARG"}, {"RA", "DEC"}, {"RA-D", "DEC-D"}, {"OBJCTRA", "OBJCTDEC"}} {
		ra, ok1 := angle(c.str(k[0]), 15)
		dec, ok2 := angle(c.str(k[1]), 1)
		if !ok1 || !ok2 || ra < 0 || ra >= 360 || dec < -90 || dec > 90 {
			continue
		}
		for _, other := range []string{"TELRA", "OBJCTRA", "CATRA", "TCSRA"} {
			if text := c.str(other); strings.Count(text, ":") == 2 {
				at, ok := angle(text, 15)
				if near := func(x float64) bool { return math.Abs(math.Remainder(x-at, 360)) < 0.5 }; ok && ra < 24 && !near(ra) && near(15*ra) {
					return &Coord{15 * ra, dec}, fmt.Sprintf("%s = %g is in hours, as %s = %s shows", k[0], ra, other, text)
				}
			}
		}
		return &Coord{ra, dec}, ""
	}
	return nil, ""
}

// angle reads "312.2" or "20:48:56.3"; the second counts perUnit degrees a unit.
func angle(s string, perUnit float64) (float64, bool) {
	if x, ok := fits.ParseNumber(s); ok {
		return x, true
	}
	parts := strings.FieldsFunc(s, func(r rune) bool { return r == ':' || r == ' ' })
	if len(parts) != 3 {
		return 0, false
	}
	sum, unit := 0.0, 1.0
	for _, p := range parts {
		x, err := strconv.ParseFloat(strings.TrimLeft(p, "+-"), 64)
		if err != nil {
			return 0, false
		}
		sum += x / unit
		unit *= 60
	}
	if strings.HasPrefix(parts[0], "-") {
		sum = -sum
	}
	return sum * perUnit, true
}

// resolution reads λ/FWHM.
func resolution(c cards, o Options) float64 {
	if o.Resolution > 0 {
		return o.Resolution
	}
	for _, key := range []string{"SPEC_RES", "SPECRES", "SPE_RPOW", "RESOLUTN"} {
		if x, ok := c.maybe(key); ok && x > 1 {
			return x
		}
	}
	return 0
}
