package table

import (
	"math"
	"math/big"
	"strconv"
	"strings"
)

// Round prints a value and its 1σ error with the digits the error allows.
//
// Of the first three digits of the error, 100–354 keep two digits, 355–949 keep
// one, 950–999 become 1000 and keep two (the rule of the Particle Data Group);
// the value is rounded at the same decimal place, from its exact binary value.
// Numbers of a million and more, or below 1e-4 with their error, take exponents.
// −0.00 is printed 0.00.
//
// An error that is not positive and finite prints as "", and the value then with
// six significant digits. A value that is not finite prints as "".
func Round(value, err float64) (string, string) {
	v, u, _ := RoundAsym(value, err, err)
	return v, u
}

// RoundAsym is Round for an error of two sides, up and lo, both positive. The
// smaller one sets the decimal place of all three. Where the two errors print
// alike the number is symmetric in print. A side that is not positive and finite
// (open, or unknown) prints as "" and has no say.
func RoundAsym(value, up, lo float64) (v, u, l string) {
	if math.IsNaN(value) || math.IsInf(value, 0) {
		return "", "", ""
	}
	okUp, okLo := usable(up), usable(lo)
	small := up
	switch {
	case !okUp && !okLo:
		return plain(value), "", ""
	case !okUp || okLo && lo < up:
		small = lo
	}
	place, carry := errorPlace(small)
	exp := place // exponent of the whole row of three, where numbers need one
	useExp := false
	if big := math.Max(math.Abs(value), pick(okUp, up)); place > 0 && big >= 1e6 || place < -8 && big < 1e-4 || place < -15 {
		useExp = true
		exp = int(math.Floor(math.Log10(math.Max(big, small))))
	}
	show := func(x float64) string {
		if useExp {
			return expText(x, place, exp)
		}
		return atPlace(x, place)
	}
	v = show(value)
	side := func(ok bool, x float64) string {
		if !ok {
			return ""
		}
		if p, c := errorPlace(x); c && p == place && carry { // 950–999 print as 1000
			x = 10 * math.Pow(10, float64(place))
		}
		return show(x)
	}
	return v, side(okUp, up), side(okLo, lo)
}

// RoundLimit prints a limit with so many decimals (negative: tens, hundreds, …),
// an upper limit rounded up and a lower limit rounded down, so that what is
// printed still holds. The limit is taken as the shortest decimal number that
// reads back as x, so that 10.18 with two decimals stays 10.18. What is not
// finite prints as "".
func RoundLimit(x float64, decimals int, upper bool) string {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return ""
	}
	r, _ := new(big.Rat).SetString(strconv.FormatFloat(x, 'g', -1, 64))
	scale := pow10(-decimals)
	q := new(big.Rat).Quo(r, scale)
	n := new(big.Int).Div(q.Num(), q.Denom()) // floor: the denominator is positive
	if upper && !q.IsInt() {
		n.Add(n, big.NewInt(1))
	}
	return unsignZero(new(big.Rat).Mul(new(big.Rat).SetInt(n), scale).FloatString(max(decimals, 0)))
}

// FormatFixed prints x with so many decimals, rounded from its exact binary
// value; −0.00 is printed 0.00. NaN and infinities print as "".
func FormatFixed(x float64, decimals int) string {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return ""
	}
	return atPlace(x, -decimals)
}

func usable(err float64) bool { return err > 0 && !math.IsInf(err, 1) }

func pick(ok bool, x float64) float64 {
	if ok {
		return math.Abs(x)
	}
	return 0
}

// errorPlace returns the decimal place (0 units, −2 hundredths) at which an error
// and its value are rounded, and whether the error becomes 1000 by the rule. The
// digits are those of the shortest decimal that reads back as the error: 0.355
// begins with 355 although its binary value lies just below.
func errorPlace(err float64) (place int, carry bool) {
	s := strconv.FormatFloat(err, 'e', -1, 64)
	mant, e, _ := strings.Cut(s, "e")
	exp, _ := strconv.Atoi(e)
	digits := (strings.Replace(mant, ".", "", 1) + "00")[:3]
	switch {
	case digits < "355":
		return exp - 1, false
	case digits < "950":
		return exp, false
	}
	return exp, true // 0.95 → 1.0: two digits of the next decade end where one digit of this one does
}

// atPlace prints x rounded to a multiple of 10^place, half to even, exactly.
func atPlace(x float64, place int) string {
	if place <= 0 {
		return unsignZero(strconv.FormatFloat(x, 'f', -place, 64))
	}
	return unsignZero(new(big.Rat).Mul(roundRat(x, place), pow10(place)).FloatString(0))
}

// expText prints x with an exponent, rounded at 10^place.
func expText(x float64, place, exp int) string {
	r := new(big.Rat).Mul(roundRat(x, place), pow10(place-exp))
	s := unsignZero(r.FloatString(max(exp-place, 0)))
	sign := "+"
	if exp < 0 {
		sign, exp = "-", -exp
	}
	e := strconv.Itoa(exp)
	if len(e) < 2 {
		e = "0" + e
	}
	return s + "e" + sign + e
}

// roundRat returns x / 10^place as the nearest whole number, half to even.
func roundRat(x float64, place int) *big.Rat {
	q := new(big.Rat).Quo(new(big.Rat).SetFloat64(x), pow10(place))
	two := big.NewInt(2)
	num := new(big.Int).Add(new(big.Int).Mul(q.Num(), two), q.Denom()) // floor(q + ½)
	den := new(big.Int).Mul(q.Denom(), two)
	n, rem := new(big.Int).DivMod(num, den, new(big.Int))
	if rem.Sign() == 0 && n.Bit(0) == 1 { // a tie went to the odd neighbour
		n.Sub(n, big.NewInt(1))
	}
	return new(big.Rat).SetInt(n)
}

func pow10(n int) *big.Rat {
	p := new(big.Int).Exp(big.NewInt(10), big.NewInt(int64(max(n, -n))), nil)
	r := new(big.Rat).SetInt(p)
	if n < 0 {
		r.Inv(r)
	}
	return r
}

// plain prints a number without an error: six significant digits, no more than it has.
func plain(x float64) string {
	s := strconv.FormatFloat(x, 'g', 6, 64)
	if short := strconv.FormatFloat(x, 'g', -1, 64); len(short) < len(s) {
		s = short
	}
	if s == "-0" {
		s = "0"
	}
	return s
}

// unsignZero drops the sign of a printed zero.
func unsignZero(s string) string {
	if strings.HasPrefix(s, "-") && strings.Trim(s, "-0.") == "" {
		return s[1:]
	}
	return s
}
