package spectrum

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"lacuna/spectrum/fits"
)

// apertures reads what the lines of an IRAF image are: line n of axis 2 is
// aperture n (APNUMn = "aperture beam low high"; in equispec images beam 0 is not
// the object), axis 3 the bands that BANDIDn describes: the flux begins with
// "spectrum", the error with "sigma".
func (r *reader) apertures(h *fits.HDU, c cards) ([]aline, error) {
	if len(h.Axes) < 1 || len(h.Axes) > 3 {
		return nil, h.Fail(fmt.Sprintf("an image of apertures with %d axes", len(h.Axes)), "say which lines: columns = {flux = …, err = …}")
	}
	aps, bands := int64(1), int64(1)
	if len(h.Axes) > 1 {
		aps = h.Axes[1]
	}
	if len(h.Axes) == 3 {
		bands = h.Axes[2]
	}
	if aps > 10000 || bands > 100 {
		return nil, h.Fail(fmt.Sprintf("%d apertures and %d bands", aps, bands), "cut out what you need")
	}
	flux, sigma := int64(-1), int64(-1)
	var left []string
	for b := int64(1); b <= bands; b++ {
		switch id := strings.ToLower(c.str(fmt.Sprintf("BANDID%d", b))); {
		case strings.HasPrefix(id, "spectrum") && flux < 0:
			flux = b - 1
		case strings.HasPrefix(id, "sigma") && sigma < 0:
			sigma = b - 1
		case id != "":
			left = append(left, fmt.Sprintf("%d (%s)", b, firstPart(id, " -")))
		default:
			left = append(left, strconv.FormatInt(b, 10))
		}
	}
	if flux < 0 {
		flux = 0
		left = slices.DeleteFunc(left, func(s string) bool { return firstPart(s, " ") == "1" })
	}
	if bands > 1 && len(left) > 0 {
		r.s.Notes = append(r.s.Notes, "bands left out: "+strings.Join(left, ", "))
	}
	var out []aline
	for a := int64(0); a < aps; a++ {
		l := aline{flux: flux*aps + a, err: -1, aperture: a, inPlane: true, order: int(a) + 1}
		beam := ""
		if words := strings.Fields(c.str(fmt.Sprintf("APNUM%d", a+1))); len(words) > 1 {
			if k, err := strconv.Atoi(words[0]); err == nil {
				l.order = k
			}
			beam = words[1]
		}
		if sameText(c.str(fmt.Sprintf("APID%d", a+1)), "sky") || beam == "0" && !r.isMultispec(h) {
			r.s.Notes = append(r.s.Notes, fmt.Sprintf("aperture %d is sky (APNUM%d, APID%d) and was left out", l.order, a+1, a+1))
			continue
		}
		l.label = fmt.Sprintf("aperture %d", l.order)
		if sigma >= 0 {
			l.err, l.by = sigma*aps+a, fmt.Sprintf("BANDID%d", sigma+1)
		}
		out = append(out, l)
	}
	return out, nil
}
