package spectrum

import (
	"math"
	"slices"
)

const (
	gapStep  = 2.5 // steps of more than so many usual ones leave something out
	gapFill  = 30  // missing pixels that are put in as masked ones; more split the segment
	gapReach = 10  // steps on either side whose median is the usual one
	gapShare = 20  // at most one gap in so many pixels; more than that is uneven sampling
)

// keep adds a segment to the spectrum. Where its wavelengths leap over missing
// pixels, edges half-way between neighbours would be wrong by the size of the
// gap, so none is left in a segment:
//
//   - a gap between two detectors makes two segments of the same order, label and
//     row;
//   - up to 30 pixels that a table leaves out (somebody deleted them) are put in,
//     masked and without flux, so that a line there is filled and flagged like
//     any other with masked pixels.
//
// A step of twice the usual one is let be: rounded wavelengths have such steps.
func (r *reader) keep(s Segment) {
	found := s.gaps()
	if n := len(s.Wave); len(found)*gapShare > n+gapShare {
		s.note("the sampling is uneven: %d of %d steps are more than %g times the usual one near by", len(found), n-1, gapStep)
		found = nil
	}
	if len(found) == 0 {
		r.s.Segments = append(r.s.Segments, s)
		return
	}
	from, filled := 0, 0
	part := s.Cut(math.Inf(1), 0) // empty
	parts := []Segment{}
	take := func(to int) {
		for _, c := range part.columns(&s) {
			if *c.from != nil {
				*c.to = append(*c.to, (*c.from)[from:to]...)
			}
		}
		part.Mask = append(part.Mask, s.Mask[from:to]...)
		from = to
	}
	for _, g := range found {
		take(g.after + 1)
		if g.missing <= gapFill {
			part.fillGap(&s, g)
			filled += g.missing
			continue
		}
		if len(part.Wave) == 1 { // edges need a neighbour
			part.ghost(part.Wave[0] + g.step)
		}
		parts = append(parts, part)
		part = s.Cut(math.Inf(1), 0)
	}
	take(len(s.Wave))
	if len(part.Wave) == 1 {
		part.ghost(part.Wave[0] + found[len(found)-1].step)
	}
	parts = append(parts, part)
	for i := range parts {
		p := &parts[i]
		p.Notes = slices.Clone(s.Notes)
		if filled > 0 {
			p.note("%s that the file leaves out put in, masked", count(filled, "pixel"))
		}
		if len(parts) > 1 {
			p.note("part %d of %d of what the file gives as one", i+1, len(parts))
		}
		if i > 0 {
			q := &parts[i-1]
			from, to := q.Wave[len(q.Wave)-1], p.Wave[0]
			for _, x := range []*Segment{q, p} {
				x.note("nothing from %.3f to %.3f Å (%.4g Å)", from, to, to-from)
			}
		}
	}
	for i := range parts {
		if len(parts) > 1 { // a detector may end inside
			parts[i].maskFiller()
		}
	}
	r.s.Segments = append(r.s.Segments, parts...)
}

// A gap follows pixel after; missing pixels of the usual step fit in.
type gap struct {
	after, missing int
	step           float64
}

// gaps finds steps of more than gapStep usual ones.
func (s *Segment) gaps() []gap {
	n := len(s.Wave)
	var found []gap
	near := make([]float64, 0, 2*gapReach)
	last := 0.0 // the last step that was no gap
	for i := 0; i+1 < n; i++ {
		d := s.Wave[i+1] - s.Wave[i]
		if d <= gapStep*last {
			last = d
			continue
		}
		near = near[:0]
		for k := max(0, i-gapReach); k < min(n-1, i+gapReach+1); k++ {
			if k != i {
				near = append(near, s.Wave[k+1]-s.Wave[k])
			}
		}
		slices.Sort(near)
		if len(near) < 4 || d <= gapStep*near[len(near)/2] {
			last = d
			continue
		}
		usual := near[len(near)/2]
		found = append(found, gap{i, int(min(math.Round(d/usual), 1e9)) - 1, usual})
	}
	return found
}

// fillGap puts the missing pixels of a gap at the end of s, evenly spaced between
// those of the whole segment.
func (s *Segment) fillGap(whole *Segment, g gap) {
	a, b := whole.Wave[g.after], whole.Wave[g.after+1]
	for k := 1; k <= g.missing; k++ {
		s.ghost(a + (b-a)*float64(k)/float64(g.missing+1))
	}
}

// ghost appends a masked pixel.
func (s *Segment) ghost(wave float64) {
	for _, c := range s.columns(s) {
		if *c.to != nil {
			*c.to = append(*c.to, math.NaN())
		}
	}
	s.Wave[len(s.Wave)-1] = wave
	s.Mask = append(s.Mask, BadFlux)
}

// columns pairs the slices of two segments, wavelengths first.
func (s *Segment) columns(of *Segment) []struct{ to, from *[]float64 } {
	return []struct{ to, from *[]float64 }{{&s.Wave, &of.Wave}, {&s.Flux, &of.Flux}, {&s.Err, &of.Err}, {&s.ErrLow, &of.ErrLow}, {&s.Continuum, &of.Continuum}}
}
