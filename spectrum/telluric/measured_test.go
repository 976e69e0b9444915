package telluric

import (
	"math"
	"sort"
	"strings"
	"testing"

	"lacuna/atomic"
	"lacuna/internal/check"
	"lacuna/spectrum"
	"lacuna/spectrum/frame"
)

// A shift takes file wavelengths of a star to the observer's frame.
var stars = []struct {
	name, file string
	power      float64 // resolving power
	v          float64 // km/s of the air in the file
	tolerance  float64 // Å: zero point of the file against the mean
}{
	{"V779 Cen", "cen-x3/ADP.2021-08-26T17_24_42.172.fits", 42310, 0, 0.005},
	{"LMC X-4", "lmc-x4/ADP.2021-09-09T13_16_16.511.fits", 42310, 0, 0.005},
	{"HD 34452", "iq-aur/TRES.fits", 44000, 0, 0.008},
	{"Vega", "layouts/evega.0039.rs.ec.dispcor.fits", 31000, 13.0, 0.020}, // the orders differ by up to 0.5 km/s
}

// Every tabulated line whose note names a star, and the O₂ lines, are measured
// again in that star's spectrum: nine in ten must lie where the table has them,
// within three errors of fit, table and zero point, and be there at all.
func TestMeasuredAgain(t *testing.T) {
	for _, s := range stars {
		path := check.Shared(t, "realdata/"+s.file)
		sp, err := spectrum.Read(path, spectrum.Options{Medium: frame.Air, Frame: frame.Topocentric})
		if err != nil {
			t.Errorf("%s: %v", s.name, err)
			continue
		}
		tried, off, absent := 0, 0, 0
		var diff []float64
		for _, l := range Lines() {
			named := l.Molecule == "H2O" && strings.Contains(l.Note, s.name) && l.Status == atomic.Computed
			if !named && (l.Molecule != "O2" || l.Strength == Weak || blended(l, s.power)) {
				continue
			}
			at := l.WaveAir * (1 + s.v/atomic.C)
			c, depth, e, ok := centre(sp, at, at/s.power/2.3548*1.15)
			if !ok {
				continue // outside the orders, or in a gap
			}
			tried++
			d := c - at
			switch {
			case !(depth > 2*e):
				absent++
				t.Logf("%s: %s is not there", s.name, l.Name)
			case !(math.Abs(d) <= 3*math.Sqrt(l.WaveErr*l.WaveErr+s.tolerance*s.tolerance+e*e/depth/depth*math.Pow(at/s.power/2.3548, 2))):
				off++
				diff = append(diff, d)
			default:
				diff = append(diff, d)
			}
		}
		sort.Float64s(diff)
		if len(diff) < 20 {
			t.Errorf("%s: only %d lines measured", s.name, len(diff))
			continue
		}
		median := diff[len(diff)/2]
		t.Logf("%s: %d lines, %d off, %d absent, median %+.4f Å", s.name, tried, off, absent, median)
		if 10*(off+absent) > tried {
			t.Errorf("%s: of %d lines %d are off and %d absent", s.name, tried, off, absent)
		}
		if !(math.Abs(median) <= s.tolerance) {
			t.Errorf("%s: the median is off by %.4f Å", s.name, median)
		}
	}
}

// blended: another line of at least a third of its class within a resolution
// element and a half.
func blended(l Line, power float64) bool {
	for _, o := range Near(l.Wave-1.5*l.Wave/power, l.Wave+1.5*l.Wave/power) {
		if o.Name != l.Name && o.Strength.Rank() >= l.Strength.Rank()-1 {
			return true
		}
	}
	return false
}

// centre fits level, depth and centre of a Gaussian of fixed width to the pixels
// within four σ of at, by Gauss–Newton, in the segment where at lies farthest from
// the ends; e is the error of the depth from the residuals. ok is false where no
// segment holds the place with flux.
func centre(s *spectrum.Spectrum, at, sigma float64) (c, depth, e float64, ok bool) {
	var g *spectrum.Segment
	best := 8 * sigma
	for i := range s.Segments {
		if w := s.Segments[i].Wave; len(w) > 1 {
			if d := min(at-w[0], w[len(w)-1]-at); d > best {
				g, best = &s.Segments[i], d
			}
		}
	}
	if g == nil {
		return 0, 0, 0, false
	}
	c = at
	for range 12 {
		lo, hi := sort.SearchFloat64s(g.Wave, c-4*sigma), sort.SearchFloat64s(g.Wave, c+4*sigma)
		if hi-lo < 7 {
			return 0, 0, 0, false
		}
		x, rms, good := normal(g.Wave[lo:hi], g.Flux[lo:hi], c, sigma)
		if !good || !(x[0] > 0) {
			break
		}
		depth, e = x[1]/x[0], rms/x[0]/math.Sqrt(sigma*math.SqrtPi/(g.Wave[lo+1]-g.Wave[lo]))
		step := max(-0.5*sigma, min(0.5*sigma, x[2]/x[1]))
		if c += step; math.Abs(c-at) > 2*sigma {
			return c, 0, 1, true // wandered off: not there
		}
		if math.Abs(step) < 1e-4 {
			return c, depth, e, true
		}
	}
	return 0, 0, 0, false
}

// normal solves flux = x₀ − x₁ g − x₂ g u/σ, g = exp(−u²/2), by least squares.
func normal(wave, flux []float64, c, sigma float64) (x [3]float64, rms float64, ok bool) {
	var m [3][4]float64
	row := func(i int) [3]float64 {
		u := (wave[i] - c) / sigma
		g := math.Exp(-u * u / 2)
		return [3]float64{1, -g, -g * u / sigma}
	}
	for i := range wave {
		r := row(i)
		for p := range 3 {
			for q := range 3 {
				m[p][q] += r[p] * r[q]
			}
			m[p][3] += r[p] * flux[i]
		}
	}
	for p := range 3 {
		if m[p][p] == 0 || math.IsNaN(m[p][p]) {
			return x, 0, false
		}
		for q := range 3 {
			if q == p {
				continue
			}
			f := m[q][p] / m[p][p]
			for k := p; k < 4; k++ {
				m[q][k] -= f * m[p][k]
			}
		}
	}
	for p := range 3 {
		x[p] = m[p][3] / m[p][p]
	}
	for i := range wave {
		r := row(i)
		d := flux[i] - r[0]*x[0] - r[1]*x[1] - r[2]*x[2]
		rms += d * d
	}
	return x, math.Sqrt(rms / float64(len(wave)-3)), !math.IsNaN(rms)
}
