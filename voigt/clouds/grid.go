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
	b         float64
	fwhm      float64 // km/s, in the middle of the window
}

// A gridCache keeps the grids that were made, for fits of the same windows again: with
// other numbers of clouds, from other starts. It belongs to one goroutine.
type gridCache struct {
	keys  []gridKey
	grids []*grid
}

type gridKey struct {
	window   *float64 // its first wavelength
	b, q, w0 float64
	h        float64
}

// get returns a grid for at least this b, made if need be: b is rounded down to steps
// of 19 %, w0 to steps of 0.05, so that a fit that moves a little finds it again.
func (c *gridCache) get(edges []float64, in *Window, pix []int, b, q, w0, h float64) (*grid, error) {
	b = math.Exp2(math.Floor(4*math.Log2(b)) / 4)
	w0 = 0.05 * math.Round(w0/0.05)
	key := gridKey{&in.Wave[0], b, q, w0, h}
	for i, k := range c.keys {
		if k == key {
			return c.grids[i], nil
		}
	}
	g := new(grid)
	if err := g.make(edges, in.Profile, pix, b, q, w0, h); err != nil {
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

// make builds the grid; h > 0 makes the width free.
func (g *grid) make(edges []float64, p lsf.Profile, pix []int, b, q, w0, h float64) error {
	mid := edges[len(edges)/2]
	base := lsf.Scaled(p, math.Exp(w0))
	narrow := math.Inf(1) // 2σ of the narrowest profile, km/s
	for _, e := range edges {
		if s := base.Sigma(e); e > 0 && s > 0 {
			narrow = min(narrow, 2*s*math.Exp(-h)/e*atomic.C)
		}
	}
	r, err := lsf.New(edges, lsf.Scaled(base, math.Exp(h)), min(b, narrow), q)
	if err != nil {
		return err
	}
	*g = grid{sub: r.Sub, at: w0, b: b, wide: h > 0, fwhm: 2.354820045 * p.Sigma(mid) / mid * atomic.C}
	if !g.wide {
		g.first, g.weight = pick(r, pix)
	} else if err := g.parabola(r, edges, base, pix, h); err != nil {
		return err
	}
	g.trimAll()
	return nil
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
