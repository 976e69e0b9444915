package frame

import "math"

// C is the speed of light in km/s, exact.
const C = 299792.458

// Velocity returns v = c(λ/λ₀ − 1) in km/s, receding positive, of wavelength
// wave against the rest wavelength, both in Å and in the same medium. This is
// cz, the convention of interstellar work; the radial velocity of special
// relativity is smaller by v²/(2c): 0.2 m/s at 10 km/s, 17 m/s at 100 km/s.
func Velocity(wave, rest float64) float64 { return C * (wave/rest - 1) }

// Wavelength returns λ₀(1 + v/c): where a line of rest wavelength rest (Å) lies
// at velocity v (km/s). It is the inverse of Velocity.
func Wavelength(rest, v float64) float64 { return rest * (1 + v/C) }

// AddVelocity combines two velocities (km/s, v = cz) as Doppler factors
// combine, 1+z = (1+z₁)(1+z₂). A plain sum errs by v₁v₂/c: 3 m/s for 18 and
// 50 km/s.
func AddVelocity(v1, v2 float64) float64 { return v1 + v2 + v1*v2/C }

// SubVelocity undoes AddVelocity: SubVelocity(AddVelocity(a, b), b) = a.
func SubVelocity(v1, v2 float64) float64 { return (v1 - v2) / (1 + v2/C) }

// LSRKTerm returns what is added to a barycentric (or heliocentric) velocity
// for one relative to the kinematic local standard of rest, in km/s: the Sun's
// 20 km/s towards right ascension 18 h, declination +30° of B1900, projected on
// the direction ra, dec (degrees, ICRS).
//
// Source: Gordon 1975, Methods of Experimental Physics 12C, 277, after Delhaye
// 1965; the vector is the apex transformed to ICRS. Other solar motions differ
// by up to 3.6 km/s.
func LSRKTerm(ra, dec float64) float64 {
	a, d := ra*math.Pi/180, dec*math.Pi/180
	return 0.28999707*math.Cos(d)*math.Cos(a) - 17.31726479*math.Cos(d)*math.Sin(a) + 10.00141200*math.Sin(d)
}

// Galactic returns Galactic longitude and latitude (degrees, 0 ≤ l < 360) of an
// ICRS direction in degrees.
//
// Source: pole 192.85948°, +27.12825° and longitude 122.93192° of the celestial
// pole, ESA 1997, The Hipparcos Catalogue, vol. 1, sect. 1.5.3 (from memory).
func Galactic(ra, dec float64) (l, b float64) {
	const rad = math.Pi / 180
	sinP, cosP := math.Sincos(27.12825 * rad)
	sinD, cosD := math.Sincos(dec * rad)
	sinA, cosA := math.Sincos((ra - 192.85948) * rad)
	b = math.Asin(max(-1, min(1, sinD*sinP+cosD*cosP*cosA))) / rad
	l = math.Mod(122.93192-math.Atan2(cosD*sinA, sinD*cosP-cosD*sinP*cosA)/rad+720, 360)
	return l, b
}
