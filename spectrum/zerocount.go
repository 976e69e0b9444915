package spectrum

import "slices"

// zeroReach is how many pixels on each side lend their error to a pixel of zero
// counts, and show how bright the spectrum is there.
const zeroReach = 50

// zeroCounts finds pixels of error exactly 0 that count no photon in a dark
// core, where errors are the root of the counts, and gives them the smallest
// positive error near by: that of about one count. A run of such pixels must lie
// between two pixels that are dark themselves, at most half of what is usual
// near by or within 5σ of nothing; the gap between two detectors does not.
func (s *Segment) zeroCounts() int {
	n, kept := len(s.Err), 0
	usable := func(i int) bool { return s.Err[i] > 0 && finite(s.Err[i]) && s.Mask[i] == 0 }
	for a := 0; a < n; a++ {
		if s.Err[a] != 0 || s.Mask[a] != 0 {
			continue
		}
		b := a // the run is a ≤ i < b; masked pixels do not end it
		for b < n && !usable(b) {
			b++
		}
		left := a - 1
		for left >= 0 && !usable(left) {
			left--
		}
		if left < 0 || b == n {
			a = b
			continue
		}
		var level, errs []float64
		for i := max(0, left-zeroReach+1); i < min(n, b+zeroReach); i++ {
			if usable(i) {
				level, errs = append(level, s.Flux[i]), append(errs, s.Err[i])
			}
		}
		slices.Sort(level)
		half := 0.5 * level[len(level)/2]
		dark := func(i int) bool { return s.Flux[i] <= half || s.Flux[i] <= 5*s.Err[i] }
		if dark(left) && dark(b) {
			floor := slices.Min(errs)
			for i := a; i < b; i++ {
				if s.Err[i] == 0 && s.Mask[i] == 0 && (s.Flux[i] <= half || s.Flux[i] <= 5*floor) {
					s.Err[i] = floor
					s.Mask[i] |= ZeroCount
					kept++
				}
			}
		}
		a = b
	}
	return kept
}
