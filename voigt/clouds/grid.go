package clouds

import (
	"math"

	"gonum.org/v1/gonum/floats"

	"lacuna/atomic"
	"lacuna/voigt/lsf"
)

// A grid is the instrument in one window: the sub-grid, and for each row (good
// pixel) the weights at the current width of the profile. In δ = ln width − at the
// weights are a parabola through three exact profiles,
//
//	R(δ) = R₀ + δ R₁ + δ² R₂,
//
// so that the width can be fitted with an analytic derivative, at the price of two
// sums. Its error of third order is below 1e-4 of the depth of a line for |δ| ≤ 0.1.
type grid struct {
	sub       []float64
	first     []int
	weight    [][]float64 // at the current δ
	r         [3][][]float64
	slope     [][]float64 // ∂weight/∂δ
	trim      [][2]int    // of each row: where its weights count for a derivative
	at, delta float64
	wide      bool // the width is free
	density   density
	q         float64 // steps in b or in 2σ that it was made for
	fwhm      float64 // km/s, in the middle of the window
}

// A gridCache keeps the even grids that were made, for fits of the same windows again:
// with other numbers of clouds, from other starts. It belongs to one goroutine.
type gridCache struct {
	keys  []gridKey
	grids []*grid
}

type gridKey struct {
	window *float64 // its first wavelength
	far, q float64
	w0, h  float64
}

// A gridPlan is what a grid is made for.
type gridPlan struct {
	edges []float64
	pix   []int
	in    *Window
	q     float64
	w0, h float64 // the width of the profile, and how far it may go
	cores []core
}

// An uneven grid is good to 1e-9 at best; who asks for more steps than this wants more.
const evenFrom = 10

// get returns a grid for a plan: even where that takes hardly more points, and then an
// old one if there is one that serves; else one that crowds about the narrow lines. For
// even grids b is rounded down to steps of 19 %, so that a fit that moves a little finds it
// again; so is w0, to steps of 0.05.
func (c *gridCache) get(p gridPlan) (*grid, error) {
	p.w0 = 0.05 * math.Round(p.w0/0.05)
	base := lsf.Scaled(p.in.Profile, math.Exp(p.w0))
	narrow := math.Inf(1) // 2σ of the narrowest profile over c
	for _, e := range p.edges {
		if s := base.Sigma(e); e > 0 && s > 0 {
			narrow = min(narrow, 2*s*math.Exp(-p.h)/e)
		}
	}
	wide := lsf.Scaled(base, math.Exp(p.h))
	if len(p.edges) < 2 || math.IsInf(narrow, 1) || !(p.edges[0] > 0) {
		_, err := lsf.New(p.edges, wide, 1, p.q) // says what is wrong
		return nil, err
	}
	lo, hi := p.edges[0], p.edges[len(p.edges)-1]
	lo, hi = math.Log(lo-wide.Reach(lo)), math.Log(hi+wide.Reach(hi))
	d := density{far: p.q / narrow}
	b := math.Inf(1)
	fwhm := 1.1775 * narrow
	for _, k := range p.cores {
		near := p.q * atomic.C / (gridPart * k.b)
		b = min(b, gridPart*k.b)
		r := k.b / atomic.C
		if near > d.far && k.x > lo-10*r && k.x < hi+10*r {
			d.bumps = append(d.bumps, bump{k.x, near, 1.6*k.reach*r + 0.2*fwhm})
		}
	}
	if even, uneven := d.even(hi - lo); uneven < 0.7*even && p.q <= evenFrom {
		sub, step := d.points(lo-1/d.far, hi)
		r, err := lsf.On(p.edges, wide, sub, step)
		if err != nil {
			return nil, err
		}
		return newGrid(r, base, p, d)
	}
	b = math.Exp2(math.Floor(4*math.Log2(b)) / 4)
	d = density{far: max(d.far, p.q*atomic.C/b)}
	key := gridKey{&p.in.Wave[0], d.far, p.q, p.w0, p.h}
	for i, k := range c.keys {
		if k == key {
			return c.grids[i], nil
		}
	}
	r, err := lsf.New(p.edges, wide, p.q*atomic.C/d.far, p.q)
	if err != nil {
		return nil, err
	}
	g, err := newGrid(r, base, p, d)
	if err != nil {
		return nil, err
	}
	const most = 64
	if len(c.keys) == most {
		c.keys, c.grids = c.keys[1:], c.grids[1:]
	}
	c.keys, c.grids = append(c.keys, key), append(c.grids, g)
	return g, nil
}

