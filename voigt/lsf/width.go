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
	step := math.Log(r.Sub[len(r.Sub)-1]/r.Sub[0]) / float64(len(r.Sub)-1)
	out := Response{Sub: r.Sub, First: make([]int, len(r.First)), Weight: make([][]float64, len(r.First))}
	return out, out.weigh(edges, p, step)
}
