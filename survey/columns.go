package survey

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"gonum.org/v1/gonum/stat/distuv"

	"lacuna/abundance"
	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/cog"
	"lacuna/config"
	"lacuna/internal/oops"
	"lacuna/measure"
)

// columns fills a result's columns by every method, the adopted one of each
// species, and the sums over levels.
func (c *chain) columns(res *Result, s config.Sightline) error {
	res.Doublets = c.doublets(res.Widths)
	for _, d := range res.Doublets {
		if d.Saturated {
			for i := range res.Widths {
				if w := &res.Widths[i]; w.Line == d.Strong || w.Line == d.Weak {
					w.Saturate(fmt.Sprintf("doublet: the weaker line gives %.2f dex more", d.Delta.X))
				}
			}
		}
	}
	res.Warnings = append(res.Warnings, apart(res.Widths)...)
	for _, w := range res.Widths {
		res.Columns = append(res.Columns, ofWidth(w)...)
	}
	for _, d := range res.Doublets {
		if d.Refused == "" {
			res.Columns = append(res.Columns, abundance.Column{
				Species: d.Species, Element: element(d.Species), Method: abundance.MethodDoublet,
				Line: d.Weak, LogN: d.Corrected,
			})
		}
	}
	var err error
	if res.Growth, err = c.growth(res.Widths, s); err != nil {
		return err
	}
	for _, g := range res.Growth {
		if p := goodness(g); p < leastGoodness {
			res.Warnings = append(res.Warnings, fmt.Sprintf("the growth curve of %s is not used: its lines do not lie on one curve (χ² = %.1f for %d, probability %.1g)", g.Species, g.Chi2, g.DOF, p))
			continue
		}
		for i, level := range g.Levels {
			res.Columns = append(res.Columns, abundance.Column{
				Species: level, Element: element(level), Method: abundance.MethodGrowth, LogN: g.LogN[i],
			})
		}
	}
	for _, f := range res.Fits {
		res.Columns = append(res.Columns, f.Columns()...)
	}
	for _, col := range s.Columns {
		res.Columns = append(res.Columns, given(col))
	}
	for _, species := range speciesOf(res.Columns) {
		var of []abundance.Column
		for _, col := range res.Columns {
			if col.Species == species {
				of = append(of, col)
			}
		}
		o, err := override(s, species)
		if err != nil {
			return err
		}
		col, err := abundance.Adopt(of, o)
		if err != nil {
			return err
		}
		res.Adopted = append(res.Adopted, col)
		if v, ok := abundance.Compare(of, col); ok {
			res.Verdicts = append(res.Verdicts, v)
		}
	}
	for _, a := range s.Adopt {
		if !slices.Contains(speciesOf(res.Columns), a.Species) && a.Method != "" {
			return oops.Input("", "adopt "+a.Species, "no column of "+a.Species+" was found by any method", "give logN with logN_err, or measure a line of it")
		}
	}
	res.Adopted = abundance.SumLevels(res.Adopted)
	return nil
}

// Columns fills the columns of a result that has widths and fits: by every method, the
// adopted one of each species, and the verdicts. s gives the settings; its name marks
// errors that lines share.
func Columns(res *Result, s config.Sightline, table *atomic.Table) error {
	c := &chain{table: table}
	return c.columns(res, s)
}

// apart says where one line comes out differently in two orders, by more than 2σ of
// the difference; what both share cancels in it.
func apart(ws []measure.Width) []string {
	var out []string
	for i, a := range ws {
		for _, b := range ws[i+1:] {
			if a.Line != b.Line {
				continue
			}
			d := budget.Combine([]float64{1, -1}, a.W.Plain(), b.W.Plain())
			if n := math.Abs(d.X) / d.Err(); n > 2 {
				out = append(out, fmt.Sprintf("%s differs between %s order %d (%.1f ± %.1f mÅ) and %s order %d (%.1f ± %.1f mÅ) by %.1fσ",
					a.Line, a.File, a.Order, 1e3*a.W.X, 1e3*a.W.Err(), b.File, b.Order, 1e3*b.W.X, 1e3*b.W.Err(), n))
			}
		}
	}
	return out
}

// ofWidth gives the columns of one line: weak-line relation and apparent optical
// depth, or the limit.
func ofWidth(w measure.Width) []abundance.Column {
	col := abundance.Column{Species: carrier(w), Element: element(w.Species), Line: w.Line}
	weak, aod := col, col
	weak.Method, weak.LogN = abundance.MethodWeak, budget.Log10(w.Linear)
	aod.Method, aod.LogN = abundance.MethodAOD, w.ByDepth()
	if !w.Detected {
		return []abundance.Column{weak} // the limit; an optical depth of noise says no more
	}
	return []abundance.Column{weak, aod}
}

func carrier(w measure.Width) string {
	return atomic.Line{Species: w.Species, Level: w.Level}.Carrier()
}

func element(species string) string {
	if el, _, ok := atomic.SplitSpecies(strings.TrimRight(species, "*")); ok {
		return el
	}
	return ""
}

