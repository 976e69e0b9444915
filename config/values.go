package config

import (
	"fmt"
	"math"
	"reflect"
	"slices"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"lacuna/internal/oops"
	"lacuna/spectrum/frame"
)

// set puts x into field f if it is what the key takes.
func (l *loader) set(where string, k KeyDoc, x any, f reflect.Value) bool {
	if f.Kind() == reflect.Pointer {
		p := reflect.New(f.Type().Elem())
		if !l.set(where, k, x, p.Elem()) {
			return false
		}
		f.Set(p)
		return true
	}
	switch k.Type {
	case Text:
		s, ok := l.text(where, k, x)
		if !ok {
			return false
		}
		switch f.Type() {
		case reflect.TypeFor[frame.Kind]():
			s = string(frameOf(s))
		}
		f.SetString(s)
	case Switch:
		b, ok := x.(bool)
		if !ok {
			return l.wrongType(where, k, x)
		}
		f.SetBool(b)
	case Number:
		n, ok := l.number(where, k, x)
		if !ok {
			return false
		}
		f.SetFloat(n)
	case Integer:
		n, ok := l.integer(where, k, x)
		if !ok {
			return false
		}
		f.SetInt(n)
	case Pair:
		p, ok := l.pair(where, k, x)
		if !ok {
			return false
		}
		f.Set(reflect.ValueOf(p))
	case Pairs:
		list, ok := x.([]any)
		if !ok {
			return l.wrongType(where, k, x)
		}
		out := make([][2]float64, 0, len(list))
		for i, e := range list {
			p, ok := l.pair(fmt.Sprintf("%s %d", where, i+1), k, e)
			if !ok {
				return false
			}
			out = append(out, p)
		}
		f.Set(reflect.ValueOf(orNil(out)))
	case Texts:
		list, ok := x.([]any)
		if !ok {
			return l.wrongType(where, k, x)
		}
		out := make([]string, 0, len(list))
		for i, e := range list {
			s, ok := l.text(fmt.Sprintf("%s %d", where, i+1), k, e)
			if !ok {
				return false
			}
			out = append(out, s)
		}
		f.Set(reflect.ValueOf(orNil(out)))
	case Integers:
		list, ok := x.([]any)
		if !ok {
			return l.wrongType(where, k, x)
		}
		out := make([]int, 0, len(list))
		for i, e := range list {
			n, ok := l.integer(fmt.Sprintf("%s %d", where, i+1), k, e)
			if !ok {
				return false
			}
			out = append(out, int(n))
		}
		f.Set(reflect.ValueOf(orNil(out)))
	case Table:
		m, ok := x.(map[string]any)
		if !ok {
			return l.wrongType(where, k, x)
		}
		return l.read(where, k.Name, m, f.Addr().Interface(), nil, "")
	case OneOf:
		return l.parameter(where, k, x, f.Addr().Interface().(*Parameter))
	case BySpecies:
		ps, ok := l.parameters(where, k, x)
		if !ok {
			return false
		}
		f.Set(reflect.ValueOf(ps))
	default:
		panic("config: no field can take key " + k.Name)
	}
	return true
}

// orNil makes an empty list the same as one that is absent.
func orNil[T any](s []T) []T {
	if len(s) == 0 {
		return nil
	}
	return s
}

func (l *loader) wrongType(where string, k KeyDoc, x any) bool {
	var fix string
	switch k.Type {
	case Text:
		fix = "put it in quotes"
	case Pair:
		fix = fmt.Sprintf("write %s = [low, high]", k.Name)
	case Pairs:
		fix = fmt.Sprintf("write %s = [[low, high], [low, high]]", k.Name)
	case Texts:
		fix = fmt.Sprintf("write %s = [\"…\", \"…\"]", k.Name)
	case Integers:
		fix = fmt.Sprintf("write %s = [1, 2]", k.Name)
	case Table:
		var in []string
		for _, s := range keysOf(k.Name) {
			in = append(in, s.Name+" = "+example(s))
		}
		fix = fmt.Sprintf("write %s = {%s}", k.Name, strings.Join(in, ", "))
	case Switch:
		fix = "write true or false, without quotes"
	case OneOf:
		fix = fmt.Sprintf("write %s = 1.5, or %s = {start = 1.5, range = [1, 2]}", k.Name, k.Name)
	case BySpecies:
		fix = fmt.Sprintf("write %s = {\"Na I\" = 12.5}", k.Name)
	default:
		fix = "write it without quotes"
	}
	l.bad(where, fix, "%s is %s, wanted %s %s", show(x), typeName(x), article(k.Type), k.Type)
	return false
}

