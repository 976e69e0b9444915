package spectrum

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// unitSymbols are the symbols of flux units in the spelling of the FITS Standard
// 4.0, section 4.3, by what files call them in lower case.
var unitSymbols = map[string]string{"erg": "erg", "ergs": "erg", "s": "s", "sec": "s", "cm": "cm", "angstrom": "Angstrom", "angstroms": "Angstrom", "ang": "Angstrom", "aa": "Angstrom", "a": "Angstrom", "å": "Angstrom",
	"adu": "adu", "dn": "adu", "count": "count", "counts": "count", "electron": "electron", "electrons": "electron", "photon": "photon", "photons": "photon", "jy": "Jy", "nm": "nm", "um": "um", "micron": "um"}

// standardUnit writes a unit of flux as the FITS Standard wants it, "10**-16 erg
// s-1 cm-2 Angstrom-1"; what it does not know it leaves as it is. Files join
// symbols by blanks, dots or stars, a slash divides by the next one only, and
// powers stand as cm2, cm**2, cm^2, cm-2 or cm**(-2).
func standardUnit(text string) string {
	p := unitParser{rest: strings.TrimSpace(text)}
	var out []string
	first := true
	for p.skip(); p.rest != ""; p.skip() {
		power := 1
		if strings.HasPrefix(p.rest, "/") {
			power = -1
			p.rest = p.rest[1:]
			p.skip()
		}
		if first && power == 1 {
			first = false
			if k, ok := p.factor(); ok {
				if k != 0 {
					out = append(out, fmt.Sprintf("10**%d", k))
				}
				continue
			}
		}
		word := p.word()
		symbol, ok := unitSymbols[strings.ToLower(word)]
		if word == "W" || word == "m" || word == "mW" { // here case counts
			symbol, ok = word, true
		}
		if !ok {
			return text
		}
		n, ok := p.power()
		if !ok {
			return text
		}
		if power *= n; power == 1 {
			out = append(out, symbol)
		} else {
			out = append(out, fmt.Sprintf("%s%d", symbol, power))
		}
	}
	return strings.Join(out, " ")
}

type unitParser struct{ rest string }

func (p *unitParser) skip() { p.rest = strings.TrimLeft(p.rest, " .*") }

// word takes letters.
func (p *unitParser) word() string {
	i := strings.IndexFunc(p.rest, func(r rune) bool { return !(r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r > 0x7f) })
	if i < 0 {
		i = len(p.rest)
	}
	w := p.rest[:i]
	p.rest = p.rest[i:]
	return w
}

// power takes a power, 1 where there is none.
func (p *unitParser) power() (int, bool) {
	s, marked := strings.CutPrefix(p.rest, "**")
	if !marked {
		s, marked = strings.CutPrefix(p.rest, "^")
	}
	n, rest, ok := whole(s)
	if !ok {
		return 1, !marked && !strings.HasPrefix(s, "(")
	}
	p.rest = rest
	return n, n != 0 && n > -10 && n < 10
}

// whole takes a whole number, in brackets or not.
func whole(s string) (n int, rest string, ok bool) {
	s, bracket := strings.CutPrefix(s, "(")
	i := 0
	for i < len(s) && (s[i] >= '0' && s[i] <= '9' || i == 0 && (s[i] == '-' || s[i] == '+')) {
		i++
	}
	n, err := strconv.Atoi(s[:i])
	if rest = s[i:]; err == nil && bracket {
		rest, bracket = strings.CutPrefix(rest, ")")
		return n, rest, bracket
	}
	return n, rest, err == nil
}

// factor takes a power of ten in front: 10**(-16), 10^-16 or 1E-17.
func (p *unitParser) factor() (int, bool) {
	if rest, ok := strings.CutPrefix(p.rest, "10"); ok && (strings.HasPrefix(rest, "**") || strings.HasPrefix(rest, "^")) {
		k, rest, ok := whole(strings.TrimPrefix(strings.TrimPrefix(rest, "**"), "^"))
		if ok {
			p.rest = rest
		}
		return k, ok
	}
	i := strings.IndexFunc(p.rest, func(r rune) bool { return !strings.ContainsRune("0123456789.eE+-", r) })
	if i < 0 {
		i = len(p.rest)
	}
	x, err := strconv.ParseFloat(p.rest[:i], 64)
	if err != nil || !(x > 0) {
		return 0, false
	}
	k := math.Round(math.Log10(x))
	if math.Abs(x/math.Pow(10, k)-1) > 1e-9 || math.Abs(k) > 300 {
		return 0, false
	}
	p.rest = p.rest[i:]
	return int(k), true
}
