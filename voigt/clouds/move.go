package clouds

import "slices"

// Clouds returns the clouds of the problem, in their order, with the starts of all
// free parameters moved to the point x (Result.X): for a next fit.
func (f *Fitter) Clouds(x []float64) []Cloud {
	out := make([]Cloud, len(f.in.Clouds))
	for i, k := range f.clouds {
		c := f.in.Clouds[k]
		c.Species = slices.Clone(c.Species)
		move := func(p *Par, name string) {
			if q, ok := f.params.byName[c.Name+": "+name]; ok && p.Tie == nil && !p.Fixed {
				p.Start = f.params.all[q].value.at(x)
			}
		}
		move(&c.V, "v")
		move(&c.B, "b")
		move(&c.T, "T")
		move(&c.Turb, "turbulence")
		for j := range c.Species {
			s := &c.Species[j]
			move(&s.LogN, columnName(*s))
			if s.B != nil {
				b := *s.B
				move(&b, "b("+s.Carrier+")")
				s.B = &b
			}
			if s.V != nil {
				v := *s.V
				move(&v, "v("+s.Carrier+")")
				s.V = &v
			}
		}
		out[i] = c
	}
	return out
}

// SharedAt is Clouds for the shared parameters.
func (f *Fitter) SharedAt(x []float64) []Shared {
	out := slices.Clone(f.in.Shared)
	for i := range out {
		if p := &out[i].Par; p.Tie == nil && !p.Fixed {
			p.Start = f.params.all[f.params.byName[out[i].Name]].value.at(x)
		}
	}
	return out
}
