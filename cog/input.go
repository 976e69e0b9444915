package cog

import (
	"fmt"
	"math"
)

func (o Options) check(levels []Level) (Options, error) {
	points := 0
	molecule := false
	for _, l := range levels {
		if len(l.Points) == 0 {
			return o, fmt.Errorf("the level %q has no widths", l.Name)
		}
		for i := range l.Points {
			p := &l.Points[i]
			if err := checkPoint(p); err != nil {
				return o, err
			}
			molecule = p.Line.Molecule()
			points++
		}
	}
	if points == 0 {
		return o, fmt.Errorf("no widths to fit")
	}
	def := func(x *float64, value float64) {
		if *x == 0 {
			*x = value
		}
	}
	def(&o.BMin, 0.3)
	def(&o.BMax, 30)
	def(&o.Sigma, 3)
	if !(o.BMin > 0 && o.BMax > o.BMin && o.BMax < 1e4) {
		return o, fmt.Errorf("bounds of b %g .. %g km/s: need 0 < lower < upper < 10000", o.BMin, o.BMax)
	}
	if !(o.Sigma > 0 && o.Sigma < 20) {
		return o, fmt.Errorf("limits at %g σ: need a level above 0 and below 20", o.Sigma)
	}
	clamp := func(x float64) float64 { return math.Max(o.BMin, math.Min(x, o.BMax)) }
	if o.B == 0 {
		o.B = 2
		if molecule {
			o.B = 1
		}
		o.B = clamp(o.B)
	}
	def(&o.BLow, clamp(o.B/2))
	def(&o.BHigh, clamp(o.B*2))
	if !(o.BMin <= o.BLow && o.BLow <= o.B && o.B <= o.BHigh && o.BHigh <= o.BMax) {
		return o, fmt.Errorf("assumed b %g (%g .. %g) km/s: need an ascending range inside %g .. %g", o.B, o.BLow, o.BHigh, o.BMin, o.BMax)
	}
	return o, nil
}

func checkPoint(p *Point) error {
	if err := checkLine(&p.Line); err != nil {
		return err
	}
	name := p.Line.Name
	finite := func(x float64) bool { return x-x == 0 }
	switch {
	case !finite(p.W) || math.Abs(p.W) > p.Line.Wave:
		return fmt.Errorf("%s: the width %g Å is no width", name, p.W)
	case !finite(p.Err) || p.Err < 0:
		return fmt.Errorf("%s: the error %g Å of its width; it must be above 0", name, p.Err)
	case p.Limit && !(p.W > 0):
		return fmt.Errorf("%s: the upper limit %g Å; it must be above 0", name, p.W)
	case p.Limit && !(p.Sigma >= 0 && finite(p.Sigma)):
		return fmt.Errorf("%s: a limit at %g σ", name, p.Sigma)
	case !p.Limit && !(p.Err > 0):
		return fmt.Errorf("%s: its width has no error of its own; it must be above 0", name)
	}
	for _, s := range p.Common {
		if !finite(s.D) {
			return fmt.Errorf("%s: its shared shift %q is %g Å", name, s.Key, s.D)
		}
	}
	return nil
}
