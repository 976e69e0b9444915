package lsf

import (
	"fmt"
	"math"
	"sort"

	"gonum.org/v1/gonum/interp"

	"lacuna/atomic"
	"lacuna/internal/oops"
)

// A Unit is what the offsets of a tabulated profile are counted in; its density is
// per the same unit.
type Unit string

// The units of offsets.
const (
	Angstrom Unit = "A"
	Kms      Unit = "kms"
	Pixel    Unit = "pixel"
)

// A Table is a line spread function as numbers: Density[k][i] is the fraction of
// the light per Unit that is recorded at Offset[i] from its true place, for light
// of wavelength Wave[k] (Å). Between the offsets a cubic spline holds, between the
// wavelengths the integrals are interpolated linearly, each at the same offset.
type Table struct {
	Unit    Unit
	PixelA  float64   // Å a pixel, for Unit Pixel
	Offset  []float64 // ascending, + towards longer wavelengths
	Wave    []float64 // Å, ascending; one profile serves every wavelength
	Density [][]float64
}

// A Tabulated is a Table ready to be used as a Profile.
type Tabulated struct {
	t        Table
	profiles []spline
}

// spline is a profile with its slopes, its integral up to each knot and its peak.
type spline struct {
	y, d, sum []float64
	peak      float64
}

// What a table may deviate from: its integral from 1, its end from 0 (relative to
// the peak).
const (
	normTol = 1e-3
	endTol  = 1e-3
)

// NewTabulated checks t and makes it a Profile. It keeps the slices.
//
// Errors: fewer than five offsets, offsets or wavelengths that do not ascend,
// numbers that are not finite or clearly negative, a profile that is not
// normalised to 1 within 1e-3 (what is left is divided out), one that is cut off
// where it still has 1e-3 of its peak, one whose centre of gravity lies more than
// its σ off, and pixels without a size.
func NewTabulated(t Table) (*Tabulated, error) {
	if err := t.check(); err != nil {
		return nil, err
	}
	p := &Tabulated{t: t, profiles: make([]spline, len(t.Density))}
	for k, y := range t.Density {
		where := "line spread function"
		if len(t.Wave) > 0 {
			where += fmt.Sprintf(" at %g Å", t.Wave[k])
		}
		s, err := t.spline(y, where)
		if err != nil {
			return nil, err
		}
		p.profiles[k] = s
	}
	return p, nil
}

func (t Table) check() error {
	bad := func(fix, format string, a ...any) error {
		return oops.Inputf("", "line spread function", fix, format, a...)
	}
	switch t.Unit {
	case Angstrom, Kms:
	case Pixel:
		if !(t.PixelA > 0 && t.PixelA < 1e4) {
			return bad("give the size of a pixel in Å", "offsets in pixels, and a pixel of %g Å", t.PixelA)
		}
	default:
		return bad(`use "A", "kms" or "pixel"`, "unit of the offsets %q", t.Unit)
	}
	if len(t.Offset) < 5 {
		return bad("sample the profile at five offsets at least, better at four a FWHM", "it has %d offsets", len(t.Offset))
	}
	if i := notAscending(t.Offset); i >= 0 {
		return bad("sort the rows and leave each out but once", "offset %d, %g, does not ascend", i+1, t.Offset[i])
	}
	if len(t.Density) == 0 || len(t.Density) > 1 && len(t.Wave) != len(t.Density) || len(t.Wave) > len(t.Density) {
		return bad("give one wavelength for each profile", "%d profiles for %d wavelengths", len(t.Density), len(t.Wave))
	}
	if i := notAscending(t.Wave); i >= 0 || len(t.Wave) > 0 && !(t.Wave[0] > 0) {
		return bad("sort the columns by wavelength in Å", "the wavelengths do not ascend")
	}
	for k, y := range t.Density {
		if len(y) != len(t.Offset) {
			return bad("give a number in every row", "profile %d has %d of %d numbers", k+1, len(y), len(t.Offset))
		}
	}
	return nil
}

// notAscending returns the first index that is not above the one before or not
// finite, −1 if there is none.
func notAscending(s []float64) int {
	last := math.Inf(-1)
	for i, x := range s {
		if !(x > last) || math.IsInf(x, 0) {
			return i
		}
		last = x
	}
	return -1
}

