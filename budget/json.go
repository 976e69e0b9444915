package budget

import (
	"encoding/json"
	"fmt"
	"math"
	"unicode/utf8"
)

// wire is the JSON form of a Number: what is not finite is left out.
type wire struct {
	X      *float64    `json:"x,omitempty"`
	Shifts []wireShift `json:"shifts,omitempty"`
	Up     *float64    `json:"up,omitempty"`
	Lo     *float64    `json:"lo,omitempty"`
	Open   []string    `json:"open,omitempty"` // "up", "lo": that error is infinite
	Flag   []string    `json:"flag,omitempty"`
	Conf   *float64    `json:"conf,omitempty"`
	From   []Ref       `json:"from,omitempty"`
	Behind *Number     `json:"behind,omitempty"`
}

type wireShift struct {
	Cause Cause    `json:"cause"`
	Key   string   `json:"key,omitempty"`
	D     *float64 `json:"d,omitempty"`
}

// MarshalJSON writes a number with causes and flags as words:
//
//	{"x":12.3,"shifts":[{"cause":"photon","d":0.02}],"flag":["saturated"]}
//
// JSON has no NaN and no infinity: an X or a shift that is not finite is left out
// and reads back as NaN; infinite errors are listed in "open". All else reads
// back to the last bit. Undefined causes and flags, and text that is not UTF-8,
// are errors.
func (n Number) MarshalJSON() ([]byte, error) {
	w := wire{X: finite(n.X), From: n.From, Behind: n.Behind, Flag: n.Flag.Words()}
	if _, err := ParseFlag(w.Flag); err != nil {
		return nil, err
	}
	for _, s := range n.Shifts {
		if !utf8.ValidString(s.Key) {
			return nil, fmt.Errorf("budget: the key %q of a shift is not UTF-8", s.Key)
		}
		w.Shifts = append(w.Shifts, wireShift{s.Cause, s.Key, finite(s.D)})
	}
	for _, r := range n.From {
		if !utf8.ValidString(r.Kind + r.Key + r.Note) {
			return nil, fmt.Errorf("budget: the reference %q is not UTF-8", r.Key)
		}
	}
	side := func(x float64, name string) *float64 {
		if math.IsInf(x, 1) {
			w.Open = append(w.Open, name)
			return nil
		}
		if x == 0 {
			return nil
		}
		return finite(x)
	}
	w.Up = side(n.Up, "up")
	w.Lo = side(n.Lo, "lo")
	if n.Conf != 0 {
		w.Conf = finite(n.Conf)
	}
	return json.Marshal(w)
}

// UnmarshalJSON reads what MarshalJSON writes; an absent x is NaN.
func (n *Number) UnmarshalJSON(b []byte) error {
	var w wire
	if err := json.Unmarshal(b, &w); err != nil {
		return err
	}
	f, err := ParseFlag(w.Flag)
	if err != nil {
		return err
	}
	out := Number{X: orNaN(w.X), Flag: f, From: w.From, Behind: w.Behind}
	for _, s := range w.Shifts {
		out.Shifts = append(out.Shifts, Shift{s.Cause, s.Key, orNaN(s.D)})
	}
	for _, p := range []struct {
		dst *float64
		src *float64
	}{{&out.Up, w.Up}, {&out.Lo, w.Lo}, {&out.Conf, w.Conf}} {
		if p.src != nil {
			*p.dst = *p.src
		}
	}
	for _, s := range w.Open {
		switch s {
		case "up":
			out.Up = math.Inf(1)
		case "lo":
			out.Lo = math.Inf(1)
		default:
			return fmt.Errorf("budget: open errors are \"up\" or \"lo\", not %q", s)
		}
	}
	*n = out
	return nil
}

func finite(x float64) *float64 {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return nil
	}
	return &x
}

func orNaN(x *float64) float64 {
	if x == nil {
		return math.NaN()
	}
	return *x
}
