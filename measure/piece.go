package measure

import (
	"fmt"
	"math"

	"lacuna/atomic"
	"lacuna/internal/oops"
)

// work is one measurement in progress. Per pixel of the piece:
type work struct {
	p     Piece
	n     int
	edge  []float64   // n+1, Å: half-way between pixels
	v     []float64   // km/s of the pixel centre
	cont  []float64   // continuum
	alt   [][]float64 // its other placements
	f     []float64   // flux over continuum, zero level taken off, filled where bad
	sigma []float64   // of f, one pixel
	bad   []bool
	fill  []fill // where bad and inside the window
	grow  float64
	out   Width
}

func newWork(p Piece) (*work, error) {
	n := len(p.Wave)
	if len(p.Flux) != n || p.Mask != nil && len(p.Mask) != n || p.Fill != nil && len(p.Fill) != n || len(p.Continuum.Sigma) != n {
		panic("measure: the slices of a Piece differ in length")
	}
	w := &work{p: p, n: n}
	if n < 3 {
		return nil, w.wrong(fmt.Sprintf("the spectrum has %d pixels around the line", n), "take another order")
	}
	if !(p.Line.Wave > 0) || !(p.Line.F > 0) {
		return nil, w.wrong("the line has no wavelength or no oscillator strength", "mend its row")
	}
	if !(p.Window[1] > p.Window[0]) {
		return nil, w.wrong(fmt.Sprintf("window %g to %g km/s is empty", p.Window[0], p.Window[1]), "give the smaller velocity first")
	}
	if math.IsNaN(p.Zero.Level) || !(p.Zero.Level > -0.5 && p.Zero.Level < 1) || !(p.Zero.Err >= 0) {
		return nil, w.wrong(fmt.Sprintf("zero level %g ± %g of the continuum", p.Zero.Level, p.Zero.Err), "give fractions, such as 0.01")
	}
	w.edge = edges(p.Wave)
	w.v = make([]float64, n)
	for i, l := range p.Wave {
		w.v[i] = velocity(l, p.Line.Wave)
	}
	if lo, hi := velocity(w.edge[0], p.Line.Wave), velocity(w.edge[n], p.Line.Wave); p.Window[0] < lo || p.Window[1] > hi {
		return nil, w.wrong(fmt.Sprintf("window %g to %g km/s reaches outside the spectrum, which covers %.1f to %.1f km/s of it", p.Window[0], p.Window[1], lo, hi),
			"use another order, or narrow the window")
	}
	w.cont = make([]float64, n)
	p.Continuum.At(w.cont, p.Wave)
	for k := range p.Continuum.Alt {
		c := make([]float64, n)
		p.Continuum.AltAt(k, c, p.Wave)
		w.alt = append(w.alt, c)
	}
	w.grow = 1 + p.Zero.Level
	w.f, w.sigma, w.bad = make([]float64, n), make([]float64, n), make([]bool, n)
	for i := range w.f {
		c, s := w.cont[i], p.Continuum.Sigma[i]
		if p.Mask != nil && p.Mask[i].Bad() || math.IsNaN(p.Flux[i]) || math.IsInf(p.Flux[i], 0) || !(s >= 0) || math.IsInf(s, 0) {
			w.bad[i] = true
			continue
		}
		w.f[i] = w.grow*p.Flux[i]/c - p.Zero.Level
		w.sigma[i] = w.grow * s / c
	}
	return w, nil
}

// wrong is an error of the user's, with line and window.
func (w *work) wrong(what, fix string) error {
	return oops.Input("", "", fmt.Sprintf("%s: %s", w.p.Line.Name, what), fix)
}

// cover returns how much of each pixel (Å) lies within lo to hi km/s: pixels at
// the ends count in part.
func (w *work) cover(lo, hi float64) []float64 {
	a, b := wavelength(w.p.Line.Wave, lo), wavelength(w.p.Line.Wave, hi)
	out := make([]float64, w.n)
	for i := range out {
		if d := min(w.edge[i+1], b) - max(w.edge[i], a); d > 0 {
			out[i] = d
		}
	}
	return out
}

// pixel is the width (km/s) of the pixel in the middle of the window.
func (w *work) pixel() float64 {
	c := wavelength(w.p.Line.Wave, (w.out.Window[0]+w.out.Window[1])/2)
	i := 0
	for i+1 < w.n && w.edge[i+1] < c {
		i++
	}
	return (w.edge[i+1] - w.edge[i]) / w.p.Line.Wave * atomic.C
}

// edges puts pixel borders half-way between centres.
func edges(wave []float64) []float64 {
	n := len(wave)
	e := make([]float64, n+1)
	for i := 1; i < n; i++ {
		e[i] = (wave[i-1] + wave[i]) / 2
	}
	e[0], e[n] = wave[0]-(wave[1]-wave[0])/2, wave[n-1]+(wave[n-1]-wave[n-2])/2
	return e
}

func velocity(wave, rest float64) float64 { return atomic.C * (wave/rest - 1) }
func wavelength(rest, v float64) float64  { return rest * (1 + v/atomic.C) }
