package frame

import (
	"fmt"
	"math"
	"time"

	"lacuna/internal/oops"
)

// Velocities are the corrections of one observation, km/s. Each is added to a
// topocentric velocity as a Doppler factor, AddVelocity(v, correction), or
// λ_new = λ (1 + correction/c); positive where the observer moves towards the
// target.
type Velocities struct {
	// Parts of the classical sum: n·v for the unit vector n to the target.
	Diurnal float64 // the telescope relative to the Earth's centre: leads to GEOCENTR
	Orbit   float64 // the Earth's centre relative to the barycentre
	Sun     float64 // the barycentre relative to the Sun: Helio − Bary, within ±0.0165

	Helio    float64 // to HELIOCEN, n·v: the definition of the headers that have one
	Bary     float64 // to BARYCENT, n·v
	BaryFull float64 // to BARYCENT, with time dilation and gravity
	LSRK     float64 // to LSRK: BaryFull and LSRKTerm
	LSRD     float64 // to LSRD: BaryFull and the motion (9, 12, 7) of Delhaye 1965

	RA, Dec  float64 // degrees, ICRS, of the target at the time
	L, B     float64 // its Galactic longitude and latitude, degrees
	Altitude float64 // degrees above the horizon, without refraction; NaN at the Earth's centre
}

// The years that Corrections takes.
const (
	FirstYear = 1950
	LastYear  = 2060
)

// Gravity and size of bodies, km and s. Source: IAU 2009 and 2015 (from memory).
const (
	gmSun      = 1.32712440041e11 // TDB-compatible
	gmEarth    = 3.986004418e5
	semiMajor  = 1.00000102 * 149597870.7 // of the Earth's orbit
	earthAxis  = 6378.137                 // WGS84
	flattening = 1 / 298.257223563        // WGS84
)

// Corrections returns the velocity corrections for a time, a site and a target.
// For an exposure take its middle, weighted by the light if the transparency
// changed: 30 s of error are 1 m/s near the meridian.
//
// BaryFull is c z_B of Wright & Eastman 2014, PASP 126, 838, eq. 28, without the
// motion of the star itself and the Shapiro delay:
//
//	1 + z_B = γ (1 + β·n) / (1 − GM☉/(c² r) − GM⊕/(c² ρ)),
//
// which exceeds the classical sum by 4.4 to 4.8 m/s.
//
// Neglected: UT1 − UTC, at most 0.9 s, as long as there are leap seconds, which
// turns the Earth by 0.031 m/s of velocity at the equator, across the meridian;
// polar motion 0.7 mm/s; parallax up to 0.11 m/s; the perspective change of proper
// motions; Jupiter and the Moon in the potential 0.5 mm/s. With the 0.031 m/s of the
// Earth's velocity the result is within 0.1 m/s of a full calculation for a
// star without parallax. An error of 1″ in the direction makes up to 0.15 m/s, of
// 1′ in longitude or latitude of the site up to 0.14 m/s.
//
// The error is the user's: a date outside FirstYear to LastYear, or a place or
// direction that is none.
func Corrections(t time.Time, site Site, target Target) (Velocities, error) {
	if y := t.UTC().Year(); y < FirstYear || y > LastYear {
		return Velocities{}, oops.Input("", "time", fmt.Sprintf("%s is outside %d to %d, where the Earth's motion is known here",
			t.UTC().Format("2006-01-02T15:04:05Z"), FirstYear, LastYear), "check the date")
	}
	if err := site.check(); err != nil {
		return Velocities{}, err
	}
	if err := target.check(); err != nil {
		return Velocities{}, err
	}
	ut := days(t)
	tt := ut + ttOffset(t)/86400
	helio, bary := earth(tt)
	place, motion, zenith := site.vectors(ut, tt/36525)
	n := target.direction(2000 + tt/365.25)

	var v Velocities
	v.Diurnal = n.dot(motion)
	v.Orbit = n.dot(bary)
	v.Sun = n.dot(helio) - v.Orbit
	v.Bary = v.Orbit + v.Diurnal
	v.Helio = v.Bary + v.Sun

	observer := bary.add(motion)
	beta2 := observer.dot(observer) / (C * C)
	// GM☉/r from the vis-viva equation: the distance is not computed elsewhere.
	potential := (helio.dot(helio) + gmSun/semiMajor) / 2
	if !site.Centre {
		potential += gmEarth / math.Sqrt(place.dot(place))
	}
	v.BaryFull = C * ((1+v.Bary/C)/math.Sqrt(1-beta2)/(1-potential/(C*C)) - 1)

	v.RA, v.Dec = n.degrees()
	v.L, v.B = Galactic(v.RA, v.Dec)
	v.LSRK = AddVelocity(v.BaryFull, LSRKTerm(v.RA, v.Dec))
	v.LSRD = v.Relative(solarMotions[1])
	v.Altitude = math.NaN()
	if !site.Centre {
		v.Altitude = math.Asin(max(-1, min(1, n.dot(zenith)))) / degree
	}
	return v, nil
}

// Relative returns the correction (km/s) from topocentric to the standard of rest
// of a solar motion.
func (v Velocities) Relative(m SolarMotion) float64 {
	return AddVelocity(v.BaryFull, m.Term(v.RA, v.Dec))
}

// To returns the correction (km/s) from topocentric to a frame; false for frames
// that need more than time, site and direction. HELIOCEN is the classical sum,
// BARYCENT and what builds on it the full one.
func (v Velocities) To(k Kind) (float64, bool) {
	switch k {
	case Topocentric:
		return 0, true
	case Geocentric:
		return v.Diurnal, true
	case Heliocent:
		return v.Helio, true
	case Barycentric:
		return v.BaryFull, true
	case LSRK:
		return v.LSRK, true
	case LSRD:
		return v.LSRD, true
	}
	return math.NaN(), false
}

// Convert takes a velocity (km/s, v = cz) of the target from one frame to another
// by Doppler factors; false where To lacks one of them.
func (v Velocities) Convert(x float64, from, to Kind) (float64, bool) {
	a, ok1 := v.To(from)
	b, ok2 := v.To(to)
	return AddVelocity(SubVelocity(x, a), b), ok1 && ok2
}
