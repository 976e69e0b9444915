package frame

import (
	"errors"
	"fmt"
	"math"
	"strconv"
)

// eastward are the longitudes whose keyword has one sign convention: ESO's, the
// FITS standard's and that of the BeSS database count east.
var eastward = map[string]bool{"ESO TEL GEOLON": true, "OBSGEO-L": true, "GEO_LONG": true}

// readSite fills the site: from coordinates of the header, checked against the
// table of observatories where the sign of the longitude is open, else by name.
func (e *Exposure) readSite(get func(string) string) error {
	named, nameKey := Site{}, ""
	var orbit error
	for _, k := range nameKeys {
		if get(k) == "" {
			continue
		}
		s, err := FindSite(get(k))
		if err == nil {
			named, nameKey = s, k
			break
		}
		for _, o := range orbiting {
			if letters(o) == letters(get(k)) {
				orbit = fmt.Errorf("%s is in orbit", get(k))
			}
		}
	}
	if orbit != nil {
		return orbit
	}
	for _, k := range placeKeys {
		lon, err1 := ParseAngle(get(k[0]), false)
		lat, err2 := ParseAngle(get(k[1]), false)
		if err1 != nil || err2 != nil {
			continue
		}
		height, err := strconv.ParseFloat(get(k[2]), 64)
		if err != nil {
			if height = named.Height; nameKey == "" {
				e.note("height of the site unknown, taken as sea level: an error below 0.2 m/s")
			}
		}
		s := Site{Name: k[0] + ", " + k[1], Lon: lon, Lat: lat, Height: height, Source: "header", Status: "header"}
		if nameKey != "" {
			s.Name = named.Name
		}
		if s.check() != nil || lon == 0 && lat == 0 {
			continue
		}
		west := s
		west.Lon = -lon
		if !eastward[k[0]] && math.Abs(lon) > 0.05 {
			switch near, mirrored := s.known(named, nameKey), west.known(named, nameKey); {
			case near && !mirrored:
			case mirrored && !near:
				s = west
				e.note("%s counts west: the other sign leads to no known observatory", k[0])
			default:
				if nameKey != "" {
					e.note("%s and %s are not where %s %q stands; the table's place is taken", k[0], k[1], nameKey, get(nameKey))
					e.Site, e.SiteBy = named, nameKey
					return nil
				}
				return fmt.Errorf("longitude %s %g may count east or west, and no known observatory says which", k[0], lon)
			}
		}
		e.Site, e.SiteBy = s, k[0]+", "+k[1]
		return nil
	}
	if nameKey != "" {
		e.Site, e.SiteBy = named, nameKey
		return nil
	}
	return errors.New("no site")
}

// known reports whether the site lies within 0.3° of the named one, or of any of
// the table where none is named.
func (s Site) known(named Site, nameKey string) bool {
	if nameKey != "" {
		return s.distance(named) < 0.3
	}
	for _, o := range siteTable() {
		if s.distance(o) < 0.3 {
			return true
		}
	}
	return false
}
