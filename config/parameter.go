package config

// Parameters are parameters by species.
type Parameters map[string]Parameter

// A Parameter is what is known of one number before a fit: where it starts, and a
// range, a prior, or that it is known; or that it follows another one.
type Parameter struct {
	Start    *float64    `json:"start,omitempty" toml:"start"`
	Fixed    bool        `json:"fixed,omitempty" toml:"fixed"`
	Range    *[2]float64 `json:"range,omitempty" toml:"range"`
	Prior    *float64    `json:"prior,omitempty" toml:"prior"`
	PriorErr float64     `json:"prior_err,omitempty" toml:"prior_err"`
	To       string      `json:"to,omitempty" toml:"to"` // follows the same parameter of this cloud or species
	Ratio    *float64    `json:"ratio,omitempty" toml:"ratio"`
	Shift    *float64    `json:"shift,omitempty" toml:"shift"` // km/s
}

// StartAt returns a free parameter that starts at x.
func StartAt(x float64) Parameter { return Parameter{Start: &x} }

// parameter reads a number, or a table of what is known of it, as key k takes it.
func (l *loader) parameter(where string, k KeyDoc, x any, p *Parameter) bool {
	m, ok := x.(map[string]any)
	if !ok {
		switch x.(type) {
		case int64, float64:
		default:
			return l.wrongType(where, k, x)
		}
		n, ok := l.number(where, k, x)
		if ok {
			p.Start = &n
		}
		return ok
	}
	n := len(l.errs)
	if !l.read(where, "parameter", m, p, nil, "") {
		return false
	}
	inside := func(name string, v *float64) {
		if v != nil {
			l.inRange(at(where, name), k, *v)
		}
	}
	inside("start", p.Start)
	inside("prior", p.Prior)
	if p.Range != nil {
		inside("range", &p.Range[0])
		inside("range", &p.Range[1])
	}
	if len(l.errs) == n {
		l.checkParameter(where, k, p)
	}
	return len(l.errs) == n
}

// checkParameter compares the keys of a parameter with each other, and fills in its
// start.
func (l *loader) checkParameter(where string, k KeyDoc, p *Parameter) {
	velocity := k.Name == "v" || k.Name == "species_v"
	if p.To != "" {
		switch {
		case p.Start != nil || p.Fixed || p.Range != nil || p.Prior != nil || p.PriorErr != 0:
			l.bad(where, "keep to, with ratio or shift, or leave it out", "a parameter that follows another has no start, range or prior of its own")
		case velocity && p.Ratio != nil:
			l.bad(at(where, "ratio"), "give shift in km/s", "velocities follow each other by a shift, not by a ratio")
		case !velocity && p.Shift != nil:
			l.bad(at(where, "shift"), "give ratio", "only velocities follow each other by a shift")
		}
		return
	}
	if p.Ratio != nil || p.Shift != nil {
		l.bad(where, "name the cloud or species that it follows: to = \"…\"", "ratio and shift belong to a parameter that follows another")
	}
	if (p.Prior == nil) != (p.PriorErr == 0) {
		l.bad(where, "give both, or neither", "one of prior and prior_err is missing")
		return
	}
	if p.Start == nil {
		switch {
		case p.Fixed:
			l.bad(at(where, "start"), "add the value as start", "missing: fixed to what?")
			return
		case p.Prior != nil:
			p.Start = p.Prior
		case p.Range != nil:
			middle := (p.Range[0] + p.Range[1]) / 2
			p.Start = &middle
		default:
			l.bad(at(where, "start"), "add start, range, or prior with prior_err", "missing")
			return
		}
	}
	switch {
	case p.Fixed && (p.Range != nil || p.Prior != nil):
		l.bad(where, "leave fixed out, or range and prior", "a fixed parameter has neither range nor prior")
	case p.Range != nil && !(*p.Start >= p.Range[0] && *p.Start <= p.Range[1]):
		l.bad(at(where, "range"), "widen it, or start inside", "[%g, %g] excludes the start %g", p.Range[0], p.Range[1], *p.Start)
	}
}

// parameters reads a table of parameters by species; their names are checked where
// the lines are known.
func (l *loader) parameters(where string, k KeyDoc, x any) (Parameters, bool) {
	m, ok := x.(map[string]any)
	if !ok {
		return nil, l.wrongType(where, k, x)
	}
	out, good := Parameters{}, true
	for _, name := range sortedKeys(m) {
		var p Parameter
		if why := badText(name); why != "" {
			l.bad(where, "name a species", "%s %s", show(name), why)
			good = false
			continue
		}
		if !l.parameter(at(where, name), k, m[name], &p) {
			good = false
			continue
		}
		out[name] = p
	}
	return out, good
}
