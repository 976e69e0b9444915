package spectrum

import (
	"fmt"
	"math"
	"slices"
	"strings"
)

// pixels are the columns of one segment as a file gives them, wavelengths in Å.
// All slices that are not nil have the length of wave.
type pixels struct {
	wave, flux, err, cont []float64
	errLow                []float64        // the lower of two errors
	bad                   []bool           // by the file's own quality flags
	gaps                  bool             // an error of 0 is always a gap in this family of files
	place                 func(int) string // where pixel i stands in the file; nil: "pixel i+1"
}

func (p *pixels) at(i int) string {
	if p.place != nil {
		return p.place(i)
	}
	return fmt.Sprintf("pixel %d", i+1)
}

// fill turns raw columns into the slices of a segment: order, mask and errors
// by the rules that hold for every file.
func (s *Segment) fill(p pixels) error {
	if len(p.wave) == 0 {
		return s.fail("no pixels", "choose another HDU, row or column")
	}
	if err := s.order(&p); err != nil {
		return err
	}
	s.Wave, s.Flux, s.Err, s.Continuum = p.wave, p.flux, p.err, p.cont
	if s.Continuum != nil && !slices.ContainsFunc(s.Continuum, finite) {
		s.Continuum = nil
	}
	s.maskErrors(p.gaps)
	s.lowerErrors(p.errLow)
	s.maskFiller()
	if s.Good() == 0 {
		s.note("none of the %d pixels is usable", len(s.Wave))
	}
	return nil
}

// order masks pixels without a wavelength or flux, checks that the others run one
// way, and turns a descending segment round.
func (s *Segment) order(p *pixels) error {
	n := len(p.wave)
	s.Mask = make([]Reason, n)
	var lost []int
	up, down, last := true, true, -1
	for i, w := range p.wave {
		if !finite(w) || w == 0 {
			lost = append(lost, i)
			continue
		}
		if w < 0 {
			return s.fail(fmt.Sprintf("%s: wavelength %g Å is negative", p.at(i), w), "correct the wavelengths or their unit")
		}
		if last >= 0 {
			up = up && w > p.wave[last]
			down = down && w < p.wave[last]
			if !up && !down {
				what := "not monotonic"
				if w == p.wave[last] {
					what = "the same wavelength twice, not monotonic"
				}
				return s.fail(fmt.Sprintf("%s: wavelength %.6g after %.6g Å, %s", p.at(i), w, p.wave[last], what),
					`overlapping orders must be in separate files or segments; if the table lists orders, say layout = "orders"`)
			}
		}
		last = i
	}
	if n-len(lost) < 2 {
		return s.fail(fmt.Sprintf("%d of %d pixels have a wavelength, at least 2 are needed", n-len(lost), n), "choose another column")
	}
	if len(lost) > 0 {
		bridge(p.wave, lost)
		for _, i := range lost {
			s.Mask[i] |= BadFlux
		}
		s.note("%s without a wavelength %s masked (%s)", count(len(lost), "pixel"), isAre(len(lost)), spans(lost))
	}
	for i := range n {
		if p.bad != nil && p.bad[i] {
			s.Mask[i] |= BadFile
		}
		if !finite(p.flux[i]) {
			s.Mask[i] |= BadFlux
		}
	}
	if p.wave[0] > p.wave[n-1] {
		for _, v := range [][]float64{p.wave, p.flux, p.err, p.errLow, p.cont} {
			slices.Reverse(v)
		}
		slices.Reverse(s.Mask)
		s.note("wavelengths descend in the file and were turned round")
	}
	if i := slices.IndexFunc(p.wave, func(w float64) bool { return !(w > 0) || math.IsInf(w, 1) }); i >= 0 {
		return s.fail(fmt.Sprintf("%s: wavelength %g Å is not positive", p.at(i), p.wave[i]), "correct the wavelengths")
	}
	return nil
}

// bridge puts evenly spaced wavelengths where there are none, so that the arrays
// keep their indices and ascend; such pixels are masked.
func bridge(wave []float64, lost []int) {
	ok := make([]bool, len(wave))
	for i := range ok {
		ok[i] = true
	}
	for _, i := range lost {
		ok[i] = false
	}
	first, last := slices.Index(ok, true), len(ok)-1
	for !ok[last] {
		last--
	}
	// The ends go on with the mean step, but never below half of what is there.
	step := (wave[last] - wave[first]) / float64(last-first)
	for a := first; a < last; {
		b := a + 1
		for !ok[b] {
			b++
		}
		for i := a + 1; i < b; i++ {
			wave[i] = wave[a] + (wave[b]-wave[a])*float64(i-a)/float64(b-a)
		}
		a = b
	}
	down := max(-step, -0.5*wave[first]/float64(first+1)) // towards the start of an ascending segment
	for i := first - 1; i >= 0; i-- {
		wave[i] = wave[i+1] + down
	}
	up := max(step, -0.5*wave[last]/float64(len(wave)-last)) // towards the end of a descending one
	for i := last + 1; i < len(wave); i++ {
		wave[i] = wave[i-1] + up
	}
}

