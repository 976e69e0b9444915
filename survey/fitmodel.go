package survey

import (
	"math"
	"slices"
	"strings"

	"lacuna/config"
	"lacuna/voigt/clouds"
)

// model turns the clouds of a fit into those of package clouds. starts gives log N of
// species (in their order) in each cloud, for clouds that do not say.
func model(f config.Fit, species []string, starts [][]float64) ([]clouds.Cloud, []clouds.Shared) {
	var out []clouds.Cloud
	for i, c := range f.Clouds {
		out = append(out, cloud(f, c, species, starts[i]))
	}
	return out, offsets(f)
}

// offsets are the velocity offsets of species, the same in all clouds.
func offsets(f config.Fit) []clouds.Shared {
	var out []clouds.Shared
	for _, s := range f.Offset {
		out = append(out, clouds.Shared{Name: offsetName(s), Kind: clouds.Velocity, Par: clouds.Start(0)})
	}
	return out
}

func offsetName(species string) string { return "velocity offset of " + species }

func cloud(f config.Fit, c config.FitCloud, species []string, start []float64) clouds.Cloud {
	out := clouds.Cloud{Name: c.Name, V: par(c.V, c.V.To+": v"), Thermal: f.Thermal}
	if f.Thermal {
		out.T, out.Turb = par(*c.T, c.T.To+": T"), par(*c.Turbulence, c.Turbulence.To+": turbulence")
	} else {
		out.B = par(*c.B, c.B.To+": b")
	}
	for i, s := range species {
		sp := clouds.Species{Carrier: s}
		switch p, ok := c.Columns[s]; {
		case ok && p.To != "":
			sp.LogN = clouds.Follow("log N("+p.To+")", 1, math.Log10(ratio(p)))
		case ok:
			sp.LogN = par(p, "")
		case c.Columns != nil:
			continue // the cloud does not hold it
		default:
			sp.LogN = clouds.Start(start[i])
		}
		if p, ok := c.SpeciesB[s]; ok {
			to := "b"
			if _, own := c.SpeciesB[p.To]; own || !f.ShareB {
				to = "b(" + p.To + ")"
			}
			sp.B = pointer(par(p, to))
		} else if !f.ShareB {
			sp.B = pointer(par(*c.B, c.B.To+": b("+s+")"))
		}
		if p, ok := c.SpeciesV[s]; ok {
			to := "v"
			if _, own := c.SpeciesV[p.To]; own || !f.ShareV {
				to = "v(" + p.To + ")"
			}
			sp.V = pointer(par(p, to))
		} else if !f.ShareV {
			sp.V = pointer(par(c.V, c.V.To+": v("+s+")"))
		} else if slices.Contains(f.Offset, s) {
			sp.V = pointer(offset(s))
		}
		out.Species = append(out.Species, sp)
	}
	if !slices.ContainsFunc(out.Species, func(s clouds.Species) bool { return s.V == nil }) {
		// Nobody moves with the cloud itself: its velocity is that of the first species.
		out.V = clouds.Follow("v("+out.Species[0].Carrier+")", 1, 0)
		if slices.Contains(f.Offset, out.Species[0].Carrier) {
			out.V = par(c.V, c.V.To+": v") // the offset is from it
		}
	}
	return out
}

func offset(species string) clouds.Par {
	return clouds.Par{Tie: &clouds.Tie{Terms: []clouds.Term{{To: "v", Factor: 1}, {To: offsetName(species), Factor: 1}}}}
}

func pointer(p clouds.Par) *clouds.Par { return &p }

func ratio(p config.Parameter) float64 {
	if p.Ratio == nil {
		return 1
	}
	return *p.Ratio
}

// par is a parameter of the user's; to is the full name of what it may follow.
func par(p config.Parameter, to string) clouds.Par {
	if p.To != "" {
		add := 0.0
		if p.Shift != nil {
			add = *p.Shift
		}
		return clouds.Follow(to, ratio(p), add)
	}
	out := clouds.Start(*p.Start)
	out.Fixed = p.Fixed
	if p.Range != nil {
		out = out.Within(p.Range[0], p.Range[1])
	}
	if p.Prior != nil {
		out = out.Prior(*p.Prior, p.PriorErr)
	}
	return out
}

