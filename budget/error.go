package budget

import (
	"math"
	"slices"
)

// Err returns the total 1σ error from the shifts,
//
//	σ² = Σ over keys (Σ D)² + Σ over private shifts D²:
//
// shifts with the same non-empty key are one unknown and add, with their signs,
// before they are squared; those without a key are independent of all others.
// Up and Lo do not enter.
func (n Number) Err() float64 { return rss(n.Shifts, func(Cause) bool { return true }) }

// ErrBy returns the part of Err that one cause gives.
func (n Number) ErrBy(c Cause) float64 {
	return rss(n.Shifts, func(x Cause) bool { return x == c })
}

// Without returns Err with the shifts of some causes left out: the error of D
// without the solar scale, for example.
func (n Number) Without(causes ...Cause) float64 {
	return rss(n.Shifts, func(x Cause) bool { return !slices.Contains(causes, x) })
}

// rss adds the shifts whose cause is kept. Quadratic in their number, which is
// small; no allocation; the order of the sums is that of the shifts.
func rss(s []Shift, keep func(Cause) bool) float64 {
	var sum float64
next:
	for i, a := range s {
		if !keep(a.Cause) {
			continue
		}
		d := a.D
		if a.Key != "" {
			for _, b := range s[:i] {
				if b.Key == a.Key && keep(b.Cause) {
					continue next // counted where the key first stood
				}
			}
			for _, b := range s[i+1:] {
				if b.Key == a.Key && keep(b.Cause) {
					d += b.D
				}
			}
		}
		sum += d * d
	}
	return math.Sqrt(sum)
}

// ErrUp returns the upward 1σ error: Up where the errors differ (or the upper
// part of an interval), else Err. +Inf: open.
func (n Number) ErrUp() float64 {
	if n.Up > 0 || n.Lo > 0 {
		return n.Up
	}
	return n.Err()
}

// ErrLo returns the downward 1σ error as a positive number, as ErrUp does.
func (n Number) ErrLo() float64 {
	if n.Up > 0 || n.Lo > 0 {
		return n.Lo
	}
	return n.Err()
}

// Is reports whether all bits of f are set.
func (n Number) Is(f Flag) bool { return n.Flag&f == f }

// Kind returns how X is to be read: value, upper, lower, marginal, interval or
// none (see the package's description for mixtures).
func (n Number) Kind() string {
	switch n = n.Plain(); {
	case math.IsNaN(n.X):
		return "none"
	case n.Is(Upper):
		return "upper"
	case n.Is(Lower):
		return "lower"
	case n.Is(Interval):
		return "interval"
	case n.Is(Marginal):
		return "marginal"
	}
	return "value"
}

// Plain returns the number with at most one of Upper, Lower and Interval: an
// Interval with a limit flag becomes that limit at its outer end, Upper with Lower
// becomes NaN. Other numbers return unchanged.
func (n Number) Plain() Number {
	up, lo, in := n.Is(Upper), n.Is(Lower), n.Is(Interval)
	switch {
	case up && lo:
		n.X, n.Up, n.Lo, n.Conf, n.Behind = math.NaN(), 0, 0, 0, nil
		n.Flag &^= reading
	case in && up:
		n.X, n.Up, n.Lo = n.X+n.Up, 0, 0
		n.Flag &^= Interval
	case in && lo:
		n.X, n.Up, n.Lo = n.X-n.Lo, 0, 0
		n.Flag &^= Interval
	}
	return n
}

// reading are the flags that say what X is; the others are remarks.
const reading = Upper | Lower | Interval

// Range returns the ends between which the number puts the truth: X ± the errors
// of a value, the ends of an interval, one infinite end for a limit, NaN for none.
func (n Number) Range() (lo, hi float64) {
	n = n.Plain()
	switch n.Kind() {
	case "upper":
		return math.Inf(-1), n.X
	case "lower":
		return n.X, math.Inf(1)
	case "none":
		return math.NaN(), math.NaN()
	}
	return n.X - n.ErrLo(), n.X + n.ErrUp()
}

// ends is Range without the errors of a value.
func (n Number) ends() (lo, hi float64) {
	switch {
	case n.Is(Upper):
		return math.Inf(-1), n.X
	case n.Is(Lower):
		return n.X, math.Inf(1)
	case n.Is(Interval):
		return n.X - n.Lo, n.X + n.Up
	}
	return n.X, n.X
}
