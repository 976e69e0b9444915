package lsf

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"

	"lacuna/atomic"
	"lacuna/internal/oops"
)

// A Response is an instrument in one stretch of spectrum: for pixel i
//
//	F_i = Σ_j Weight[i][j] T(Sub[First[i]+j]),
//
// the flux over continuum averaged over the pixel, of the transmission T after
// the line spread function. The rows of Weight add up to 1, and all share one
// block of memory.
type Response struct {
	Sub    []float64   // wavelengths of the sub-grid (Å), ascending; from New in even steps of log λ
	First  []int       // of each pixel: index into Sub of its first weight
	Weight [][]float64 // of each pixel

	step []float64 // Å, what each point of Sub stands for in a sum
}

// More sub-grid points than this are taken for a mistake in b or in the width.
const maxSub = 20_000_000

// Edges returns the len(wave)+1 borders of pixels whose centres are wave (Å,
// ascending): the midpoints, and at the ends half a pixel further. A stretch
// with a gap must be cut there first. NaN for fewer than two pixels.
func Edges(wave []float64) []float64 {
	n := len(wave)
	if n == 0 {
		return nil
	}
	if n == 1 {
		return []float64{math.NaN(), math.NaN()}
	}
	e := make([]float64, n+1)
	for i := 1; i < n; i++ {
		e[i] = 0.5 * (wave[i-1] + wave[i])
	}
	e[0] = wave[0] - 0.5*(wave[1]-wave[0])
	e[n] = wave[n-1] + 0.5*(wave[n-1]-wave[n-2])
	return e
}

// Gaussian returns the Response of pixels between edges (Å, one more than there
// are pixels) to a Gaussian line spread function of width fwhm(λ) in Å; see New.
func Gaussian(edges []float64, fwhm func(wave float64) float64, bmin, q float64) (Response, error) {
	return New(edges, Sum{{Weight: 1, FWHM: fwhm}}, bmin, q)
}

// New returns the Response of pixels between edges (Å, ascending, one more than
// there are pixels) to the profile p,
//
//	Weight_ij = [P_j(right_i) − P_j(left_i)] h_j / (right_i − left_i),
//
// where P_j is the profile's integral (Profile.Below) for light of the sub-grid
// wavelength λ_j: the pixel box is integrated analytically, so that the weights are
// as smooth as the profile and the plain sum over the sub-grid converges
// exponentially. Rows are scaled to add up to 1, which a profile whose width
// varies with λ violates at order 1/R².
//
// The step of the sub-grid is min(b, 2σ)/q, b the narrowest Doppler parameter
// (bmin, km/s) and σ the profile's. q = 4 keeps the flux to 1e-5 up to τ₀ = 100,
// and q = 6 to 2e-6 up to τ₀ = 10⁴ (much better for weaker lines); 0 means 4. The
// sub-grid runs past both ends by the profile's reach: a model is known there, and
// then there is no edge effect. Where the transmission is not known so far, ask
// Response.Outside.
//
// Errors: edges that do not ascend, a bmin or width that is not above 0, and what
// the profile's Check finds.
func New(edges []float64, p Profile, bmin, q float64) (Response, error) {
	if q == 0 {
		q = 4
	}
	if err := checkGrid(edges, bmin, q); err != nil {
		return Response{}, err
	}
	lo, hi := edges[0], edges[len(edges)-1]
	if err := p.Check(lo, hi); err != nil {
		return Response{}, err
	}
	// Step in ln λ.
	step := bmin / atomic.C
	for _, e := range edges {
		step = min(step, 2*p.Sigma(e)/e)
	}
	step /= q
	lo, hi = lo-p.Reach(lo), hi+p.Reach(hi)
	span := math.Log(hi/lo) / step
	if !(lo > 0) || !(span < maxSub) {
		return Response{}, oops.Inputf("", place(edges), "check the narrowest b and the width of the line spread function",
			"the sub-grid would need %.3g points", span)
	}
	n := int(span) + 2
	r := Response{
		Sub:    make([]float64, n),
		First:  make([]int, len(edges)-1),
		Weight: make([][]float64, len(edges)-1),
	}
	r.step = make([]float64, n)
	for j := range r.Sub {
		r.Sub[j] = lo * math.Exp(float64(j)*step)
		r.step[j] = r.Sub[j] * step
	}
	return r, r.weigh(edges, p)
}