func article(t Type) string {
	if t == Integer {
		return "an"
	}
	if t == Switch {
		return "one of"
	}
	return "a"
}

func typeName(x any) string {
	switch x.(type) {
	case string:
		return "a text"
	case int64:
		return "an integer"
	case float64:
		return "a number"
	case bool:
		return "true or false"
	case []any, []map[string]any:
		return "a list"
	case map[string]any:
		return "a table"
	default:
		return "a date or time"
	}
}

// show prints a value of a TOML file in a message, shortened.
func show(x any) string {
	s := fmt.Sprintf("%v", x)
	if t, ok := x.(string); ok {
		s = strconv.Quote(t)
	}
	if r := []rune(s); len(r) > 40 {
		s = string(r[:39]) + "…"
	}
	return strings.Map(func(r rune) rune {
		if unicode.IsControl(r) {
			return '?'
		}
		return r
	}, s)
}

func (l *loader) text(where string, k KeyDoc, x any) (string, bool) {
	s, ok := x.(string)
	if !ok {
		return "", l.wrongType(where, k, x)
	}
	if why := badText(s); why != "" {
		l.bad(where, "write plain text on one line", "%s %s", show(s), why)
		return "", false
	}
	if len(k.Words) > 0 && !slices.Contains(k.Words, s) {
		fix := "one of " + strings.Join(k.Words, ", ")
		if n := oops.Nearest(s, k.Words, 1); len(n) > 0 {
			fix = "did you mean " + strconv.Quote(n[0]) + "? " + fix
		}
		l.bad(where, fix, "%s is not known", show(s))
		return "", false
	}
	return s, true
}

// badText says why a text cannot be used, or "": JSON would change bytes that
// are not UTF-8, and control characters break tables and terminals.
func badText(s string) string {
	if !utf8.ValidString(s) {
		return "is not UTF-8"
	}
	if strings.TrimSpace(s) == "" {
		return "is empty"
	}
	if strings.TrimSpace(s) != s {
		return "begins or ends with a blank"
	}
	for _, r := range s {
		if unicode.IsControl(r) || r == utf8.RuneError || unicode.Is(unicode.Bidi_Control, r) || r == '\u2028' || r == '\u2029' {
			return fmt.Sprintf("holds the control character %U", r)
		}
	}
	return ""
}

func (l *loader) number(where string, k KeyDoc, x any) (float64, bool) {
	var n float64
	switch v := x.(type) {
	case float64:
		n = v
	case int64:
		n = float64(v)
	default:
		return 0, l.wrongType(where, k, x)
	}
	if math.IsNaN(n) || math.IsInf(n, 0) {
		l.bad(where, "give a finite number, or leave the key out", "%v is not a number to work with", n)
		return 0, false
	}
	if n == 0 {
		n = 0 // −0 would print differently
	}
	return n, l.inRange(where, k, n)
}

func (l *loader) inRange(where string, k KeyDoc, n float64) bool {
	if parseRange(k.Range).holds(n) {
		return true
	}
	unit := ""
	if k.Unit != "" {
		unit = " " + k.Unit
	}
	l.bad(where, "must lie in "+k.Range+unit, "%s%s is impossible", strconv.FormatFloat(n, 'g', -1, 64), unit)
	return false
}

func (l *loader) integer(where string, k KeyDoc, x any) (int64, bool) {
	n, ok := x.(int64)
	if !ok {
		return 0, l.wrongType(where, k, x)
	}
	return n, l.inRange(where, k, float64(n))
}

func (l *loader) pair(where string, k KeyDoc, x any) ([2]float64, bool) {
	var p [2]float64
	list, ok := x.([]any)
	if !ok || len(list) != 2 {
		k.Type = Pair
		return p, l.wrongType(where, k, x)
	}
	for i := range p {
		if p[i], ok = l.number(where, k, list[i]); !ok {
			return p, false
		}
	}
	if !(p[0] < p[1]) {
		l.bad(where, "write the smaller one first", "%v is not below %v", p[0], p[1])
		return p, false
	}
	return p, true
}
