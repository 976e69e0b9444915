package atomic

import (
	"fmt"
	"math"
	"sort"
	"strings"
	"sync"
)

type group struct {
	wave  float64 // vacuum Å of the line that the offsets refer to
	parts []Part
}

var groups = sync.OnceValue(func() map[string]group {
	out := map[string]group{}
	for _, r := range embedded("structure.csv", "group lambda_vac_A isotope fraction f_low f_up strength dv_kms src status note").rows {
		mustSource(r, "src", "status")
		g := out[r.get("group")]
		w := must(r.num("lambda_vac_A", 100, 1e5))
		if g.wave != 0 && g.wave != w {
			panic("atomic: structure.csv: two wavelengths of " + r.get("group"))
		}
		g.wave = w
		g.parts = append(g.parts, Part{
			Strength: must(r.num("strength", 0, 1)) * must(r.num("fraction", 0, 1)),
			DV:       must(r.num("dv_kms", -100, 100)),
			Isotope:  r.get("isotope"), Status: Status(r.get("status")),
			Low: r.get("f_low"), Up: r.get("f_up"), Source: r.get("src")})
		out[r.get("group")] = g
	}
	for name, g := range out {
		if err := normalise(g.parts, 1e-3); err != nil {
			panic("atomic: structure.csv: " + name + ": " + err.Error())
		}
	}
	return out
})

// normalise makes the strengths sum to 1: as printed they are rounded, and the
// rarest isotopes are left out (K I: 0.99988). A larger gap than tol is refused.
func normalise(p []Part, tol float64) error {
	sum := 0.0
	for _, x := range p {
		sum += x.Strength
	}
	if !(math.Abs(sum-1) <= tol) {
		return fmt.Errorf("the strengths sum to %.5f, not 1", sum)
	}
	for i := range p {
		p[i].Strength /= sum
	}
	return nil
}

// readStructure resolves the column structure: the name of a group of ours, or
// members written out as strength@offset, "0.375@-0.62 0.625@+0.37" (km/s).
func readStructure(r record, l *Line) ([]Part, error) {
	s := r.get("structure")
	if s == "" {
		return nil, nil
	}
	if !strings.Contains(s, "@") {
		g, ok := groups()[s]
		if !ok {
			var names []string
			for n := range groups() {
				names = append(names, n)
			}
			sort.Strings(names)
			return nil, r.bad("structure", fmt.Sprintf("no group %q", s), "the groups are "+strings.Join(names, ", ")+`; or write the members as "0.375@-0.62 0.625@+0.37"`)
		}
		if !(math.Abs(g.wave-l.Wave) <= 0.05) {
			return nil, r.bad("structure", fmt.Sprintf("the group %q belongs to %.4f Å", s, g.wave), "leave it out")
		}
		return g.parts, nil
	}
	var out []Part
	for _, m := range strings.Fields(s) {
		a, b, _ := strings.Cut(m, "@")
		strength, err1 := parseNumber(a)
		dv, err2 := parseNumber(b)
		if err1 != nil || err2 != nil || !(strength > 0 && strength <= 1) || !(math.Abs(dv) <= 100) {
			return nil, r.bad("structure", fmt.Sprintf("%q is not strength@offset", m), `write members such as 0.375@-0.62 with a strength up to 1 and an offset up to 100 km/s`)
		}
		out = append(out, Part{Strength: strength, DV: dv, Status: User, Source: l.FSource})
	}
	if err := normalise(out, 0.01); err != nil {
		return nil, r.bad("structure", err.Error(), "the strengths of a line sum to 1")
	}
	return out, nil
}

// Within returns the members of the line with neighbours merged that lie within
// dv (km/s) of the first of them, at their centre of gravity: fewer profiles for
// the same shape when dv is well below the Doppler parameter b. Merging members of
// velocity variance s² narrows their profile by s²/b² of its b; the hyperfine
// lines of sodium collapse to their two lower levels at dv = 0.15 (s ≤ 0.04 km/s,
// so 1 % of b at b = 0.4). Without members it returns one of strength 1.
func (l Line) Within(dv float64) []Part {
	if len(l.Parts) == 0 {
		return []Part{{Strength: 1, Status: l.WaveStatus, Source: l.WaveSource}}
	}
	p := append([]Part(nil), l.Parts...)
	sort.SliceStable(p, func(i, j int) bool { return p[i].DV < p[j].DV })
	var out []Part
	for i := 0; i < len(p); {
		m, first := p[i], p[i].DV
		for i++; i < len(p) && p[i].DV-first <= dv; i++ {
			s := m.Strength + p[i].Strength
			m.DV += (p[i].DV - m.DV) * p[i].Strength / s
			m.Strength = s
			if p[i].Isotope != m.Isotope {
				m.Isotope = ""
			}
			if p[i].Low != m.Low {
				m.Low = ""
			}
			m.Up = ""
		}
		out = append(out, m)
	}
	return out
}