// trimTol is the weight, relative to the largest of the row, that the Jacobian
// leaves out: derivatives need no more than five digits.
const trimTol = 1e-6

// newGrid makes a grid of the response to the widest profile.
func newGrid(wide lsf.Response, base lsf.Profile, p gridPlan, d density) (*grid, error) {
	mid := p.edges[len(p.edges)/2]
	g := &grid{sub: wide.Sub, at: p.w0, wide: p.h > 0, density: d, q: p.q, fwhm: 2.354820045 * p.in.Profile.Sigma(mid) / mid * atomic.C}
	if !g.wide {
		g.first, g.weight = pick(wide, p.pix)
	} else if err := g.parabola(wide, p.edges, base, p.pix, p.h); err != nil {
		return nil, err
	}
	g.trimAll()
	return g, nil
}

// trimAll finds which weights count for a derivative.
func (g *grid) trimAll() {
	g.trim = make([][2]int, len(g.weight))
	for i, w := range g.weight {
		least := trimTol * floats.Max(w)
		a, z := 0, len(w)
		for a < z && w[a] < least {
			a++
		}
		for z > a && w[z-1] < least {
			z--
		}
		g.trim[i] = [2]int{a, z}
	}
}

// pick takes the rows of the good pixels.
func pick(r lsf.Response, pix []int) (first []int, weight [][]float64) {
	first, weight = make([]int, len(pix)), make([][]float64, len(pix))
	for i, p := range pix {
		first[i], weight[i] = r.First[p], r.Weight[p]
	}
	return first, weight
}

func (g *grid) parabola(wide lsf.Response, edges []float64, base lsf.Profile, pix []int, h float64) error {
	mid, err := wide.With(edges, base)
	if err != nil {
		return err
	}
	narrow, err := wide.With(edges, lsf.Scaled(base, math.Exp(-h)))
	if err != nil {
		return err
	}
	n, total := len(pix), 0
	g.first = make([]int, n)
	end := make([]int, n)
	for i, p := range pix {
		g.first[i], end[i] = wide.First[p], wide.First[p]+len(wide.Weight[p])
		for _, r := range []lsf.Response{mid, narrow} {
			g.first[i] = min(g.first[i], r.First[p])
			end[i] = max(end[i], r.First[p]+len(r.Weight[p]))
		}
		total += end[i] - g.first[i]
	}
	block := make([]float64, 5*total)
	rows := func() [][]float64 {
		out := make([][]float64, n)
		for i := range out {
			k := end[i] - g.first[i]
			out[i], block = block[:k:k], block[k:]
		}
		return out
	}
	for k := range g.r {
		g.r[k] = rows()
	}
	g.weight, g.slope = rows(), rows()
	for i, p := range pix {
		for k, r := range []lsf.Response{mid, wide, narrow} {
			copy(g.r[k][i][r.First[p]-g.first[i]:], r.Weight[p])
		}
		for j, m := range g.r[0][i] {
			plus, minus := g.r[1][i][j], g.r[2][i][j]
			g.r[1][i][j] = (plus - minus) / (2 * h)
			g.r[2][i][j] = (plus - 2*m + minus) / (2 * h * h)
		}
	}
	g.delta = math.NaN()
	g.set(g.at)
	return nil
}

// set brings the weights to ln width = w.
func (g *grid) set(w float64) {
	if !g.wide || w-g.at == g.delta {
		return
	}
	d := w - g.at
	g.delta = d
	for i, dst := range g.weight {
		r0, r1, r2, s := g.r[0][i][:len(dst)], g.r[1][i][:len(dst)], g.r[2][i][:len(dst)], g.slope[i][:len(dst)]
		for j := range dst {
			b := r1[j] + d*r2[j]
			dst[j] = r0[j] + d*b
			s[j] = b + d*r2[j]
		}
	}
}

// seeing returns the rows whose weights touch a ≤ j < b.
func (g *grid) seeing(a, b int) (first, last int) {
	return lsf.Response{First: g.first, Weight: g.weight}.Seeing(a, b)
}

// index returns the first sub-grid point at or beyond a wavelength.
func (g *grid) index(wave float64) int {
	lo, hi := 0, len(g.sub)
	for lo < hi {
		if mid := int(uint(lo+hi) >> 1); g.sub[mid] < wave {
			lo = mid + 1
		} else {
			hi = mid
		}
	}
	return lo
}
