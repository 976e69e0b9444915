package cog

import (
	"math"

	"lacuna/atomic"
)

const (
	opaque   = 40   // optical depth from which 1 − e^−τ is 1 to 4e-18
	wingEnd  = 7    // √τ at which a wing counts as opaque; 49, so that parts may shift it
	coreLog  = 30   // the core ends where a Gaussian's τ is e^−30 = 1e-13
	panelMax = 12.5 // widest panel, in units of the narrowest b in it
	// tolerance of a panel, as a part of the whole width
	tolerance = 2e-12
)

// A sum is what one pass over a profile gives, in km/s or per unit of what it is
// derived by:
//
//	w    ∫ 1 − e^−τ dv
//	dlnN ∫ τ e^−τ dv             = ∂w/∂ln N
//	db   (b/2) ∫ τ_v² e^−τ dv    = ∂w/∂b, for one b
//
// The last follows from ∂φ/∂b = (b/2) ∂²φ/∂v² for every profile with a Gaussian in
// it (the heat equation), and one integration by parts.
type sum struct{ w, dlnN, db float64 }

func (s *sum) add(t sum, k float64) {
	s.w += k * t.w
	s.dlnN += k * t.dlnN
	s.db += k * t.db
}

// A blob is one cloud in one transition.
type blob struct{ v, b, a, tau0 float64 } // km/s, km/s, 1, 1

// A profile is the optical depth of some clouds in one transition,
// τ(v) = Σ τ₀ Σ sₖ H(a, (v − v₀ − δₖ)/b).
type profile struct {
	blobs []blob
	parts []atomic.Part
	grad  bool // dlnN and db are wanted
	total float64

	// work space of one panel
	f         [3][maxNodes + 1]float64
	v, u      [maxNodes + 1]float64
	tau, dtau [maxNodes + 1]float64
	h, hu     [maxNodes + 1]float64
	block     [24][2]float64
}

var unsplit = []atomic.Part{{Strength: 1}}

func parts(l *atomic.Line) []atomic.Part {
	if len(l.Parts) == 0 {
		return unsplit
	}
	return l.Parts
}

// integrate returns the integrals over all velocities. The line falls into
//
//   - blocks where one component alone is opaque: their width, exactly;
//   - what lies between and beside them, by panels that are halved until two rules agree;
//   - the two wings beyond the last Gaussian, in the variable x = √A/|v − v̄|, in
//     which τ = x²(1 + O(1/v)): from x = 0 (infinity) to 7, and opaque beyond.
//     A = Σ τ₀ s a b²/√π makes x the same for every line.
func (p *profile) integrate() sum {
	lo, hi := math.Inf(1), math.Inf(-1)
	first, last := lo, hi            // component centres
	var area, mean, strength float64 // A, A v̄, Σ τ₀ s b
	for i := range p.blobs {
		c := &p.blobs[i]
		reach := c.b * math.Max(math.Sqrt(math.Max(math.Log(c.tau0), 0)+coreLog), 2*c.a)
		for _, q := range p.parts {
			v := c.v + q.DV
			lo, hi = math.Min(lo, v-reach), math.Max(hi, v+reach)
			first, last = math.Min(first, v), math.Max(last, v)
			s := q.Strength * c.tau0
			area += s * c.a * c.b * c.b / math.SqrtPi
			mean += s * c.a * c.b * c.b / math.SqrtPi * v
			strength += s * c.b
		}
	}
	if !(strength > 0) {
		return sum{w: strength} // 0, or NaN
	}
	p.total = 0
	var out sum
	symmetric := len(p.blobs) == 1 && len(p.parts) == 1
	if area > 0 {
		mean /= area
		if !symmetric { // seen from the wings, all components lie close together
			spread := math.Max(last-mean, mean-first)
			lo, hi = math.Min(lo, mean-3*spread), math.Max(hi, mean+3*spread)
		}
		root := math.Sqrt(area)
		right := p.wing(root, mean, 1, hi)
		out.add(right, 1)
		if symmetric {
			out.add(right, 1)
		} else {
			out.add(p.wing(root, mean, -1, lo), 1)
		}
		p.total = out.w
		if root > wingEnd*(hi-lo) { // opaque from wing to wing: Σ Aₖ/(v−vₖ)² ≥ A/(hi−lo)²
			out.w += hi - lo
			return out
		}
	}
	if symmetric {
		c := p.blobs[0]
		mid := c.v + p.parts[0].DV
		edge := mid
		if t := c.tau0 * p.parts[0].Strength; t > opaque {
			edge += c.b * math.Sqrt(math.Log(t/opaque))
		}
		half := sum{w: edge - mid}
		p.total += 2 * half.w
		p.panel(&half, edge, hi, 2)
		out.add(half, 2)
		return out
	}
	p.core(&out, lo, hi)
	return out
}

