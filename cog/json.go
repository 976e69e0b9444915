package cog

import (
	"encoding/json"
	"math"
)

type bareLine LineResult

// wireLine leaves out what a width at or below 0 does not have.
type wireLine struct {
	bareLine
	LogNLinear *float64 `json:"log_n_linear,omitempty"`
	LogWL      *float64 `json:"log_w_lambda,omitempty"`
}

// MarshalJSON writes a line; logarithms that do not exist are left out.
func (l LineResult) MarshalJSON() ([]byte, error) {
	return json.Marshal(wireLine{bareLine(l), known(l.LogNLinear), known(l.LogWL)})
}

// UnmarshalJSON reads a line; absent logarithms are NaN.
func (l *LineResult) UnmarshalJSON(b []byte) error {
	var w wireLine
	if err := json.Unmarshal(b, &w); err != nil {
		return err
	}
	*l = LineResult(w.bareLine)
	l.LogNLinear, l.LogWL = orNaN(w.LogNLinear), orNaN(w.LogWL)
	return nil
}

func known(x float64) *float64 {
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
