package clouds

import (
	"fmt"
	"math"
	"slices"

	"lacuna/atomic"
	"lacuna/internal/oops"
)

// Constants of CODATA 2022 (k, h and c exact): 2k/u in (km/s)² per K, and hc/k in K cm.
const (
	twoKByU  = 2 * 1.380649e-23 / 1.66053906892e-27 * 1e-6
	kelvinCm = 1.438776877
)

// A comp is one species in one cloud: what makes one set of profiles.
type comp struct {
	cloud, species int
	carrier        string
	mass           float64
	linear         bool
	names          [3]string // of its parameters v, b and log N

	v, b, n     form
	thermal     bool
	temp, turb  form // b² = 2kT/m + turb²
	boltz       bool
	level       form    // T of the Boltzmann tie
	lgG, energy float64 // log₁₀(g_u/g_l); (E_u − E_l)/k, K

	// At the current point: values, and the derivatives of each by the free parameters.
	V, B, N    float64 // N in cm⁻²
	dv, db, dn []term  // of v, b and of log₁₀N (of N if linear)
}

// set computes the values and derivatives at x. It does not allocate once the
// slices have grown.
func (c *comp) set(x []float64) {
	c.V = c.v.at(x)
	c.dv = append(c.dv[:0], c.v.terms...)
	c.db = c.db[:0]
	if c.thermal {
		t, turb := c.temp.at(x), c.turb.at(x)
		k := twoKByU / c.mass
		c.B = math.Sqrt(k*t + turb*turb)
		for _, u := range c.temp.terms {
			c.db = append(c.db, term{u.j, u.k * k / (2 * c.B)})
		}
		for _, u := range c.turb.terms {
			c.db = append(c.db, term{u.j, u.k * turb / c.B})
		}
	} else {
		c.B = c.b.at(x)
		c.db = append(c.db, c.b.terms...)
	}
	c.dn = append(c.dn[:0], c.n.terms...)
	n := c.n.at(x)
	if c.boltz {
		t := c.level.at(x)
		n += c.lgG - c.energy/(t*math.Ln10)
		for _, u := range c.level.terms {
			c.dn = append(c.dn, term{u.j, u.k * c.energy / (t * t * math.Ln10)})
		}
	}
	c.N = n
	if !c.linear {
		c.N = math.Pow(10, n)
	}
}

// logN returns log₁₀N at the current point, NaN for a negative column.
func (c *comp) logN() float64 { return math.Log10(c.N) }

// cloudName returns the name that a cloud's parameters carry.
func cloudName(c Cloud, i int) string {
	if c.Name != "" {
		return c.Name
	}
	return fmt.Sprintf("cloud %d", i+1)
}

// columnName is what the column of a species is called within its cloud.
func columnName(s Species) string {
	if s.Linear {
		return "N(" + s.Carrier + ")"
	}
	return "log N(" + s.Carrier + ")"
}

// enter adds the parameters of all clouds to ps.
func (ps *parameters) enter(p Problem) error {
	seen := map[string]bool{}
	for i, c := range p.Clouds {
		name := cloudName(c, i)
		if seen[name] {
			return bad(name, "give each its own, or none", "two clouds have this name")
		}
		seen[name] = true
		if len(c.Species) == 0 {
			return bad(name, "list the species that it holds", "a cloud without species")
		}
		type entry struct {
			name string
			kind Kind
			par  Par
		}
		list := []entry{{"v", Velocity, c.V}}
		if c.Thermal {
			list = append(list, entry{"T", Temperature, c.T}, entry{"turbulence", Turbulence, c.Turb})
		} else if slices.ContainsFunc(c.Species, func(s Species) bool { return s.B == nil }) {
			list = append(list, entry{"b", Doppler, c.B})
		}
		for _, s := range c.Species {
			if s.V != nil {
				list = append(list, entry{"v(" + s.Carrier + ")", Velocity, *s.V})
			}
			if s.B != nil {
				list = append(list, entry{"b(" + s.Carrier + ")", Doppler, *s.B})
			}
			if s.Boltzmann != nil {
				continue
			}
			kind := LogColumn
			if s.Linear {
				kind = Column
			}
			list = append(list, entry{columnName(s), kind, s.LogN})
		}
		for _, e := range list {
			if err := ps.add(name+": "+e.name, e.kind, i, e.par); err != nil {
				return err
			}
		}
	}
	for _, s := range p.Shared {
		if err := ps.add(s.Name, s.Kind, -1, s.Par); err != nil {
			return err
		}
	}
	return nil
}