func checkGrid(edges []float64, bmin, q float64) error {
	if len(edges) < 2 {
		return oops.Input("", "line spread function", "no pixel to compute", "widen the window")
	}
	for i, e := range edges {
		if !(e > 0) || math.IsInf(e, 1) {
			return oops.Inputf("", fmt.Sprintf("pixel %d", i), "wavelengths must be positive numbers", "its edge is %g Å", e)
		}
		if i > 0 && !(e > edges[i-1]) {
			return oops.Inputf("", fmt.Sprintf("pixel %d", i), "sort the wavelengths and cut the spectrum where orders join",
				"its edges %.6f and %.6f Å do not ascend", edges[i-1], e)
		}
	}
	if !(bmin > 0) {
		return oops.Inputf("", place(edges), "give the narrowest Doppler parameter in km/s, above 0", "b = %g km/s", bmin)
	}
	if !(q >= 1 && q <= 1000) {
		return oops.Inputf("", place(edges), "use 4, or 6 for lines with τ₀ above 100", "%g sub-grid steps per width", q)
	}
	return nil
}

func place(edges []float64) string {
	return fmt.Sprintf("%.3f–%.3f Å", edges[0], edges[len(edges)-1])
}

// weigh fills First and Weight. Of each edge it keeps P_j on the band of j where
// it is neither 0 nor 1; neighbours share an edge.
func (r *Response) weigh(edges []float64, p Profile) error {
	var left, right band
	left.set(r.Sub, edges[0], p)
	sizes := make([]int, len(r.First))
	var all []float64
	for i := range r.First {
		right.set(r.Sub, edges[i+1], p)
		first, last := left.first, max(left.first+len(left.p), right.first+len(right.p))
		width, sum, from := edges[i+1]-edges[i], 0.0, len(all)
		for j := first; j < last; j++ {
			w := (right.at(j) - left.at(j)) * r.step[j] / width
			sum += w
			all = append(all, w)
		}
		if !(math.Abs(sum-1) <= 1e-3) {
			return oops.Inputf("", fmt.Sprintf("pixel %d near %.3f Å", i, edges[i]),
				"check its unit, its normalisation and that its width changes slowly with wavelength",
				"the line spread function adds up to %.4f instead of 1", sum)
		}
		floats.Scale(1/sum, all[from:])
		r.First[i], sizes[i] = first, last-first
		if i == 0 { // the others are about as long
			all = slices.Grow(all, (len(all)+2)*len(r.First))
		}
		left, right = right, left
	}
	for i, n := range sizes {
		r.Weight[i], all = all[:n:n], all[n:]
	}
	return nil
}

// A band is P_j at one edge for j from first on; 1 before it, 0 behind. The little
// that the cut leaves outside is spread over the inside, so that P has no step at
// the cut, which a narrow pixel would make large.
type band struct {
	first int
	p     []float64
}

func (b *band) set(sub []float64, edge float64, p Profile) {
	reach := p.Reach(edge)
	b.first = atLeast(sub, edge-reach)
	n := atLeast(sub[b.first:], math.Nextafter(edge+reach, math.Inf(1)))
	b.p = slices.Grow(b.p[:0], n)[:n]
	least := p.Below(edge, -reach)
	scale := 1 / (p.Below(edge, reach) - least)
	for i, w := range sub[b.first : b.first+n] {
		y := (p.Below(w, edge-w) - least) * scale
		if y < 0 {
			y = 0
		} else if y > 1 {
			y = 1
		}
		b.p[i] = y
	}
}

func (b *band) at(j int) float64 {
	switch k := j - b.first; {
	case k < 0:
		return 1
	case k < len(b.p):
		return b.p[k]
	}
	return 0
}

// atLeast returns the index of the first element ≥ x of an ascending slice.
func atLeast(s []float64, x float64) int {
	lo, hi := 0, len(s)
	for lo < hi {
		if mid := int(uint(lo+hi) >> 1); s[mid] < x {
			lo = mid + 1
		} else {
			hi = mid
		}
	}
	return lo
}