// spline fits y and divides out what its integral is off from 1.
func (t Table) spline(y []float64, where string) (spline, error) {
	x, n := t.Offset, len(y)
	peak := 0.0
	for i, v := range y {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return spline{}, oops.Inputf("", where, "give a number", "%g at offset %g", v, x[i])
		}
		peak = max(peak, v)
	}
	for i, v := range y {
		if v < -endTol*peak || peak == 0 {
			return spline{}, oops.Inputf("", where, "a fraction of the light is not negative", "%g at offset %g, the peak is %g", v, x[i], peak)
		}
	}
	for _, i := range []int{0, n - 1} {
		if math.Abs(y[i]) > endTol*peak {
			return spline{}, oops.Inputf("", where, "give the profile further out, to where it has vanished",
				"it is cut off at offset %g, where it still has %.2g of its peak", x[i], y[i]/peak)
		}
	}
	var c interp.ClampedCubic
	if err := c.Fit(x, y); err != nil {
		return spline{}, oops.Inputf("", where, "check its numbers", "no spline through it: %v", err)
	}
	s := spline{y: make([]float64, n), d: make([]float64, n), sum: make([]float64, n)}
	mean := 0.0
	for i := range y {
		s.y[i], s.d[i] = y[i], c.PredictDerivative(x[i])
		if i > 0 {
			h := x[i] - x[i-1]
			part := h*(y[i]+y[i-1])/2 + h*h*(s.d[i-1]-s.d[i])/12
			s.sum[i] = s.sum[i-1] + part
			mean += part * (x[i] + x[i-1]) / 2
		}
	}
	total := s.sum[n-1]
	if !(math.Abs(total-1) <= normTol) {
		return spline{}, oops.Inputf("", where, "divide it by its integral over the offsets",
			"not normalised: it adds up to %.6g per %s, not 1", total, t.Unit)
	}
	if sigma := total / (peak * math.Sqrt(2*math.Pi)); !(math.Abs(mean/total) <= sigma) {
		return spline{}, oops.Inputf("", where, "count the offsets from the centre of the line, + towards longer wavelengths",
			"its centre of gravity lies at offset %.4g, more than its σ of %.4g", mean/total, sigma)
	}
	s.peak = peak / total
	for i := range y {
		s.y[i], s.d[i], s.sum[i] = s.y[i]/total, s.d[i]/total, s.sum[i]/total
	}
	return s, nil
}

// scale returns Å per unit of offset at a wavelength.
func (p *Tabulated) scale(wave float64) float64 {
	switch p.t.Unit {
	case Kms:
		return wave / atomic.C
	case Pixel:
		return p.t.PixelA
	}
	return 1
}

// bracket returns the profiles before and after a wavelength, and the weight of
// the latter.
func (p *Tabulated) bracket(wave float64) (k, next int, f float64) {
	w := p.t.Wave
	if len(w) < 2 || wave <= w[0] {
		return 0, 0, 0
	}
	k = sort.SearchFloat64s(w, wave) - 1
	if k >= len(w)-1 {
		return len(w) - 1, len(w) - 1, 0
	}
	return k, k + 1, (wave - w[k]) / (w[k+1] - w[k])
}

// Below is the integral of the splines.
func (p *Tabulated) Below(wave, x float64) float64 {
	off := p.t.Offset
	x /= p.scale(wave)
	if x <= off[0] {
		return 0
	}
	if x >= off[len(off)-1] {
		return 1
	}
	i := sort.SearchFloat64s(off, x) - 1
	h := off[i+1] - off[i]
	u := (x - off[i]) / h
	k, next, f := p.bracket(wave)
	below := p.profiles[k].below(i, h, u)
	if f > 0 {
		below += f * (p.profiles[next].below(i, h, u) - below)
	}
	return below
}

// below integrates up to the fraction u of the interval i of length h: Hermite's
// basis, integrated.
func (s *spline) below(i int, h, u float64) float64 {
	u2, u3, u4 := u*u, u*u*u, u*u*u*u
	return s.sum[i] + h*(s.y[i]*(u-u3+u4/2)+s.y[i+1]*(u3-u4/2)+
		h*(s.d[i]*(u2/2-2*u3/3+u4/4)+s.d[i+1]*(u4/4-u3/3)))
}

// Reach is the longer arm of the table.
func (p *Tabulated) Reach(wave float64) float64 {
	off := p.t.Offset
	return max(math.Abs(off[0]), math.Abs(off[len(off)-1])) * p.scale(wave)
}

// Sigma is that of the Gaussian with the same area and peak.
func (p *Tabulated) Sigma(wave float64) float64 {
	k, next, f := p.bracket(wave)
	peak := p.profiles[k].peak
	peak += f * (p.profiles[next].peak - peak)
	return p.scale(wave) / (math.Sqrt(2*math.Pi) * peak)
}

// Check wants the wavelengths from lo to hi within those of the table, where it has
// more than one: profiles are not extrapolated.
func (p *Tabulated) Check(lo, hi float64) error {
	w := p.t.Wave
	if len(w) < 2 || lo >= w[0] && hi <= w[len(w)-1] {
		return nil
	}
	return oops.Inputf("", fmt.Sprintf("%.3f–%.3f Å", lo, hi), "add a profile for wavelengths beyond, or narrow the window",
		"the line spread function is tabulated from %g to %g Å only", w[0], w[len(w)-1])
}
