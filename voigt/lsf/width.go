package lsf

import (
	"math"

	"lacuna/internal/oops"
)

// Scaled returns p with all its widths multiplied by s, about the place of the
// line. For trying how much a result depends on the width of the instrument.
func Scaled(p Profile, s float64) Profile { return scaled{p, s} }

type scaled struct {
	Profile
	s float64
}

func (p scaled) Below(wave, x float64) float64 { return p.Profile.Below(wave, x/p.s) }
func (p scaled) Reach(wave float64) float64    { return p.s * p.Profile.Reach(wave) }
func (p scaled) Sigma(wave float64) float64    { return p.s * p.Profile.Sigma(wave) }

func (p scaled) Check(lo, hi float64) error {
	if !(p.s > 0) || math.IsInf(p.s, 1) {
		return oops.Inputf("", "line spread function", "give a factor above 0", "its width is scaled by %g", p.s)
	}
	return p.Profile.Check(lo, hi)
}

// With returns the Response of the same pixels (their edges as given to New) on
// the same sub-grid to another profile, of the same or a smaller reach. The
// sub-grid is shared.
func (r Response) With(edges []float64, p Profile) (Response, error) {
	if len(edges) != len(r.First)+1 || len(r.Sub) < 2 {
		panic("lsf: the edges do not fit the response")
	}
	if err := p.Check(edges[0], edges[len(edges)-1]); err != nil {
		return Response{}, err
	}
	out := Response{Sub: r.Sub, step: r.step, First: make([]int, len(r.First)), Weight: make([][]float64, len(r.First))}
	return out, out.weigh(edges, p)
}

// On is New on a sub-grid of the caller's: sub (Å, ascending) with step (Å) what each
// point stands for, Σ step f(sub) ≈ ∫ f dλ. Where the transmission varies fast in a few
// places only, an uneven sub-grid needs far fewer points; a sum over it converges as
// fast as an even one if sub is a smooth function of the index, and step its
// derivative. It must reach beyond both ends by the profile's reach, in steps of at most
// half the profile's σ.
func On(edges []float64, p Profile, sub, step []float64) (Response, error) {
	if len(sub) != len(step) {
		panic("lsf: On: sub and step differ in length")
	}
	if err := checkGrid(edges, 1, 4); err != nil {
		return Response{}, err
	}
	lo, hi := edges[0], edges[len(edges)-1]
	if err := p.Check(lo, hi); err != nil {
		return Response{}, err
	}
	for j, w := range sub {
		if !(w > 0) || !(step[j] > 0) || j > 0 && !(w > sub[j-1]) {
			return Response{}, oops.Inputf("", place(edges), "give ascending wavelengths and positive steps", "point %d of the sub-grid is %g Å, step %g Å", j, w, step[j])
		}
	}
	if n := len(sub); n < 2 || sub[0] > lo-p.Reach(lo) || sub[n-1] < hi+p.Reach(hi) {
		return Response{}, oops.Input("", place(edges), "the sub-grid ends before the line spread function does", "extend it")
	}
	r := Response{Sub: sub, step: step, First: make([]int, len(edges)-1), Weight: make([][]float64, len(edges)-1)}
	return r, r.weigh(edges, p)
}
