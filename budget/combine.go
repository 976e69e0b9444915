package budget

import (
	"fmt"
	"math"
	"slices"
)

// Scale returns k·n. A negative k turns upper limits into lower ones and swaps
// Up and Lo.
func (n Number) Scale(k float64) Number {
	n = n.clone()
	n.X *= k
	for i := range n.Shifts {
		n.Shifts[i].D *= k
	}
	n.Up *= math.Abs(k)
	n.Lo *= math.Abs(k)
	if k < 0 {
		n.Up, n.Lo = n.Lo, n.Up
		limit := n.Flag & (Upper | Lower)
		n.Flag &^= Upper | Lower
		if limit&Upper != 0 {
			n.Flag |= Lower
		}
		if limit&Lower != 0 {
			n.Flag |= Upper
		}
		n.Behind = nil
	}
	if n.Behind != nil {
		b := n.Behind.Scale(k)
		n.Behind = &b
	}
	return n
}

// Add returns n with one more shift. Asymmetric errors grow by the same variance
// as Err; limits and intervals keep their ends.
func (n Number) Add(s Shift) Number {
	was := n.Err()
	n = n.clone()
	n.Shifts = append(n.Shifts, s)
	if (n.Up > 0 || n.Lo > 0) && n.Flag&reading == 0 {
		is := n.Err()
		more := is*is - was*was
		n.Up = math.Sqrt(math.Max(n.Up*n.Up+more, 0))
		n.Lo = math.Sqrt(math.Max(n.Lo*n.Lo+more, 0))
	}
	return n
}

// With returns n with flags set.
func (n Number) With(f Flag) Number { n.Flag |= f; return n }

// Limit returns our own upper limit x at conf σ, made from the non-detection n
// (linear, X ± σ), which it keeps behind it.
func Limit(n Number, x, conf float64) Number {
	behind := n.clone()
	behind.Behind = nil
	behind.Flag &^= reading
	return Number{
		X: x, Conf: conf, Flag: n.Flag&^(reading|Marginal) | Upper,
		From: slices.Clone(n.From), Behind: &behind,
	}
}

func (n Number) clone() Number {
	n.Shifts = slices.Clone(n.Shifts)
	n.From = slices.Clone(n.From)
	return n
}

// Combine returns the linear combination
//
//	X = Σ wᵢ nᵢ.X, with shifts Σ wᵢ Dᵢ for each cause and key,
//
// so that what two numbers share adds or cancels with its sign before it is
// squared: in D(Ca) − D(Fe) the hydrogen column leaves nothing.
//
// Where a number has asymmetric errors, each of its shifts counts Up/Err times as
// much in the direction in which it raises the result and Lo/Err times in the
// other; with one number this returns |w|·Up and |w|·Lo.
//
// Flags are united (Marginal too), references listed once each. It panics on a
// limit or an interval, whose algebra is SumColumns and Ratio, and when w and n
// differ in length.
func Combine(w []float64, n ...Number) Number {
	if len(w) != len(n) {
		panic(fmt.Sprintf("budget: Combine: %d weights for %d numbers", len(w), len(n)))
	}
	for _, a := range n {
		if a.Flag&reading != 0 {
			panic("budget: Combine: a limit or an interval; use SumColumns or Ratio")
		}
	}
	return combine(w, n)
}

// combine is Combine without the refusal: it takes the X and the shifts of limits
// as they are.
func combine(w []float64, n []Number) Number {
	var out Number
	asym := false
	for i, a := range n {
		out.X += w[i] * a.X
		out.Flag |= a.Flag
		for _, s := range a.Shifts {
			out.addShift(Shift{s.Cause, s.Key, w[i] * s.D})
		}
		for _, r := range a.From {
			if !slices.Contains(out.From, r) {
				out.From = append(out.From, r)
			}
		}
		asym = asym || ((a.Up > 0 || a.Lo > 0) && a.Flag&reading == 0)
	}
	out.Shifts = slices.DeleteFunc(out.Shifts, func(s Shift) bool { return s.D == 0 })
	if len(out.Shifts) == 0 {
		out.Shifts = nil
	}
	if asym {
		out.Up, out.Lo = skewed(w, n)
	}
	return out
}

func (n *Number) addShift(s Shift) {
	if s.Key != "" {
		for i, t := range n.Shifts {
			if t.Key == s.Key && t.Cause == s.Cause {
				n.Shifts[i].D += s.D
				return
			}
		}
	}
	n.Shifts = append(n.Shifts, s)
}

// skewed returns the asymmetric errors of a combination (see Combine). The factor
// of a key that several numbers share is the mean of theirs, weighted by the
// squares of their parts; a key that cancels gives nothing, whatever its factor.
func skewed(w []float64, n []Number) (up, lo float64) {
	type part struct {
		key        string
		d, sq      float64 // Σ wD, Σ (wD)²
		squp, sqlo float64 // Σ (wD·factor)²
	}
	var parts []part
	var u2, l2 float64
	for i, a := range n {
		if w[i] == 0 {
			continue // 0 × an open error
		}
		fu, fl := 1., 1.
		if (a.Up > 0 || a.Lo > 0) && a.Flag&reading == 0 {
			aup, alo := a.Up, a.Lo
			if w[i] < 0 {
				aup, alo = alo, aup
			}
			e := a.Err()
			if e == 0 { // errors without a history: private
				u2 += w[i] * w[i] * aup * aup
				l2 += w[i] * w[i] * alo * alo
				continue
			}
			fu, fl = aup/e, alo/e
		}
		for _, s := range a.Shifts {
			k := -1
			if s.Key != "" {
				k = slices.IndexFunc(parts, func(p part) bool { return p.key == s.Key })
			}
			if k < 0 {
				parts = append(parts, part{key: s.Key})
				k = len(parts) - 1
			}
			d := w[i] * s.D
			p := &parts[k]
			p.d += d
			p.sq += d * d
			if d != 0 {
				p.squp += d * d * fu * fu
				p.sqlo += d * d * fl * fl
			}
		}
	}
	for _, p := range parts {
		if p.d != 0 {
			u2 += p.d * p.d * (p.squp / p.sq)
			l2 += p.d * p.d * (p.sqlo / p.sq)
		}
	}
	return math.Sqrt(u2), math.Sqrt(l2)
}
