package report

import (
	"fmt"
	"math"
	"strings"

	"lacuna/measure"
	"lacuna/spectrum/frame"
	"lacuna/survey"
)

// LineFigures draws every measured line of a sightline on one velocity scale:
// flux over continuum in steps, the continuum and its placement, the integration
// range, the pixels that carry the continuum, masked pixels, blends, and below
// the apparent column N_a(v). Up to 12 lines share a figure; more lines make
// more figures, …-lines, …-lines-2, …
func LineFigures(r survey.Record) []Figure {
	all := r.Result.Widths
	pages := (len(all) + 2*rowsAPage - 1) / (2 * rowsAPage)
	lo, hi := velocityRange(all)
	var out []Figure
	for k := range pages {
		ws := all[k*len(all)/pages : (k+1)*len(all)/pages]
		s := newStack(ws, all, lo, hi, r.Result.Frame)
		f := Figure{Name: figureName(r.Name, "lines"), Title: plain(r.Name), Caption: stackCaption(r, ws, s)}
		s.title = plain(r.Name)
		if pages > 1 {
			f.Title += fmt.Sprintf(" (%d of %d)", k+1, pages)
			s.title = f.Title
			if k > 0 {
				f.Name += fmt.Sprintf("-%d", k+1)
			}
		}
		s.note = resolvingPower(r.Result.Spectra)
		f.Width, f.Height = s.size()
		f.draw = s.draw
		out = append(out, f)
	}
	return out
}

// velocityRange is the range of all integration windows, and on either side as
// much again as tells how quiet the continuum is, but not beyond the data.
func velocityRange(ws []measure.Width) (lo, hi float64) {
	lo, hi = math.Inf(1), math.Inf(-1)
	first, last := math.Inf(1), math.Inf(-1)
	for _, w := range ws {
		if w.Window[1] > w.Window[0] {
			lo, hi = math.Min(lo, w.Window[0]), math.Max(hi, w.Window[1])
		}
		if n := len(w.Profile.V); n > 0 {
			first, last = math.Min(first, w.Profile.V[0]), math.Max(last, w.Profile.V[n-1])
		}
	}
	if !(hi > lo) {
		lo, hi = -50, 50
	}
	pad := math.Max(0.6*(hi-lo), 20)
	lo, hi = lo-pad, hi+pad
	if last > first && first < hi && last > lo {
		lo, hi = math.Max(lo, first), math.Min(hi, last)
	}
	if !(hi > lo) {
		lo, hi = lo-50, lo+50
	}
	return lo, hi
}

// velocityLabel names the frame in words.
func velocityLabel(k frame.Kind) string {
	switch k {
	case frame.Heliocent:
		return "Heliocentric velocity"
	case frame.Barycentric:
		return "Barycentric velocity"
	case frame.LSRK:
		return "LSR velocity (kinematic)"
	case frame.LSRD:
		return "LSR velocity (dynamical)"
	case frame.Topocentric:
		return "Topocentric velocity"
	case frame.Geocentric:
		return "Geocentric velocity"
	case frame.Source:
		return "Velocity in the source's frame"
	}
	return "Velocity (frame not known)"
}

func resolvingPower(spectra []survey.SpectrumInfo) string {
	var parts []string
	seen := map[string]bool{}
	for _, s := range spectra {
		if s.R > 0 {
			t := "R = " + group(math.Round(s.R))
			if !seen[t] {
				seen[t] = true
				parts = append(parts, t)
			}
		}
	}
	return strings.Join(parts, ", ")
}

// group prints a whole number with thin gaps between thousands.
func group(x float64) string {
	s := number(x, 0)
	for i := len(s) - 3; i > 0; i -= 3 {
		s = s[:i] + " " + s[i:]
	}
	return s
}

func stackCaption(r survey.Record, ws []measure.Width, s *stack) string {
	var b strings.Builder
	fmt.Fprintf(&b, "Interstellar lines towards %s. %s. Steps: flux over continuum; dashed line and band: continuum and its placement error; "+
		"shaded: integration range; bars at the foot: continuum pixels; grey: masked pixels; lower panels: apparent column density per unit velocity. ",
		plain(r.Name), velocityLabel(r.Result.Frame))
	if p := resolvingPower(r.Result.Spectra); p != "" {
		fmt.Fprintf(&b, "Resolving power %s. ", p)
	}
	b.WriteString("S/N per pixel:")
	for i, w := range ws {
		if i > 0 {
			b.WriteString(",")
		}
		fmt.Fprintf(&b, " %s %s", plain(w.Line), number(w.SNPixel, 0))
	}
	b.WriteString(".")
	for _, bl := range s.blocks {
		for _, m := range bl.marks {
			if m.row < 0 && !m.shared {
				if m.outside {
					fmt.Fprintf(&b, " Also reaching into %s: %s.", bl.name, strings.Trim(m.name, "← →"))
					continue
				}
				fmt.Fprintf(&b, " Tick without a name in %s at %s km/s: %s.", bl.name, number(m.v, 1), m.name)
			}
		}
	}
	return b.String()
}