// core adds what lies between lo and hi.
func (p *profile) core(out *sum, lo, hi float64) {
	blocks := p.opaqueBlocks()
	for _, k := range blocks {
		p.total += k[1] - k[0]
	}
	at := lo
	for _, k := range blocks {
		if k[0] > at {
			p.stretch(out, at, k[0])
		}
		out.w += k[1] - math.Max(k[0], at)
		at = k[1]
	}
	if at < hi {
		p.stretch(out, at, hi)
	}
}

// opaqueBlocks returns the ranges in which one component alone is opaque, ascending,
// those that touch made one. A Gaussian of depth τ₀ is at 40 where u² = ln(τ₀/40),
// and H ≥ e^−u² (1 − 2a/√π) there.
func (p *profile) opaqueBlocks() [][2]float64 {
	blocks := p.block[:0]
	for i := range p.blobs {
		c := &p.blobs[i]
		for _, q := range p.parts {
			if t := c.tau0 * q.Strength; t > opaque {
				v, r := c.v+q.DV, c.b*math.Sqrt(math.Log(t/opaque))
				blocks = append(blocks, [2]float64{v - r, v + r})
			}
		}
	}
	for i := 1; i < len(blocks); i++ { // insertion: few, and mostly sorted
		for j := i; j > 0 && blocks[j][0] < blocks[j-1][0]; j-- {
			blocks[j], blocks[j-1] = blocks[j-1], blocks[j]
		}
	}
	n := 0
	for _, k := range blocks {
		if n > 0 && k[0] <= blocks[n-1][1] {
			blocks[n-1][1] = math.Max(blocks[n-1][1], k[1])
			continue
		}
		blocks[n] = k
		n++
	}
	return blocks[:n]
}

// stretch adds the range lo .. hi, split into panels that cannot step over the
// narrowest component in them.
func (p *profile) stretch(out *sum, lo, hi float64) {
	narrow := math.Inf(1)
	for i := range p.blobs {
		c := &p.blobs[i]
		reach := 6 * c.b
		for _, q := range p.parts {
			if v := c.v + q.DV; v+reach > lo && v-reach < hi {
				narrow = math.Min(narrow, c.b)
				break
			}
		}
	}
	if hi-lo > panelMax*narrow {
		mid := lo + (hi-lo)/2
		p.stretch(out, lo, mid)
		p.stretch(out, mid, hi)
		return
	}
	p.panel(out, lo, hi, 1)
}

// panel adds the range lo .. hi, which counts times times in the whole; it halves
// it where 128 points are not enough.
func (p *profile) panel(out *sum, lo, hi, times float64) {
	r := region{half: (hi - lo) / 2, mid: lo + (hi-lo)/2}
	s, ok := p.rule(r, times)
	if !ok && r.half > 1e-9*math.Abs(r.mid)+1e-6*p.blobs[0].b {
		p.panel(out, lo, r.mid, times)
		p.panel(out, r.mid, hi, times)
		return
	}
	p.total += times * s.w
	out.add(s, 1)
}

// wing returns the integral from the velocity from to ±infinity (side ±1).
func (p *profile) wing(root, mean, side, from float64) sum {
	var out sum
	x := root / (side * (from - mean))
	if x > wingEnd {
		out.w = root/wingEnd - side*(from-mean)
		x = wingEnd
	}
	p.wingPanel(&out, region{half: x / 2, mid: x / 2, root: root, mean: mean, side: side}, 8)
	return out
}

// wingPanel adds a range of x, halved up to depth times where 128 points are not
// enough.
func (p *profile) wingPanel(out *sum, r region, depth int) {
	s, ok := p.rule(r, 1)
	if ok || depth == 0 {
		out.add(s, 1)
		return
	}
	near, far := r, r
	near.half, far.half = r.half/2, r.half/2
	near.mid, far.mid = r.mid+r.half/2, r.mid-r.half/2
	p.wingPanel(out, near, depth-1)
	p.wingPanel(out, far, depth-1)
}
