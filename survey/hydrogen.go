package survey

import (
	"lacuna/abundance"
	"lacuna/budget"
	"lacuna/config"
)

// hydrogen is the hydrogen of a sightline, as its survey gives it.
func hydrogen(s config.Sightline) (abundance.Hydrogen, error) {
	in := abundance.HydrogenInput{Sightline: s.Name, Source: s.Hydrogen.Source}
	h := s.Hydrogen
	var err error
	stated := func(x, sigma, limit *float64) *budget.Number {
		if err != nil || x == nil && limit == nil {
			return nil
		}
		var n budget.Number
		switch {
		case x != nil && sigma != nil:
			n, err = abundance.Stated(*x, *sigma, *sigma, "value", 0, h.Source)
		case limit != nil:
			n, err = abundance.Stated(*limit, 0, 0, "upper", 3, h.Source)
		}
		return &n
	}
	in.HI = stated(h.HI, h.HIErr, h.HIMax)
	in.H2 = stated(h.H2, h.H2Err, h.H2Max)
	in.Total = stated(h.H, h.HErr, h.HMax)
	if err != nil {
		return abundance.Hydrogen{}, err
	}
	return abundance.NewHydrogen(in)
}
