package report

import (
	"fmt"
	"io"
	"math"
	"slices"
	"sort"
	"strings"

	"lacuna/atomic"
	"lacuna/spectrum"
	"lacuna/spectrum/continuum"
	"lacuna/spectrum/frame"
)

// An Audit is what was measured on one segment of a spectrum.
type Audit struct {
	Noise     continuum.Noise
	Stretches []continuum.Audited
	Why       string   // why there is no audit
	Lines     []string // lines of the table that fall into the segment
}

// InspectText writes what is in a spectrum file: layout, orders, range, sampling,
// medium, frame and how they are known, the audit of its noise, and the lines
// that fall in. audits has one entry a segment, or none at all.
func InspectText(w io.Writer, file string, s *spectrum.Spectrum, audits []Audit, o Options) error {
	p := newPage(o)
	p.heading(file)
	g := &grid{indent: 2, align: "lf"}
	say := func(name, text string) {
		if text != "" {
			g.add(plainCell(name), plainCell(text))
		}
	}
	say("layout", s.Layout+", "+count(len(s.Segments), "segment"))
	say("object", s.Object)
	for _, k := range []struct {
		name string
		of   func(spectrum.Segment) string
	}{
		{"medium", func(x spectrum.Segment) string { return by(string(x.Medium), x.MediumBy) }},
		{"frame", func(x spectrum.Segment) string { return by(frameWord(x.Frame), x.FrameBy) }},
		{"corrections", shiftsText},
		{"resolution", func(x spectrum.Segment) string {
			if x.Resolution > 0 {
				return "R = " + number(math.Round(x.Resolution), 0)
			}
			return "not in the file"
		}},
		{"flux", func(x spectrum.Segment) string {
			t := x.Unit
			if t == "" {
				t = "no unit given"
			}
			if x.Normalised {
				t += ", normalised"
			}
			if x.Err == nil {
				t += ", no errors"
			}
			if x.Continuum != nil {
				t += ", with a continuum"
			}
			return t
		}},
	} {
		say(k.name, perSegment(s.Segments, k.of))
	}
	shared := sharedNotes(s.Segments)
	say("notes", strings.Join(shared, "; "))
	p.grid(g)
	for _, n := range s.Notes {
		p.para("  ! ", n, warn)
	}
	p.blank()
	p.segments(s, audits, shared)
	return p.writeTo(w)
}

// perSegment is what all segments share, or the different answers with the
// number of segments that give each.
func perSegment(segs []spectrum.Segment, of func(spectrum.Segment) string) string {
	times := map[string]int{}
	var order []string
	for _, x := range segs {
		t := of(x)
		if times[t] == 0 {
			order = append(order, t)
		}
		times[t]++
	}
	if len(order) == 1 {
		return order[0]
	}
	for i, t := range order {
		if t == "" {
			t = "none"
		}
		order[i] = fmt.Sprintf("%s: %s", count(times[order[i]], "segment"), t)
	}
	return strings.Join(order, "; ")
}

func shiftsText(x spectrum.Segment) string {
	var parts []string
	for _, a := range x.Shift {
		state := "to be applied"
		if a.Done {
			state = "already in the wavelengths"
		}
		parts = append(parts, fmt.Sprintf("%s km/s to %s, %s (%s)", minus(fmt.Sprintf("%+.3f", a.V)), frameWord(a.To), state, a.Keyword))
	}
	return strings.Join(parts, "; ")
}

// frameWord is a velocity frame in a word, "" where it is not known.
func frameWord(k frame.Kind) string {
	switch k {
	case frame.Heliocent:
		return "heliocentric"
	case frame.Barycentric:
		return "barycentric"
	case frame.Topocentric:
		return "topocentric"
	case frame.Geocentric:
		return "geocentric"
	case frame.Source:
		return "of the source"
	case frame.Unknown:
		return ""
	}
	return string(k)
}

// sharedNotes are the notes that every one of several segments has.
func sharedNotes(segs []spectrum.Segment) []string {
	var out []string
	if len(segs) < 2 {
		return nil
	}
	for _, n := range segs[0].Notes {
		all := true
		for _, x := range segs[1:] {
			all = all && slices.Contains(x.Notes, n)
		}
		if all {
			out = append(out, n)
		}
	}
	return out
}

// segments is a row for each segment; shared are notes that were told already.
func (p *page) segments(s *spectrum.Spectrum, audits []Audit, shared []string) {
	g := &grid{indent: 2, align: "llrrrrrrf", head: []string{"segment", "range (Å)", "pixels", "km/s", "bad", "S/N", "rms/σ", "ρ₁", "remarks"}}
	for i, x := range s.Segments {
		a := value(audits, i)
		name := x.Label
		if name == "" {
			name = fmt.Sprintf("order %d", x.Order)
		}
		rng, step := "no pixels", ""
		if n := len(x.Wave); n > 0 {
			rng = fmt.Sprintf("%.2f … %.2f", x.Wave[0], x.Wave[n-1])
			if n > 1 {
				step = number(atomic.C*math.Log(x.Wave[n-1]/x.Wave[0])/float64(n-1), 2)
			}
		}
		bad := 0
		for _, m := range x.Mask {
			if m.Bad() {
				bad++
			}
		}
		sn, ratio, rho := "", "", ""
		if len(a.Stretches) > 0 {
			sn = snRange(a.Stretches)
			ratio = number(a.Noise.Ratio, 2)
			if a.Noise.FromData {
				ratio = "–"
			}
			if len(a.Noise.Rho) > 0 {
				rho = number(a.Noise.Rho[0], 2)
			}
		}
		var note []string
		for _, n := range x.Notes {
			if !slices.Contains(shared, n) {
				note = append(note, n)
			}
		}
		t := normal
		if a.Why != "" {
			note, t = append(note, a.Why), warn
		}
		if len(a.Lines) > 0 {
			note = append(note, strings.Join(a.Lines, ", "))
		}
		g.add(plainCell(name), plainCell(rng), plainCell(fmt.Sprint(len(x.Wave))), plainCell(step), plainCell(fmt.Sprint(bad)),
			plainCell(sn), plainCell(ratio), plainCell(rho), cell{strings.Join(note, "; "), t})
	}
	p.grid(g)
	if len(audits) > 0 {
		p.para("  ", "S/N per pixel as measured (10, 50 and 90 % of stretches of 200 pixels); rms/σ: scatter of line-free pixels over their tabulated error; ρ₁: correlation of neighbours.", faint)
	}
}

// snRange is the tenth, fiftieth and ninetieth percentile of the measured S/N.
func snRange(a []continuum.Audited) string {
	sn := make([]float64, 0, len(a))
	for _, x := range a {
		if finite(x.SN) {
			sn = append(sn, x.SN)
		}
	}
	if len(sn) == 0 {
		return ""
	}
	sort.Float64s(sn)
	at := func(q float64) string { return number(sn[int(q*float64(len(sn)-1)+0.5)], 0) }
	if len(sn) < 3 {
		return at(0.5)
	}
	return at(0.1) + "/" + at(0.5) + "/" + at(0.9)
}
