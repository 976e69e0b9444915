package frame

import (
	"fmt"
	"math"
	"strings"

	"lacuna/internal/oops"
)

// A SolarMotion is the Sun's velocity relative to a local standard of rest, km/s:
// U towards the Galactic centre, V along Galactic rotation (l = 90°), W towards the
// north Galactic pole.
type SolarMotion struct {
	Key     string
	U, V, W float64
	Source  string
	Status  string // "verified" or "memory": whether the numbers were seen in the source
}

// The solar motions. They differ by up to 4 km/s in some directions, so a velocity
// relative to a local standard of rest needs the name of the one used.
var solarMotions = []SolarMotion{
	{"LSRK", 10.27059429, 15.31739996, 7.73900198, "Gordon 1975, Methods of Experimental Physics 12C, 277, after Delhaye 1965: 20 km/s to RA 18 h, Dec +30° of B1900; the radio standard", "memory"},
	{"LSRD", 9, 12, 7, "Delhaye 1965, Galactic Structure, p. 61: the dynamical standard of FITS", "memory"},
	{"dehnen1998", 10.00, 5.25, 7.17, "Dehnen & Binney 1998, MNRAS 298, 387", "memory"},
	{"schonrich2010", 11.1, 12.24, 7.25, "Schönrich, Binney & Dehnen 2010, MNRAS 403, 1829; ±0.7, 0.5, 0.4 (statistical), ±1, 2, 0.5 (systematic)", "memory"},
	{"reid2019", 10.6, 10.7, 7.7, "Reid et al. 2019, ApJ 885, 131; ±1.2, 6.0, 0.9", "memory"},
}

// SolarMotions returns the table of solar motions, LSRK first.
func SolarMotions() []SolarMotion { return append([]SolarMotion(nil), solarMotions...) }

// FindSolarMotion returns a motion of the table by its key in any case
// ("schonrich2010", "LSRD"), or reads three numbers U,V,W in km/s.
func FindSolarMotion(s string) (SolarMotion, error) {
	word := strings.ReplaceAll(plain(s), "ö", "o")
	var keys []string
	for _, m := range solarMotions {
		if strings.EqualFold(m.Key, word) {
			return m, nil
		}
		keys = append(keys, m.Key)
	}
	if x, ok := numbers(s, 3); ok {
		for _, v := range x {
			if !(math.Abs(v) <= 100) {
				return SolarMotion{}, oops.Input("", "solar motion", fmt.Sprintf("%g km/s is not a velocity of the Sun", v), "write U,V,W in km/s, each below 100")
			}
		}
		return SolarMotion{Key: "U,V,W = " + strings.TrimSpace(s), U: x[0], V: x[1], W: x[2], Source: "given by the user", Status: "user"}, nil
	}
	return SolarMotion{}, oops.Input("", "solar motion", fmt.Sprintf("%q is not one of the table", s),
		hint(word, keys, "write "+strings.Join(keys, ", ")+", or U,V,W in km/s"))
}

// Term returns what is added (as a Doppler factor, see AddVelocity) to a
// barycentric velocity for one relative to this standard of rest,
//
//	U cos l cos b + V sin l cos b + W sin b  (km/s),
//
// in the direction ra, dec (degrees, ICRS).
func (m SolarMotion) Term(ra, dec float64) float64 {
	l, b := Galactic(ra, dec)
	sl, cl := math.Sincos(l * degree)
	sb, cb := math.Sincos(b * degree)
	return m.U*cl*cb + m.V*sl*cb + m.W*sb
}
