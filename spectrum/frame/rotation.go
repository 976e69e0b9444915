package frame

import "math"

// A matrix turns one set of axes into another: rows times vector.
type matrix [3][3]float64

func (m matrix) of(v vec) (out vec) {
	for i := range out {
		out[i] = m[i][0]*v[0] + m[i][1]*v[1] + m[i][2]*v[2]
	}
	return out
}

func (m matrix) times(n matrix) (out matrix) {
	for i := range out {
		for j := range out {
			out[i][j] = m[i][0]*n[0][j] + m[i][1]*n[1][j] + m[i][2]*n[2][j]
		}
	}
	return out
}

func (m matrix) transposed() (out matrix) {
	for i := range out {
		for j := range out {
			out[i][j] = m[j][i]
		}
	}
	return out
}

// turn returns the rotation of the axes by angle a (rad) about axis k (0, 1, 2).
func turn(k int, a float64) matrix {
	s, c := math.Sincos(a)
	i, j := (k+1)%3, (k+2)%3
	var m matrix
	m[k][k], m[i][i], m[j][j], m[i][j], m[j][i] = 1, c, c, s, -s
	return m
}

// precession turns the mean equator and equinox of J2000 into those t Julian
// centuries (TT) later.
//
// Source: Capitaine, Wallace & Chapront 2003, A&A 412, 567, eq. 40 (IAU 2006;
// from memory, and checked against ERFA by a test). The 0.02″ between these axes
// of J2000 and the ICRS is neglected: 0.05 mm/s.
func precession(t float64) matrix {
	zeta := (2.650545 + t*(2306.083227+t*(0.2988499+t*0.01801828))) * arcsec
	z := (-2.650545 + t*(2306.077181+t*(1.0927348+t*0.01826837))) * arcsec
	theta := t * (2004.191903 + t*(-0.4294934-t*0.04182264)) * arcsec
	return turn(2, -z).times(turn(1, theta)).times(turn(2, -zeta))
}

// nutation returns the matrix from the mean to the true equator and equinox, and
// the equation of the equinoxes (rad): the five largest terms, good to 0.1″ or
// 0.2 mm/s of velocity.
//
// Source: IAU 2000A as in IERS Conventions 2010, ch. 5 (from memory, and checked
// against ERFA by a test).
func nutation(t float64) (matrix, float64) {
	node := (450160.398 - 6962890.543*t) * arcsec   // Ω, of the Moon's orbit
	sun := (1287104.793 + 129596581.048*t) * arcsec // l′, the Sun's anomaly
	f := (335779.526 + 1739527262.848*t) * arcsec   // F, the Moon from its node
	d := (1072260.704 + 1602961601.209*t) * arcsec  // D, the Moon from the Sun
	solar, lunar := 2*(f-d+node), 2*(f+node)
	psi := (-17.20642*math.Sin(node) - 1.31709*math.Sin(solar) - 0.22764*math.Sin(lunar) +
		0.20746*math.Sin(2*node) + 0.14759*math.Sin(sun)) * arcsec
	eps := (9.20523*math.Cos(node) + 0.57303*math.Cos(solar) + 0.09785*math.Cos(lunar) -
		0.08975*math.Cos(2*node) + 0.00739*math.Cos(sun)) * arcsec
	mean := (84381.406 - 46.836769*t) * arcsec
	return turn(0, -mean-eps).times(turn(2, -psi)).times(turn(0, mean)), psi * math.Cos(mean)
}

// Rates of the Earth's rotation angle: turns a day, and rad/s.
const (
	turnsPerDay = 1.00273781191135448
	spin        = 2 * math.Pi * turnsPerDay / 86400
)

// rotation returns the matrix from axes fixed in the Earth (x to Greenwich, z to
// the pole) to equatorial axes, for ut days of UT1 and t Julian centuries of TT
// from J2000. Polar motion, 0.3″ or 0.7 mm/s, is neglected.
//
// Source: Earth rotation angle and sidereal time of IAU 2006 as in IERS
// Conventions 2010, ch. 5 (from memory, and checked against ERFA by a test).
func rotation(ut, t float64) matrix {
	nut, equinoxes := nutation(t)
	era := 2 * math.Pi * (0.7790572732640 + math.Mod(ut, 1) + (turnsPerDay-1)*ut)
	sidereal := era + (0.014506+t*(4612.156534+t*1.3915817))*arcsec + equinoxes
	return turn(2, sidereal).times(nut).times(precession(t)).transposed()
}
