package clouds

import (
	"math"

	"lacuna/budget"
)

// totals sums the columns of each carrier with the full covariance.
func (r *Result) totals(f *Fitter, a *analysis) {
	var carriers []string
	sum := map[string]*Total{}
	grad := map[string][]float64{}
	for i := range f.comps {
		d := &f.comps[i]
		t := sum[d.carrier]
		if t == nil {
			t = &Total{Carrier: d.carrier}
			sum[d.carrier] = t
			grad[d.carrier] = make([]float64, a.n)
			carriers = append(carriers, d.carrier)
		}
		g := d.columnGradient(a.n)
		for j := range g {
			grad[d.carrier][j] += g[j]
		}
		t.N.X += d.N
		t.Naive += a.covariance(g, g)
		for _, c := range r.Clouds {
			for _, s := range c.Species {
				if c.Name == f.in.Clouds[d.cloud].Name && s.Carrier == d.carrier {
					t.N.Flag |= s.N.Flag & (budget.Saturated | budget.AtBound)
				}
			}
		}
	}
	for _, c := range carriers {
		t := sum[c]
		flag := t.N.Flag
		t.N = a.number(t.N.X, grad[c]).With(flag)
		t.LogN = r.logColumn(a, t.N, grad[c], c)
		t.Naive = math.Sqrt(t.Naive)
		r.Totals = append(r.Totals, *t)
	}
}

// logColumn is the logarithm of a sum of columns n with gradient g. While the lines are
// thin, n is what is normally distributed, and may be no detection; else log n is.
func (r *Result) logColumn(a *analysis, n budget.Number, g []float64, carrier string) budget.Number {
	thin := true
	for _, c := range r.Clouds {
		for _, s := range c.Species {
			thin = thin && (s.Carrier != carrier || s.Tau0 < thinTau)
		}
	}
	if thin || !(n.X > 0) || math.IsNaN(n.X) {
		return budget.Log10(limited(n))
	}
	h := make([]float64, len(g))
	for j := range g {
		h[j] = g[j] / (n.X * math.Ln10)
	}
	return a.number(math.Log10(n.X), h).With(n.Flag)
}

// columnGradient returns ∂N/∂x.
func (c *comp) columnGradient(n int) []float64 {
	g := gradient(n, c.dn)
	if !c.linear {
		for j := range g {
			g[j] *= c.N * math.Ln10
		}
	}
	return g
}