// maskErrors masks pixels whose error is no error, keeps the zero counts of black
// cores, and drops an error column that says nothing.
func (s *Segment) maskErrors(gaps bool) {
	if s.Err == nil {
		return
	}
	positive, zero, nan := 0, 0, 0
	for _, e := range s.Err {
		switch {
		case e > 0 && finite(e):
			positive++
		case e == 0:
			zero++
		case math.IsNaN(e):
			nan++
		}
	}
	if zero+nan == len(s.Err) {
		what := "0 or missing"
		if nan == 0 {
			what = "0"
		} else if zero == 0 {
			what = "missing"
		}
		s.note("all %d errors are %s: treated as no error column", len(s.Err), what)
		s.Err = nil
		return
	}
	kept := 0
	if zero > 0 && positive > 0 && !gaps {
		kept = s.zeroCounts()
	}
	var bad []int
	for i, e := range s.Err {
		if !(e > 0) || !finite(e) {
			if s.Mask[i]&(BadFile|BadFlux) == 0 {
				bad = append(bad, i)
			}
			s.Mask[i] |= BadError
		}
	}
	if len(bad) > 0 {
		s.note("%s %s an error that is 0, negative or no number (%s) and %s masked", count(len(bad), "pixel"), map[bool]string{true: "has", false: "have"}[len(bad) == 1], spans(bad), isAre(len(bad)))
	}
	if kept > 0 {
		s.note("%s of error 0 in dark cores kept as zero counts, with the smallest error of %d neighbours", count(kept, "pixel"), 2*zeroReach)
	}
}

// lowerErrors keeps the lower of two errors where it is a number; where it is not
// the upper one stands in. Counts of zero have no room below them: the lower error
// of Poisson statistics is 0 there, which would be an infinite weight.
func (s *Segment) lowerErrors(v []float64) {
	if v == nil || s.Err == nil || !slices.ContainsFunc(v, finite) {
		return
	}
	stand := 0
	for i, e := range v {
		if !(e > 0) || !finite(e) {
			v[i] = s.Err[i]
			if !s.Mask[i].Bad() {
				stand++
			}
		}
	}
	s.ErrLow = v
	if stand > 0 {
		s.note("%s without a lower error: the upper one is taken", count(stand, "pixel"))
	}
}

// maskFiller masks the zeros with which pipelines fill the ends of a segment:
// at least 16 pixels of flux exactly 0 that reach the end, other bad pixels
// between them. A black core inside a segment is never touched.
func (s *Segment) maskFiller() {
	n := len(s.Flux)
	var found []int
	for _, end := range []struct{ from, step int }{{0, 1}, {n - 1, -1}} {
		var run []int
		for i := end.from; i >= 0 && i < n && (s.Flux[i] == 0 || s.Mask[i].Bad()); i += end.step {
			if !s.Mask[i].Bad() {
				run = append(run, i)
			}
		}
		if len(run) >= 16 {
			found = append(found, run...)
		}
	}
	if len(found) == 0 {
		return
	}
	slices.Sort(found)
	found = slices.Compact(found)
	for _, i := range found {
		s.Mask[i] |= BadFlux
	}
	s.note("%d pixels of flux exactly 0 fill the ends (%s) and are masked", len(found), spans(found))
}

// spans writes indices from 0 as "index 40-42, 50".
func spans(index []int) string {
	index = slices.Clone(index)
	slices.Sort(index)
	var parts []string
	for i := 0; i < len(index); {
		j := i
		for j+1 < len(index) && index[j+1] == index[j]+1 {
			j++
		}
		if len(parts) == 6 {
			parts = append(parts, "…")
			break
		}
		if i == j {
			parts = append(parts, fmt.Sprint(index[i]))
		} else {
			parts = append(parts, fmt.Sprintf("%d-%d", index[i], index[j]))
		}
		i = j + 1
	}
	return "index " + strings.Join(parts, ", ")
}

func count(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}

func isAre(n int) string {
	if n == 1 {
		return "is"
	}
	return "are"
}
