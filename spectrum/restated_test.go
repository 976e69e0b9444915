package spectrum_test

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"math"
	"strconv"
	"strings"

	"lacuna/spectrum"
)

// says reads the wavelength scale out of the bytes of a damaged sample once more,
// in the simplest way and with nothing of the package: CRVAL1 + CDELT1 (p − CRPIX1)
// and its kin. It reports whether the spectrum is what those bytes say. A digit
// that changed in a header makes another file, as good as the first; nothing in it
// can tell, and the reader has to take it at its word.
func says(name string, b []byte, got *spectrum.Spectrum) bool {
	heads := headers(b)
	if len(heads) == 0 {
		return false
	}
	h := heads[0]
	if strings.HasPrefix(name, "16") || strings.HasPrefix(name, "14") {
		h = heads[1]
	}
	c := plainCards(b[h[0]:h[1]])
	var scale func(k, i int, g *spectrum.Segment) float64 // of pixel i from 0 of segment k
	linear := func(unit float64) func(k, i int, g *spectrum.Segment) float64 {
		step := c.number("CDELT1", math.NaN())
		if x := c.number("CD1_1", math.NaN()); !math.IsNaN(x) {
			step = x
		}
		return func(k, i int, g *spectrum.Segment) float64 {
			return unit * (c.number("CRVAL1", math.NaN()) + step*(float64(i+1)-c.number("CRPIX1", 1)))
		}
	}
	switch name[:2] {
	case "01":
		scale = linear(10)
	case "02", "07", "09", "16":
		scale = linear(1)
	case "03":
		log := linear(1)
		scale = func(k, i int, g *spectrum.Segment) float64 { return math.Pow(10, log(k, i, g)) }
	case "04":
		v := c.number("CRVAL1", math.NaN())
		scale = func(k, i int, g *spectrum.Segment) float64 {
			return 1e10 * v * math.Exp(c.number("CDELT1", math.NaN())*(float64(i+1)-c.number("CRPIX1", 1))/v)
		}
	case "05":
		words := strings.Fields(strings.ReplaceAll(c.wat(), `"`, " "))
		scale = func(k, i int, g *spectrum.Segment) float64 {
			for j := range words {
				if words[j] == fmt.Sprintf("spec%d", g.Source.Row) && j+8 < len(words) {
					var v [9]float64 // = ap beam dtype w1 dw nw z
					for n := range v {
						v[n], _ = strconv.ParseFloat(words[min(j+1+n, len(words)-1)], 64)
					}
					w := v[4] + v[5]*float64(i)
					if v[3] == 1 {
						w = math.Pow(10, w)
					}
					return w / (1 + v[7])
				}
			}
			return math.NaN()
		}
	case "10":
		scale = func(k, i int, g *spectrum.Segment) float64 {
			sum := 0.0
			for n := 3; n >= 0; n-- {
				sum = sum*float64(i) + c.number(fmt.Sprintf("ESO DRS CAL TH COEFF LL%d", 4*(g.Source.Row-1)+n), math.NaN())
			}
			return sum
		}
	case "14": // columns ORDER B, NPOINTS I, WAVELENGTH D, STARTPIX I, DELTAW D
		at := (h[1] + 2879) / 2880 * 2880
		scale = func(k, i int, g *spectrum.Segment) float64 {
			row := b[at+16961*(g.Source.Row-1):]
			return math.Float64frombits(binary.BigEndian.Uint64(row[3:])) + math.Float64frombits(binary.BigEndian.Uint64(row[13:]))*float64(i)
		}
	default:
		scale = func(k, i int, g *spectrum.Segment) float64 { return g.Wave[i] } // only the corrections are looked at
	}
	for k := range got.Segments {
		g := &got.Segments[k]
		up := scale(k, 0, g) < scale(k, len(g.Wave)-1, g)
		for i, w := range g.Wave {
			if !up {
				i = len(g.Wave) - 1 - i
			}
			if !(math.Abs(scale(k, i, g)-w) < 1e-5) {
				return false
			}
		}
		for _, a := range g.Shift {
			key, sign := a.Keyword, 1.0
			if strings.HasPrefix(key, "V_HELIO") {
				key, sign = "V_HELIO", -1
			}
			if v := c.number(key, math.NaN()); !strings.HasPrefix(key, "DOPCOR") && !strings.HasPrefix(key, "z of") && !(math.Abs(sign*v-a.V) < 1e-9) {
				return false
			}
		}
	}
	return true
}

// words are the cards of a header by key, the first of each.
type words map[string]string

func plainCards(head []byte) words {
	w := words{}
	for ; len(head) >= 80; head = head[80:] {
		card := string(bytes.TrimRight(head[:80], " "))
		key, value, ok := strings.Cut(strings.TrimPrefix(card, "HIERARCH "), "=")
		key = strings.TrimSpace(key)
		if _, dup := w[key]; ok && !dup {
			w[key] = value
		}
	}
	return w
}

func (w words) number(key string, def float64) float64 {
	v, ok := w[key]
	if !ok {
		return def
	}
	v, _, _ = strings.Cut(v, "/")
	x, err := strconv.ParseFloat(strings.TrimSpace(strings.NewReplacer("D", "E", "d", "e").Replace(v)), 64)
	if err != nil {
		return math.NaN()
	}
	return x
}

// wat joins WAT2 as 68 characters a card.
func (w words) wat() string {
	out := ""
	for n := 1; ; n++ {
		v, ok := w[fmt.Sprintf("WAT2_%03d", n)]
		if !ok {
			return out
		}
		v = strings.TrimPrefix(strings.TrimSpace(v), "'")
		v, _, _ = strings.Cut(v, "'")
		out += fmt.Sprintf("%-68s", v)
	}
}
