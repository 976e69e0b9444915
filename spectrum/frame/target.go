package frame

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"lacuna/internal/oops"
)

// A Target is a direction on the sky.
type Target struct {
	RA, Dec     float64 // degrees, ICRS
	PMRA, PMDec float64 // proper motion, mas a year, PMRA with the factor cos Dec
	Epoch       float64 // of RA and Dec, Julian year; 0 stands for 2000.0
}

// direction returns the unit vector at a Julian year: the position moved on along
// the tangent. Parallax (0.77″ at most, 0.11 m/s) and the perspective change of the
// motion are neglected.
func (s Target) direction(year float64) vec {
	sa, ca := math.Sincos(s.RA * degree)
	sd, cd := math.Sincos(s.Dec * degree)
	epoch := s.Epoch
	if epoch == 0 {
		epoch = 2000
	}
	a := s.PMRA * 1e-3 * arcsec * (year - epoch)
	d := s.PMDec * 1e-3 * arcsec * (year - epoch)
	v := vec{cd*ca - a*sa - d*sd*ca, cd*sa + a*ca - d*sd*sa, sd + d*cd}
	r := math.Sqrt(v.dot(v))
	return vec{v[0] / r, v[1] / r, v[2] / r}
}

// degrees returns right ascension (0 to 360) and declination of a vector.
func (a vec) degrees() (ra, dec float64) {
	ra = math.Atan2(a[1], a[0]) / degree
	if ra < 0 {
		ra += 360
	}
	return ra, math.Atan2(a[2], math.Hypot(a[0], a[1])) / degree
}

// FromEquinox returns the direction in ICRS of a right ascension and declination
// (degrees) that refer to the mean equator and equinox of a year, 1950.0 for
// instance, by the precession of IAU 2006.
//
// Coordinates of the system FK4 (before 1984) carry up to 1″ that this leaves out:
// 0.15 m/s in a velocity. Apparent coordinates of date, as telescopes use, differ
// from mean ones by up to 40″, 6 m/s.
func FromEquinox(ra, dec, year float64) (float64, float64) {
	v := Target{RA: ra, Dec: dec}.direction(2000)
	return precession((year - 2000) / 100).transposed().of(v).degrees()
}

func (s Target) check() error {
	for _, x := range []struct {
		name        string
		v, low, top float64
	}{
		{"right ascension", s.RA, 0, 360}, {"declination", s.Dec, -90, 90}, {"proper motion in right ascension", s.PMRA, -2e4, 2e4},
		{"proper motion in declination", s.PMDec, -2e4, 2e4}, {"epoch", s.Epoch, 0, 2200},
	} {
		if !(x.v >= x.low && x.v <= x.top) {
			return oops.Input("", "target", fmt.Sprintf("%s %g is outside %g to %g", x.name, x.v, x.low, x.top),
				"angles are degrees, proper motions mas a year, the epoch a year")
		}
	}
	return nil
}

// ParseTarget reads "RA Dec" (ICRS): two decimal numbers are degrees
// ("83.8221 -5.3911"), sexagesimal ones hours and degrees ("05:35:17.3 -05:23:28",
// "5 35 17.3 -5 23 28", "05h35m17.3s -05d23m28s").
func ParseTarget(s string) (Target, error) {
	bad := func(what string) (Target, error) {
		return Target{}, oops.Input("", "target", fmt.Sprintf("%q: %s", s, what),
			`write "83.8221 -5.3911" (degrees) or "05:35:17.3 -05:23:28" (hours and degrees)`)
	}
	words := strings.FieldsFunc(s, func(r rune) bool { return r == ' ' || r == ',' || r == '\t' })
	if len(words) == 6 {
		words = []string{strings.Join(words[:3], ":"), strings.Join(words[3:], ":")}
	}
	if len(words) != 2 {
		return bad("not a right ascension and a declination")
	}
	ra, err1 := ParseAngle(words[0], true)
	dec, err2 := ParseAngle(words[1], false)
	if err1 != nil || err2 != nil {
		return bad("not two angles")
	}
	t := Target{RA: ra, Dec: dec}
	if err := t.check(); err != nil {
		return bad(fmt.Sprintf("right ascension %g° or declination %g° is out of range", ra, dec))
	}
	return t, nil
}

// ParseAngle returns degrees. A plain number is degrees; three parts with colons,
// spaces or letters ("05:35:17.3", "05h35m17.3s", "-5 23 28") are hours, minutes
// and seconds where hours is set, else degrees, minutes and seconds.
func ParseAngle(s string, hours bool) (float64, error) {
	s = strings.TrimSpace(s)
	if x, err := strconv.ParseFloat(s, 64); err == nil {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return 0, strconv.ErrRange
		}
		return x, nil
	}
	unit := 1.0
	if hours && !strings.ContainsAny(s, "dD°") || strings.ContainsAny(s, "hH") {
		unit = 15
	}
	minus := strings.HasPrefix(s, "-") || strings.HasPrefix(s, "−")
	parts := strings.FieldsFunc(strings.TrimLeft(s, "+-−"), func(r rune) bool { return strings.ContainsRune(": hHdD°mM'′sS\"″", r) })
	if len(parts) < 2 || len(parts) > 3 {
		return 0, fmt.Errorf("%q is not an angle", s)
	}
	sum, scale := 0.0, 1.0
	for i, p := range parts {
		x, err := strconv.ParseFloat(p, 64)
		if err != nil || !(x >= 0) || math.IsInf(x, 0) || i > 0 && x >= 60.0001 || i < len(parts)-1 && x != math.Trunc(x) {
			return 0, fmt.Errorf("%q is not an angle", s)
		}
		sum += x / scale
		scale *= 60
	}
	if minus {
		sum = -sum
	}
	return sum * unit, nil
}
