package spectrum

import (
	"fmt"
	"math"
	"slices"
)

const (
	shortest = 10.0  // Å: below it a scale was misread, as a logarithm for a wavelength
	usualLow = 500.0 // Å: optical and ultraviolet spectra of stars lie between
	usualTop = 3e5   // Å
	kink     = 0.1   // of a step: a wavelength that lies so far off is out of line
)

// finish completes a segment: the rules that hold for every file, a look at its
// wavelengths, and gaps.
func (r *reader) finish(s Segment, px pixels) error {
	if err := s.fill(px); err != nil {
		return err
	}
	lo, hi := s.Wave[0], s.Wave[len(s.Wave)-1]
	if hi < shortest {
		return s.fail(fmt.Sprintf("wavelengths from %.4g to %.4g Å are no light of a star: the scale is misread", lo, hi),
			`is the axis logarithmic, or in another unit? Say layout = "log10", or unit`)
	}
	if lo < usualLow || hi > usualTop {
		s.note("wavelengths from %.5g to %.5g Å: neither ultraviolet nor optical; check the unit", lo, hi)
	}
	if off := s.outOfLine(); len(off) > 0 {
		s.note("%s out of line with the wavelengths beside %s (%s): the file may be damaged there", count(len(off), "wavelength"), map[bool]string{true: "it", false: "them"}[len(off) == 1], spans(off))
	}
	r.keep(s)
	return nil
}

// outOfLine finds single wavelengths that are displaced: the step before is
// longer and the step after shorter by the same amount, or the other way round,
// while the steps beyond are alike. At the ends only one step can tell. Rounding
// of the wavelengths, which moves all of them a little, is not counted.
func (s *Segment) outOfLine() []int {
	w := s.Wave
	n := len(w)
	if n < 8 {
		return nil
	}
	var second []float64 // of about a thousand places
	for i := 1; i+1 < n; i += 1 + n/1000 {
		second = append(second, math.Abs(w[i+1]-2*w[i]+w[i-1]))
	}
	slices.Sort(second)
	noise := 4 * second[9*len(second)/10]
	var off []int
	for i := 1; i+1 < n; i++ {
		a, b := w[i]-w[i-1], w[i+1]-w[i]
		d := math.Abs(a-b) / 2
		if d < noise || d < kink*min(a, b)/2 {
			continue
		}
		var near []float64 // steps beyond those two
		for _, k := range []int{i - 3, i - 2, i + 1, i + 2, i + 3, i - 4} {
			if k >= 0 && k+1 < n && len(near) < 4 {
				near = append(near, w[k+1]-w[k])
			}
		}
		slices.Sort(near)
		usual := near[len(near)/2]
		if d > kink*usual && math.Abs(a+b-2*usual) < 0.2*d && near[len(near)-1]-near[0] < d {
			off = append(off, i)
		}
	}
	for _, end := range [][4]int{{0, 1, 2, 3}, {n - 1, n - 2, n - 3, n - 4}} {
		a, b, c := math.Abs(w[end[1]]-w[end[0]]), math.Abs(w[end[2]]-w[end[1]]), math.Abs(w[end[3]]-w[end[2]])
		if d := math.Abs(a - b); d > noise && d > kink*b && math.Abs(b-c) < 0.2*d && a < gapStep*b {
			off = append(off, end[0])
		}
	}
	return off
}