// components makes the comps, once the parameters are resolved.
func (ps *parameters) components(p Problem) ([]comp, error) {
	first := map[string]*atomic.Line{} // a line of each carrier
	var carriers []string
	for i := range p.Windows {
		for j := range p.Windows[i].Lines {
			l := &p.Windows[i].Lines[j]
			if first[l.Carrier()] == nil {
				first[l.Carrier()] = l
				carriers = append(carriers, l.Carrier())
			}
		}
	}
	var out []comp
	for i, c := range p.Clouds {
		name := cloudName(c, i)
		get := func(of string) (string, form) {
			full := name + ": " + of
			return full, ps.all[ps.byName[full]].value
		}
		for k, s := range c.Species {
			l := first[s.Carrier]
			if l == nil {
				fix := "give a window with a line of it, or leave it out"
				if near := oops.Nearest(s.Carrier, carriers, 1); len(near) > 0 {
					fix = fmt.Sprintf("did you mean %q?", near[0])
				}
				return nil, bad(name, fix, "no window has a line of %q", s.Carrier)
			}
			d := comp{cloud: i, species: k, carrier: s.Carrier, mass: l.Mass(), linear: s.Linear}
			if !(d.mass > 0) {
				return nil, bad(name, "use the name of an atom or molecule", "the mass of %q is unknown", s.Carrier)
			}
			d.names[0], d.v = get("v")
			if s.V != nil {
				d.names[0], d.v = get("v(" + s.Carrier + ")")
			}
			switch {
			case s.B != nil:
				d.names[1], d.b = get("b(" + s.Carrier + ")")
			case c.Thermal:
				d.thermal = true
				d.names[1], d.temp = get("T")
				_, d.turb = get("turbulence")
			default:
				d.names[1], d.b = get("b")
			}
			if s.Boltzmann == nil {
				d.names[2], d.n = get(columnName(s))
				out = append(out, d)
				continue
			}
			if err := d.excite(ps, c, name, s, l, first); err != nil {
				return nil, err
			}
			out = append(out, d)
		}
	}
	return out, nil
}

// excite ties the column of d to that of another level.
func (d *comp) excite(ps *parameters, c Cloud, name string, s Species, l *atomic.Line, first map[string]*atomic.Line) error {
	where := name + ": " + s.Carrier
	ref := first[s.Boltzmann.Of]
	at := slices.IndexFunc(c.Species, func(o Species) bool { return o.Carrier == s.Boltzmann.Of })
	if ref == nil || at < 0 || c.Species[at].Linear || c.Species[at].Boltzmann != nil {
		return bad(where, "name a level of the same cloud that has a log N of its own", "its level is tied to %q", s.Boltzmann.Of)
	}
	if !(l.GLow > 0) || !(ref.GLow > 0) {
		return bad(where, "use lines whose rows have weights", "the statistical weight of %s or %s is not in the table", l.Name, ref.Name)
	}
	if s.Linear {
		return bad(where, "leave one of them out", "a level tied by Boltzmann's law has no column of its own to be linear in")
	}
	t, err := ps.find(s.Boltzmann.T, -1, where)
	if err != nil {
		return err
	}
	d.boltz = true
	d.lgG = math.Log10(l.GLow / ref.GLow)
	d.energy = (l.ELow - ref.ELow) * kelvinCm
	d.level = ps.all[t].value
	d.names[2] = name + ": " + columnName(c.Species[at])
	d.n = ps.all[ps.byName[d.names[2]]].value
	return nil
}
