package continuum

import (
	"fmt"
	"slices"
)

// alternatives fills in m.Alt: the same data with other choices that an observer
// could have made.
func (w *work) alternatives(m *Model) {
	d := m.Degree
	sigma := m.Sigma
	add := func(what string, degree int, use []bool) {
		coef := make([]float64, degree+1)
		if w.count(use) < 5*(degree+1) || w.solve(coef, use) != nil {
			return
		}
		infl, err := w.b.influence(degree+1, w.w, use)
		if err != nil {
			return
		}
		m.Alt = append(m.Alt, coef)
		m.AltWhat = append(m.AltWhat, what)
		m.altInfl = append(m.altInfl, infl)
	}
	chi2 := func() float64 {
		c := 0.0
		for i, u := range m.Pixels {
			if u {
				v := w.r[i] * w.sig[i] / sigma[i]
				c += v * v
			}
		}
		return c / m.Noise.Tau(0)
	}
	if d > 0 {
		coef := make([]float64, d)
		if w.solve(m.Coef, m.Pixels) == nil {
			with := chi2()
			if w.solve(coef, m.Pixels) == nil {
				if worse := chi2() - with; worse > 9 {
					w.notes = append(w.notes, fmt.Sprintf("degree %d is excluded (Δχ² = %.0f) and is no alternative placement", d-1, worse))
				} else {
					add(fmt.Sprintf("degree %d", d-1), d-1, m.Pixels)
				}
			}
		}
	}
	if d < Ceiling && w.highest(m.Pixels, d+1) > d {
		add(fmt.Sprintf("degree %d", d+1), d+1, m.Pixels)
		if d+2 <= Ceiling && w.o.Degree < 0 { // a curved continuum taken for flat shows only here
			add(fmt.Sprintf("degree %d", d+2), d+2, m.Pixels)
		}
	}
	if w.solve(slices.Clone(m.Coef), m.Pixels) != nil {
		return
	}
	s := m.Noise.Ratio
	if m.Noise.FromData {
		s = sigma[0] / w.sig[0]
	}
	res := slices.Clone(w.r)
	set := func(in func(wave float64) bool, auto bool) []bool {
		copy(w.r, res)
		cand := make([]bool, len(w.wave))
		for i, l := range w.wave {
			cand[i] = w.good[i] && !w.o.barred(l) && in(l)
		}
		use := w.reject(cand, s, m.Noise, auto)
		for i := range use { // a pixel once looked at keeps its verdict
			if cand[i] && w.adm[i] {
				use[i] = m.Pixels[i]
			}
		}
		return use
	}
	var narrow, wide func(float64) bool
	var nameN, nameW string
	if w.o.Windows != nil {
		stretch := func(f float64) func(float64) bool {
			r := make([][2]float64, len(w.o.Windows))
			for i, v := range w.o.Windows {
				c, h := (v[0]+v[1])/2, (v[1]-v[0])/2
				r[i] = [2]float64{c - f*h, c + f*h}
			}
			return func(l float64) bool { return within(l, r) }
		}
		narrow, wide = stretch(0.8), stretch(1.2)
		nameN, nameW = "windows × 0.8", "windows × 1.2"
	} else {
		a, b := (w.dom[0]+w.dom[1])/2, (w.dom[0]+w.dom[1])/2
		if w.o.hasTarget() {
			a, b = max(w.o.Target[0], w.dom[0]), min(w.o.Target[1], w.dom[1])
		}
		part := func(lo, hi float64) func(float64) bool { // of each side, from the line outwards
			return func(l float64) bool {
				t := (l - b) / (w.dom[1] - b)
				if l < (a+b)/2 {
					t = (a - l) / (a - w.dom[0])
				}
				return t >= lo && t <= hi
			}
		}
		narrow, wide = part(-1, 0.8), part(0.2, 2)
		nameN, nameW = "without the outer fifth", "without the inner fifth"
	}
	for k, in := range []func(float64) bool{narrow, wide} {
		use := set(in, w.o.Windows == nil || k == 1)
		if slices.Equal(use, m.Pixels) || w.highest(use, d) < d {
			continue
		}
		add([]string{nameN, nameW}[k], d, use)
	}
}
