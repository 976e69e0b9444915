package measure

import (
	"fmt"
	"math"

	"lacuna/budget"
)

// fill says what a bad pixel gets: (1−t)·left + t·right of good pixels, −1 for
// none; both −1: the value of a fitted profile.
type fill struct {
	left, right int
	t           float64
}

// Parts of a line that may be filled in.
const (
	mostFilled = 0.10 // of W
	mostGap    = 0.20 // of the window, where no line is seen
)

// fillIn gives bad pixels inside the window a value: from p.Fill (F/C of a fitted
// profile) or by a straight line between the nearest good pixels. To drop them
// would set their absorption to 0. The error is half of the depth filled in,
// common to all pixels of a gap, besides that of the pixels it came from.
func (w *work) fillIn(cover []float64) error {
	w.fill = make([]fill, w.n)
	good := 0
	for i, c := range cover {
		if c > 0 && !w.bad[i] {
			good++
		}
	}
	if good == 0 {
		return w.wrong(fmt.Sprintf("all pixels from %.1f to %.1f km/s are masked", w.out.Window[0], w.out.Window[1]), "use another order, or unmask them")
	}
	for i, c := range cover {
		if c == 0 || !w.bad[i] {
			continue
		}
		k := fill{left: -1, right: -1}
		if w.p.Fill != nil && !math.IsNaN(w.p.Fill[i]) {
			w.f[i] = w.grow*w.p.Fill[i] - w.p.Zero.Level
			w.fill[i] = k
			continue
		}
		for k.left = i - 1; k.left >= 0 && w.bad[k.left]; k.left-- {
		}
		for k.right = i + 1; k.right < w.n && w.bad[k.right]; k.right++ {
		}
		switch {
		case k.right == w.n:
			k.right = -1
		case k.left < 0:
			k.t = 1
		default:
			k.t = (w.p.Wave[i] - w.p.Wave[k.left]) / (w.p.Wave[k.right] - w.p.Wave[k.left])
		}
		w.fill[i] = k
		w.f[i] = w.value(i, w.cont)
	}
	return nil
}

// checkFill sets FillPart and refuses a width of which too much was filled in.
func (w *work) checkFill(cover []float64) error {
	filled, gap, all := 0.0, 0.0, 0.0
	for i, c := range cover {
		all += c
		if c > 0 && w.bad[i] {
			filled += c * math.Abs(1-w.f[i])
			gap += c
		}
	}
	if gap == 0 {
		return nil
	}
	w.out.W.Flag |= budget.Filled
	seen := w.out.W.X >= detect*w.out.W.Err()
	w.out.FillPart = filled / max(math.Abs(w.out.W.X), 1e-300)
	what := fmt.Sprintf("%.0f %% of the width would be filled in for masked pixels (window %.1f to %.1f km/s)", 100*w.out.FillPart, w.out.Window[0], w.out.Window[1])
	if !seen {
		w.out.FillPart = gap / all
		what = fmt.Sprintf("%.0f %% of the window %.1f to %.1f km/s is masked", 100*w.out.FillPart, w.out.Window[0], w.out.Window[1])
	}
	if seen && w.out.FillPart > mostFilled || gap > mostGap*all {
		return w.wrong(what, "use another order, another window, or a fit of the profile, which needs no filling")
	}
	how := "between their neighbours"
	if w.p.Fill != nil {
		how = "from the fitted profile"
	}
	w.note("%.1f %% of the width comes from masked pixels filled %s", 100*filled/max(math.Abs(w.out.W.X), 1e-300), how)
	return nil
}
