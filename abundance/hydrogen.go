package abundance

import (
	"fmt"
	"math"
	"slices"

	"lacuna/budget"
	"lacuna/internal/oops"
)

// The routes to N(H).
const (
	RouteSum   = "N(H I) + 2 N(H2)"
	RouteHI    = "N(H I), H2 not known"
	RouteGiven = "given total"
)

// HydrogenInput is what is known of the hydrogen towards a star. Columns are
// log₁₀ cm⁻² as Stated makes them; nil is unknown.
type HydrogenInput struct {
	Sightline string // for the key of the error that all depletions share
	HI, H2    *budget.Number
	Total     *budget.Number // N(H I) + 2 N(H2), in place of HI and H2
	Source    string         // paper and route; required
	H2Source  string         // of H2, where it is another one
	Tracer    string         // the species that N(H) was derived from ("Zn II"); "" for direct routes
}

// NewHydrogen returns the total hydrogen column,
//
//	N(H) = N(H I) + 2 N(H2),  σ² = σ(H I)² + 4 σ(H2)²  (linear),
//
// whose whole error has the cause Hydrogen and one key, "NH:<sightline>": it is
// the same unknown in every depletion of the sightline and cancels in ratios.
// What D = log N(X) − log N(H) − (ε − 12) becomes, for a value of N(X):
//
//	H I     H2        N(H)                                     D
//	value   value     value                                    value
//	value   upper     N(H I) to N(H I) + 2 N(H2)max: interval  interval
//	value   unknown   at least N(H I): lower                   upper limit
//	value   lower     lower                                    upper limit
//	upper   value     2 N(H2) to 2 N(H2) + N(H I)max           interval
//	upper   upper     upper (sum of the limits)                lower limit
//	upper   unknown   neither bound holds: none                none
//	lower   any       lower                                    upper limit
//
// An H2 bound that adds less than a tenth of the error of N(H I) leaves a value:
// the middle of the interval, its half width in the error. A total is taken as
// it is. H2 alone is refused.
//
// Source of the sum: the definition of N(H); errors in linear columns as in
// Jenkins 2009, ApJ 700, 1299.
func NewHydrogen(in HydrogenInput) (Hydrogen, error) {
	none := budget.Number{X: math.NaN()}
	h := Hydrogen{HI: none, H2: none, H: none, Source: in.Source, Tracer: in.Tracer}
	switch {
	case in.Source == "":
		return h, oops.Input("", "hydrogen", "the source of N(H) is missing", "say which paper or route gives it")
	case in.Total != nil && (in.HI != nil || in.H2 != nil):
		return h, oops.Input("", "hydrogen", "the total N(H) beside N(H I) or N(H2): they could disagree", "keep the total or its parts")
	case in.Total == nil && in.HI == nil && in.H2 == nil:
		return h, oops.Input("", "hydrogen", "no column of hydrogen", "give log N(H I) and log N(H2), or the total log N(H)")
	case in.Total == nil && in.HI == nil:
		return h, oops.Input("", "hydrogen", "N(H2) alone does not give N(H)", "add log N(H I)")
	}
	for _, c := range []struct {
		name string
		n    *budget.Number
		to   *budget.Number
		key  string
	}{{"N(H)", in.Total, &h.H, "NH:"}, {"N(H I)", in.HI, &h.HI, "NHI:"}, {"N(H2)", in.H2, &h.H2, "NH2:"}} {
		if c.n == nil {
			continue
		}
		if k := c.n.Kind(); k == "none" || (k == "value" || k == "marginal") && !(c.n.ErrUp() > 0 && c.n.ErrLo() > 0) {
			return h, oops.Input("", "hydrogen", c.name+" has no number or no error", "give log N and its 1σ error in dex, or a limit")
		}
		*c.to = oneUnknown(*c.n, c.key+in.Sightline)
	}
	if in.H2Source != "" && in.H2Source != in.Source {
		h.Source += "; H2: " + in.H2Source
	}
	if !math.IsNaN(h.HI.X) && !h.HI.Is(budget.Lower) && h.HI.X < 19.5 {
		h.Notes = append(h.Notes, "log N(H I) below 19.5: partly ionized gas may add to the ions") // Jenkins 2009, §3, from memory
	}
	if in.Total != nil {
		h.Route = RouteGiven
		if h.H.Is(budget.Upper) {
			h.Notes = append(h.Notes, "N(H) is an upper limit: depletions become lower limits")
		}
		return h, nil
	}
	key := "NH:" + in.Sightline
	if in.H2 == nil {
		h.Route = RouteHI
		if h.HI.Is(budget.Upper) {
			h.Notes = append(h.Notes, "N(H I) is an upper limit and H2 is not known: N(H) has no bound")
			return h, nil
		}
		h.H = lowerEnd(oneUnknown(h.HI, key))
		h.Notes = append(h.Notes, "H2 is not known: N(H) is at least N(H I), and depletions become upper limits")
		return h, nil
	}
	h.Route = RouteSum
	linear := budget.SumColumns(budget.Pow10(h.HI), budget.Pow10(h.H2).Scale(2))
	if h.HI.Kind() == "value" && h.H2.Kind() == "upper" {
		hi := budget.Pow10(h.HI)
		if half := linear.Up; linear.Is(budget.Interval) && 2*half < 0.1*math.Min(hi.ErrUp(), hi.ErrLo()) {
			hi.X += half
			linear = hi.Add(budget.Shift{Cause: budget.Hydrogen, D: half})
			h.Notes = append(h.Notes, "the bound on H2 adds less than a tenth of the error of N(H I)")
		} else {
			h.Notes = append(h.Notes, "H2 is an upper limit: N(H) is an interval")
		}
	}
	h.H = oneUnknown(budget.Log10(linear), key)
	return h, nil
}

// oneUnknown gives the whole error of a logarithm one cause and one key. Limits
// have none; of an interval it is the error of its ends.
func oneUnknown(n budget.Number, key string) budget.Number {
	n = n.Plain()
	e := n.Err()
	if e == 0 && isValue(n) {
		e = (n.Up + n.Lo) / 2
	}
	n.From = slices.Clone(n.From)
	n.Shifts = nil
	if e > 0 && (isValue(n) || n.Is(budget.Interval)) {
		n.Shifts = []budget.Shift{{Cause: budget.Hydrogen, Key: key, D: e}}
	}
	return n
}

// lowerEnd turns a value (or an interval) into a lower limit at its best value
// (or its lower end).
func lowerEnd(n budget.Number) budget.Number {
	if n.Is(budget.Interval) {
		n.X -= n.Lo
	}
	n.Flag = n.Flag&^(budget.Interval|budget.Marginal) | budget.Lower
	n.Up, n.Lo, n.Shifts = 0, 0, nil
	return n
}

// known reports whether N(H) says anything.
func (h Hydrogen) known() bool { return h.Route != "" && h.H.Kind() != "none" }

// tracedBy says why N(H) may not be used for an element, or "".
func (h Hydrogen) tracedBy(element string) string {
	if h.Tracer == "" || elementOf(h.Tracer) != element {
		return ""
	}
	return fmt.Sprintf("N(H) was itself derived from %s", h.Tracer)
}
