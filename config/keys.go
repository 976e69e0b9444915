package config

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"sync"
)

// A Type is what a key takes.
type Type string

// The types.
const (
	Text      Type = "text"
	Number    Type = "number"
	Integer   Type = "integer"
	Switch    Type = "true or false"
	Pair      Type = "pair of numbers"
	Pairs     Type = "list of pairs"
	Texts     Type = "list of texts"
	Integers  Type = "list of integers"
	Table     Type = "table"
	Tables    Type = "tables"
	OneOf     Type = "number or parameter" // of a fit
	BySpecies Type = "table of numbers or parameters, by species"
)

// A KeyDoc says everything about one key: the loader checks by it, the manual is
// written from it.
type KeyDoc struct {
	Table    string // "survey", "sightline.line"; inline tables by their own name
	Name     string // as written in TOML
	Type     Type
	Unit     string   // "km/s", …; "" for none
	Default  string   // as TOML; "" where absence means something or the key is required
	Range    string   // interval of numbers, "(0, 100]"; "" for any finite number
	Words    []string // the only texts allowed
	Required bool
	Common   bool // may stand in [defaults] too
	Meaning  string
}

// Keys returns every key, table by table, in the order of the manual.
func Keys() []KeyDoc {
	var out []KeyDoc
	for _, k := range schema {
		k.Words = append([]string(nil), k.Words...)
		out = append(out, k)
	}
	return out
}

// A keySection is the keys of one table, ready for use.
type keySection struct {
	keys  []KeyDoc
	names []string
}

var sections = sync.OnceValue(func() map[string]*keySection {
	out := map[string]*keySection{}
	for _, k := range schema {
		if out[k.Table] == nil {
			out[k.Table] = &keySection{}
		}
		out[k.Table].keys = append(out[k.Table].keys, k)
		out[k.Table].names = append(out[k.Table].names, k.Name)
	}
	return out
})

// keysOf returns the keys of one table, for reading only.
func keysOf(table string) []KeyDoc { return sections()[table].keys }

// An interval is a parsed Range.
type interval struct {
	lo, hi         float64
	loOpen, hiOpen bool
}

func (i interval) holds(x float64) bool {
	return (x > i.lo || x == i.lo && !i.loOpen) && (x < i.hi || x == i.hi && !i.hiOpen)
}

// parseRange reads "(0, 1]"; ∞ is allowed at either end. It panics on a schema
// that is wrong.
func parseRange(s string) interval {
	if s == "" {
		return interval{lo: math.Inf(-1), hi: math.Inf(1)}
	}
	end := func(t string) float64 {
		switch t = strings.TrimSpace(t); t {
		case "∞":
			return math.Inf(1)
		case "-∞":
			return math.Inf(-1)
		}
		x, err := strconv.ParseFloat(t, 64)
		if err != nil {
			panic(fmt.Sprintf("config: range %q: %v", s, err))
		}
		return x
	}
	lo, hi, ok := strings.Cut(s[1:len(s)-1], ",")
	if !ok {
		panic(fmt.Sprintf("config: range %q has no comma", s))
	}
	return interval{end(lo), end(hi), s[0] == '(', s[len(s)-1] == ')'}
}
