package clouds

import (
	"fmt"
)

// alike: two clouds are told apart if their velocities or their b differ by so many
// standard errors of the difference.
const alike = 2

// refuse says why a solution has a cloud too many.
func (f *Fitter) refuse(r Result) string {
	a := r.a
	for i := range f.comps {
		f.comps[i].set(r.X)
	}
	for i := range f.in.Clouds {
		if s := f.undetected(a, i); s != "" {
			return s
		}
	}
	for i := range f.comps {
		for j := range i {
			c, d := &f.comps[i], &f.comps[j]
			if c.carrier != d.carrier {
				continue
			}
			apart := false
			for _, q := range []struct {
				x    float64
				g, h []term
			}{{c.V - d.V, c.dv, d.dv}, {c.B - d.B, c.db, d.db}} {
				g := gradient(a.n, q.g)
				for _, t := range q.h {
					g[t.j] -= t.k
				}
				if a.determined(g) && q.x*q.x > alike*alike*a.covariance(g, g) {
					apart = true
				}
			}
			if !apart {
				return fmt.Sprintf("clouds at %.2f and %.2f km/s cannot be told apart", d.V, c.V)
			}
		}
	}
	return ""
}

// undetected says so if no species of a cloud is seen at 2σ.
func (f *Fitter) undetected(a *analysis, cloud int) string {
	v := 0.0
	for i := range f.comps {
		c := &f.comps[i]
		if c.cloud != cloud {
			continue
		}
		v = c.V
		if len(c.dn) == 0 {
			return ""
		}
		g := c.columnGradient(a.n)
		if e := a.covariance(g, g); a.determined(g) && e > 0 && c.N*c.N > 4*e {
			return ""
		}
		var depth SpeciesFit // a saturated cloud has a badly known column, but it is there
		if f.depths(c, &depth); depth.Weakest > saturatedTau {
			return ""
		}
	}
	return fmt.Sprintf("the column of the cloud at %.2f km/s is less than 2σ", v)
}