func speciesOf(cols []abundance.Column) []string {
	var out []string
	for _, c := range cols {
		if !slices.Contains(out, c.Species) {
			out = append(out, c.Species)
		}
	}
	return out
}

// doublets compares each pair of lines of one species and one file whose f λ
// differ by a factor near 2.
func (c *chain) doublets(ws []measure.Width) []measure.Doublet {
	var out []measure.Doublet
	for i, a := range ws {
		for _, b := range ws[i+1:] {
			if carrier(a) != carrier(b) || a.Line == b.Line || !a.Detected || !b.Detected {
				continue
			}
			strong, weak := a, b
			if b.F*b.Wave > a.F*a.Wave {
				strong, weak = b, a
			}
			if r := strong.F * strong.Wave / (weak.F * weak.Wave); r > 1.8 && r < 2.2 {
				out = append(out, measure.CompareDoublet(strong, weak))
			}
		}
	}
	return out
}

// growth fits a curve of growth to each species that has two lines or more with
// one detected, and to the levels of one molecule together. One line in several
// orders is one line: it says nothing about b.
func (c *chain) growth(ws []measure.Width, s config.Sightline) ([]cog.Result, error) {
	type group struct {
		name   string
		levels []cog.Level
	}
	var groups []group
	for _, w := range ws {
		line, err := c.table.Find(w.Line)
		if err != nil {
			return nil, err
		}
		if w.Flag&budget.Blended != 0 {
			continue
		}
		name := w.Species
		if !line.Molecule() {
			name = carrier(w)
		}
		k := slices.IndexFunc(groups, func(g group) bool { return g.name == name })
		if k < 0 {
			k = len(groups)
			groups = append(groups, group{name: name})
		}
		g := &groups[k]
		l := slices.IndexFunc(g.levels, func(v cog.Level) bool { return v.Name == carrier(w) })
		if l < 0 {
			l = len(g.levels)
			g.levels = append(g.levels, cog.Level{Name: carrier(w)})
		}
		g.levels[l].Points = append(g.levels[l].Points, Point(line, w))
	}
	var out []cog.Result
	for _, g := range groups {
		lines, detected := 0, 0
		for _, l := range g.levels {
			for i, p := range l.Points {
				if !slices.ContainsFunc(l.Points[:i], func(q cog.Point) bool { return q.Line.Name == p.Line.Name }) {
					lines++
				}
				if p.W > 3*p.Err {
					detected++
				}
			}
		}
		if lines <= len(g.levels) || detected == 0 {
			continue // N alone: the weak-line relation says as much
		}
		r, err := cog.FitLevels(g.name, g.levels, cog.Options{Key: s.Name, BMin: s.BRange[0], BMax: s.BRange[1], Sigma: s.LimitSigma})
		if err != nil {
			return nil, fmt.Errorf("curve of growth of %s: %w", g.name, err)
		}
		out = append(out, r)
	}
	return out, nil
}

// leastGoodness is the probability of χ² below which a growth curve gives no
// column (common practice, no source).
const leastGoodness = 1e-3

// goodness is the probability that χ² is as large by chance; 1 without degrees of
// freedom.
func goodness(g cog.Result) float64 {
	if g.DOF < 1 {
		return 1
	}
	return chance(g.Chi2, g.DOF)
}

// chance is the probability that χ² is as large by chance.
func chance(chi2 float64, dof int) float64 {
	return distuv.ChiSquared{K: float64(dof)}.Survival(chi2)
}

// Point is a measured width as the curve of growth wants it: shifts with a key
// are shared with other lines, the rest is private.
func Point(line atomic.Line, w measure.Width) cog.Point {
	p := cog.Point{Line: line, W: w.W.X}
	var private float64
	for _, s := range w.W.Shifts {
		if s.Key != "" {
			p.Common = append(p.Common, s)
		} else {
			private += s.D * s.D
		}
	}
	p.Err = math.Sqrt(private)
	return p
}

// given is a column from elsewhere.
func given(c config.Column) abundance.Column {
	n := budget.Number{X: c.LogN, From: []budget.Ref{{Kind: "literature", Key: c.Source}}}
	switch c.Kind {
	case "upper":
		n.Flag |= budget.Upper
		n.Conf = c.Sigma
	case "lower":
		n.Flag |= budget.Lower
	default:
		n = n.Add(budget.Shift{Cause: budget.Photon, Key: "given:" + c.Species + ":" + c.Source, D: c.LogNErr})
	}
	return abundance.Column{Species: c.Species, Element: element(c.Species), Method: abundance.MethodGiven, LogN: n}
}

// override is the user's own choice for a species, or nil.
func override(s config.Sightline, species string) (*abundance.Override, error) {
	for _, a := range s.Adopt {
		if a.Species != species {
			continue
		}
		o := &abundance.Override{Method: a.Method, Reason: a.Reason}
		if a.LogN != nil {
			col := given(config.Column{Species: species, LogN: *a.LogN, LogNErr: a.LogNErr, Kind: a.Kind, Sigma: 3, Source: "user: " + a.Reason})
			o.LogN = &col.LogN
		}
		return o, nil
	}
	return nil, nil
}
