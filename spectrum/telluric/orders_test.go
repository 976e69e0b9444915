package telluric

import (
	"fmt"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"lacuna/spectrum"
	"lacuna/spectrum/fits"
)

var apertures = regexp.MustCompile(`spec\d+\s*=\s*"([^"]*)"`)

// orders reads the two files of echelle orders in the IRAF multispec layout that
// TestMeasuredAgain needs: dispersion linear (0), or a series (2) of Chebyshev (1) or Legendre (2)
// polynomials.
func orders(path string) (*spectrum.Spectrum, error) {
	f, err := fits.Open(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	h := f.HDUs[0]
	var text strings.Builder
	for _, c := range h.Cards {
		if strings.HasPrefix(c.Key, "WAT2_") {
			_, v, _ := strings.Cut(c.Raw, "'") // blanks at the end of a card count
			v = strings.TrimSuffix(strings.TrimRight(v, " "), "'")
			fmt.Fprintf(&text, "%-68s", v)
		}
	}
	out := &spectrum.Spectrum{}
	for i, m := range apertures.FindAllStringSubmatch(text.String(), -1) {
		var p []float64
		for _, s := range strings.Fields(m[1]) {
			x, err := strconv.ParseFloat(s, 64)
			if err != nil {
				return nil, fmt.Errorf("%s: order %d: %w", path, i+1, err)
			}
			p = append(p, x)
		}
		flux, err := h.Line(int64(i))
		if err != nil {
			return nil, err
		}
		g := spectrum.Segment{Order: i + 1, Flux: flux, Wave: make([]float64, len(flux))}
		for k := range flux {
			if p[2] != 2 {
				g.Wave[k] = p[3] + p[4]*float64(k)
				continue
			}
			lo, hi := p[13], p[14]
			x := (2*float64(k+1) - hi - lo) / (hi - lo)
			sum, a, b := 0.0, 1.0, x
			for n, c := range p[15 : 15+int(p[12])] {
				sum += c * a
				if m := float64(n + 1); p[11] == 2 {
					a, b = b, ((2*m+1)*x*b-m*a)/(m+1)
				} else {
					a, b = b, 2*x*b-a
				}
			}
			g.Wave[k] = p[9] * (p[10] + sum)
		}
		if g.Wave[0] > g.Wave[1] {
			slices.Reverse(g.Wave)
			slices.Reverse(g.Flux)
		}
		out.Segments = append(out.Segments, g)
	}
	return out, nil
}