// like is what a cloud of an automatic fit looks like. Its b ends at a quarter of the
// range of velocities: wider ones cannot be told from the continuum.
func like(f config.Fit, species []string, velocities, bs [2]float64) clouds.Cloud {
	b := bs[0]
	widest := max(min(bs[1], (velocities[1]-velocities[0])/4), 2*b)
	out := clouds.Cloud{Thermal: f.Thermal, B: clouds.Start(b).Within(b, widest)}
	if f.Thermal {
		out.T, out.Turb = clouds.Start(100), clouds.Start(1).Within(0, widest)
	}
	for _, s := range species {
		sp := clouds.Species{Carrier: s}
		if !f.ShareB {
			sp.B = pointer(clouds.Start(b).Within(b, widest))
		}
		if slices.Contains(f.Offset, s) {
			sp.V = pointer(offset(s))
		}
		out.Species = append(out.Species, sp)
	}
	return out
}

// weak makes the column itself the parameter, in place of its logarithm, of those
// species of a cloud that the fit did not detect there: its likelihood is then near
// Gaussian, N ± σ, and the limit follows. Species that are fixed, bounded, tied, or
// followed by others stay as they are. Clouds of which nothing was detected are left
// alone unless they are among held. It reports whether there was any.
func weak(cs []clouds.Cloud, r clouds.Result, held []string) bool {
	any := false
	for i := range cs {
		c := &cs[i]
		if !slices.Contains(held, c.Name) && unseen(*c, r) {
			continue
		}
		c.Species = slices.Clone(c.Species)
		for j := range c.Species {
			s := &c.Species[j]
			p := s.LogN
			if seen(s.Carrier, c.Name, r) || s.Linear || p.Fixed || p.Tie != nil || p.Sigma != 0 || p.Lo != 0 || p.Hi != 0 || s.Boltzmann != nil || s.B != nil && !s.B.Fixed || followed(c.Species, s.Carrier) {
				continue
			}
			s.Linear, s.LogN = true, clouds.Start(math.Pow(10, p.Start))
			any = true
		}
	}
	return any
}

// seen reports whether a species was detected in a cloud.
func seen(carrier, cloud string, r clouds.Result) bool {
	for _, c := range r.Clouds {
		for _, s := range c.Species {
			if c.Name == cloud && s.Carrier == carrier {
				return detected(s, r, cloud)
			}
		}
	}
	return false
}

// unseen: nothing of a cloud was detected.
func unseen(c clouds.Cloud, r clouds.Result) bool {
	return !slices.ContainsFunc(c.Species, func(s clouds.Species) bool { return seen(s.Carrier, c.Name, r) })
}

// hold fixes v and b of a cloud at its start, where both are free: what is not there
// has neither.
func hold(c clouds.Cloud, start clouds.Cloud) clouds.Cloud {
	fix := func(p *clouds.Par, at clouds.Par) {
		if p.Tie == nil {
			*p = clouds.Fix(at.Start)
		}
	}
	fix(&c.V, start.V)
	fix(&c.B, start.B)
	fix(&c.T, start.T)
	fix(&c.Turb, start.Turb)
	c.Species = slices.Clone(c.Species)
	for j := range c.Species {
		s := &c.Species[j]
		if s.B != nil {
			s.B = pointer(*s.B)
			fix(s.B, *start.Species[j].B)
		}
		if s.V != nil {
			s.V = pointer(*s.V)
			fix(s.V, *start.Species[j].V)
		}
	}
	return c
}

// needed reports whether other clouds refer to one by its name.
func needed(cs []clouds.Cloud, name string) bool {
	refers := func(p *clouds.Par) bool {
		return p != nil && p.Tie != nil && slices.ContainsFunc(p.Tie.Terms, func(t clouds.Term) bool { return strings.HasPrefix(t.To, name+": ") })
	}
	return slices.ContainsFunc(cs, func(c clouds.Cloud) bool {
		return refers(&c.V) || refers(&c.B) || refers(&c.T) || refers(&c.Turb) ||
			slices.ContainsFunc(c.Species, func(s clouds.Species) bool { return refers(&s.LogN) || refers(s.B) || refers(s.V) })
	})
}

func followed(all []clouds.Species, carrier string) bool {
	return slices.ContainsFunc(all, func(s clouds.Species) bool {
		return s.LogN.Tie != nil && slices.ContainsFunc(s.LogN.Tie.Terms, func(t clouds.Term) bool { return t.To == "log N("+carrier+")" })
	})
}

// detected: N above 3σ, both from the parabola of log N; a saturated column is badly
// known, but it is there.
func detected(s clouds.SpeciesFit, r clouds.Result, cloud string) bool {
	if p, ok := r.Param(cloud + ": log N(" + s.Carrier + ")"); ok && p.Free {
		if p.AtBound < 0 || p.Undetermined && s.Tau0 < 1 {
			return false
		}
		return s.Tau0 > 2 || p.Err*math.Ln10 < 1./3
	}
	return true
}
