package frame

import "math"

// A vec is a vector in equatorial axes (ICRS), or in those that its comment names.
type vec [3]float64

func (a vec) dot(b vec) float64 { return a[0]*b[0] + a[1]*b[1] + a[2]*b[2] }
func (a vec) add(b vec) vec     { return vec{a[0] + b[0], a[1] + b[1], a[2] + b[2]} }

// sum adds up a series at t days (TDB) from J2000: real and imaginary part.
func sum(terms []term, t float64) (re, im float64) {
	c := t / 36525
	for _, k := range terms {
		s, co := math.Sincos(k.w * t)
		scale := 1.0
		for range k.p {
			scale *= c
		}
		re += scale * (k.re*co - k.im*s)
		im += scale * (k.re*s + k.im*co)
	}
	return re, im
}

// earth returns the velocity of the Earth's centre relative to the Sun's centre
// and to the barycentre of the solar system, km/s, t days (TDB) from J2000.
//
// It is a least-squares representation of the values of ERFA's epv00, which
// follows the ephemeris DE405 within a few mm/s; the length of the difference is
// at most 0.031 m/s from 1950 to 2061. Not for dates outside these.
func earth(t float64) (helio, bary vec) {
	var sun vec
	helio[0], helio[1] = sum(earthPlane[:], t)
	helio[2], _ = sum(earthPole[:], t)
	sun[0], sun[1] = sum(sunPlane[:], t)
	sun[2], _ = sum(sunPole[:], t)
	helio, sun = equatorial(helio), equatorial(sun)
	return helio, helio.add(sun)
}

// equatorial turns a vector from the ecliptic to the equator of J2000, with
// obliquity 84381.406″ (IAU 2006), the one the series were fitted with.
func equatorial(v vec) vec {
	s, c := math.Sincos(84381.406 * arcsec)
	return vec{v[0], c*v[1] - s*v[2], s*v[1] + c*v[2]}
}

const (
	degree = math.Pi / 180
	arcsec = degree / 3600
)
