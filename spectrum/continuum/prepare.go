package continuum

import (
	"fmt"
	"math"
	"slices"

	"lacuna/internal/oops"
	"lacuna/spectrum"
)

// work is one fit in progress. Fluxes are divided by scale.
type work struct {
	o     Options
	wave  []float64
	y     []float64
	tab   []float64 // tabulated errors where usable, else smoothed; nil: none
	sig   []float64 // errors that the weights are made of; all 1 without an error array
	w     []float64 // 1/sig²
	good  []bool    // by mask, flux finite
	adm   []bool    // candidates
	scale float64
	x     []float64
	dom   [2]float64
	b     *basis
	r     []float64 // residuals over sig, of the last fit
	notes []string
}

func prepare(wave, flux, err []float64, mask []spectrum.Reason, o Options) (*work, error) {
	if e := checkPixels(wave, flux, err, mask); e != nil {
		return nil, e
	}
	if e := o.check(wave); e != nil {
		return nil, e
	}
	n := len(wave)
	w := &work{o: o, wave: wave, y: make([]float64, n), sig: make([]float64, n), w: make([]float64, n),
		good: make([]bool, n), adm: make([]bool, n), x: make([]float64, n), r: make([]float64, n)}
	var level []float64
	for i := range wave {
		w.good[i] = (mask == nil || !mask[i].Bad()) && !math.IsNaN(flux[i]) && !math.IsInf(flux[i], 0)
		if err != nil && (math.IsNaN(err[i]) || math.IsInf(err[i], 0) || err[i] < 0) {
			w.good[i] = false
		}
		w.adm[i] = w.good[i] && !o.barred(wave[i]) && (o.Windows == nil || within(wave[i], o.Windows))
		if w.adm[i] {
			level = append(level, math.Abs(flux[i]))
		}
	}
	if len(level) < 5 {
		return nil, oops.Input("", "", fmt.Sprintf("%d usable pixels for the continuum between %.3f and %.3f Å", len(level), wave[0], wave[n-1]),
			"take other continuum windows, or exclude less")
	}
	if w.scale = median(level); !(w.scale > 0) {
		return nil, oops.Input("", "", fmt.Sprintf("the flux is zero between %.3f and %.3f Å", wave[0], wave[n-1]), "take another order, or leave the line out")
	}
	for i := range flux {
		w.y[i] = flux[i] / w.scale
		w.sig[i] = 1
	}
	if err != nil {
		sm := smooth(err, w.good)
		if math.IsNaN(sm[0]) {
			return nil, oops.Input("", "", fmt.Sprintf("no error above 0 between %.3f and %.3f Å", wave[0], wave[n-1]), "leave the error column out, or mend it")
		}
		w.tab = make([]float64, n)
		for i := range err {
			w.sig[i] = sm[i] / w.scale
			w.tab[i] = w.sig[i]
			if w.good[i] && err[i] > 0 {
				w.tab[i] = err[i] / w.scale
			} else if w.good[i] {
				w.tab[i] = min(sm[i], oneCount(err, w.good, i)) / w.scale
			}
		}
	}
	lo, hi := slices.Index(w.adm, true), n-1
	for !w.adm[hi] {
		hi--
	}
	w.dom = [2]float64{wave[lo], wave[hi]}
	m := Model{Domain: w.dom}
	for i := range wave {
		w.w[i] = 1 / (w.sig[i] * w.sig[i])
		w.x[i] = m.x(wave[i])
	}
	w.b = newBasis(w.x, Ceiling+3)
	return w, nil
}

// sides counts pixels below and above the line.
func (w *work) sides(use []bool) (below, above int) {
	c := (w.o.Target[0] + w.o.Target[1]) / 2
	for i, u := range use {
		if u && w.wave[i] < c {
			below++
		} else if u {
			above++
		}
	}
	return below, above
}

const leastSide = 5 // pixels that make a side

// highest is the highest degree that the candidates allow.
func (w *work) highest(use []bool, want int) int {
	want = min(want, Ceiling, w.count(use)/5-1)
	if w.o.hasTarget() {
		if a, b := w.sides(use); a < leastSide || b < leastSide {
			want = min(want, 0)
		}
	}
	return max(want, 0)
}
