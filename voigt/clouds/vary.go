package clouds

import (
	"math"
	"math/rand/v2"
	"slices"
)

// cloud makes a cloud like Like.
func (s *Search) cloud(v, b float64, n map[string]float64) Cloud {
	c := s.Like
	c.Name = ""
	set := func(p *Par, x float64) {
		if p.Fixed || p.Tie != nil {
			return
		}
		p.Start = x
		if p.Lo != 0 || p.Hi != 0 {
			p.Start = min(max(x, p.Lo), p.Hi)
		}
	}
	if c.V.Lo == 0 && c.V.Hi == 0 {
		c.V.Lo, c.V.Hi = s.V[0], s.V[1]
	}
	set(&c.V, v)
	set(&c.B, max(b, 0.1))
	if c.Thermal {
		set(&c.Turb, b/2)
	}
	c.Species = slices.Clone(c.Species)
	for i := range c.Species {
		sp := &c.Species[i]
		x := max(n[sp.Carrier], 1)
		if !sp.Linear {
			x = math.Log10(x)
			x = min(max(x, 8), 20)
		}
		set(&sp.LogN, x)
		if sp.B != nil {
			p := *sp.B
			set(&p, max(b, 0.1))
			sp.B = &p
		}
	}
	return c
}

// move returns c at another velocity with b and N scaled.
func (s *Search) move(c Cloud, dv, b, n float64) Cloud {
	set := func(p *Par, x float64) {
		if !p.Fixed && p.Tie == nil {
			p.Start = x
			if p.Lo != 0 || p.Hi != 0 {
				p.Start = min(max(x, p.Lo), p.Hi)
			}
		}
	}
	set(&c.V, c.V.Start+dv)
	if c.Thermal {
		set(&c.Turb, c.Turb.Start*b)
	} else {
		set(&c.B, min(max(c.B.Start*b, 0.1), 50))
	}
	c.Species = slices.Clone(c.Species)
	for i := range c.Species {
		sp := &c.Species[i]
		if sp.Linear {
			set(&sp.LogN, sp.LogN.Start*n)
		} else {
			set(&sp.LogN, min(max(sp.LogN.Start+math.Log10(n), 4), 23))
		}
		if sp.B != nil {
			p := *sp.B
			set(&p, min(max(p.Start*b, 0.1), 50))
			sp.B = &p
		}
	}
	return c
}

// split puts two narrower clouds in the place of one.
func (s *Search) split(cs []Cloud, i int, by float64) []Cloud {
	out := slices.Clone(cs)
	c := cs[i]
	half := 0.6 * by * max(c.B.Start, 0.3)
	if c.Thermal {
		half = 0.6 * by * max(c.Turb.Start, 0.3)
	}
	out[i] = s.move(c, -half, 0.7, 0.5)
	return slices.Insert(out, i+1, s.move(c, half, 0.7, 0.5))
}

// merge puts one cloud in the place of neighbours i and i+1: their sum of columns, at
// the mean velocity.
func (s *Search) merge(cs []Cloud, i int) []Cloud {
	out := slices.Clone(cs)
	a, b := cs[i], cs[i+1]
	na, nb := a.column(), b.column()
	if !(na+nb > 0) {
		na, nb = 1, 1
	}
	part := nb / (na + nb)
	c := s.move(a, part*(b.V.Start-a.V.Start), 1.2, 1)
	for k := range c.Species {
		p, q := &c.Species[k], b.Species[k]
		if p.LogN.Fixed || p.LogN.Tie != nil || p.Boltzmann != nil {
			continue
		}
		if p.Linear {
			p.LogN.Start += q.LogN.Start
		} else {
			p.LogN.Start = math.Log10(math.Pow(10, a.Species[k].LogN.Start) + math.Pow(10, q.LogN.Start))
		}
	}
	out[i] = c
	return slices.Delete(out, i+1, i+2)
}

// column is the start of the first species, cm⁻².
func (c Cloud) column() float64 {
	if s := c.Species[0]; !s.Linear {
		return math.Pow(10, s.LogN.Start)
	}
	return max(0, c.Species[0].LogN.Start)
}

// shake moves every cloud at random: a third of b in velocity, 30 % in b, 0.2 dex in N.
func (s *Search) shake(cs []Cloud, rng *rand.Rand) []Cloud {
	out := make([]Cloud, len(cs))
	for i, c := range cs {
		b := c.B.Start
		if c.Thermal {
			b = c.Turb.Start
		}
		dv, db, dn := rng.NormFloat64(), rng.NormFloat64(), rng.NormFloat64()
		out[i] = s.move(c, 0.33*max(b, 0.5)*dv, math.Exp(0.3*db), math.Pow(10, 0.2*dn))
	}
	return out
}
