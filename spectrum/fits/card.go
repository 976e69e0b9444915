package fits

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"lacuna/internal/oops"
)

// A Card is one header line with its continuations.
type Card struct {
	Key     string // "NAXIS1", "ESO QC VRAD HELICOR", "COMMENT"
	Value   string // a string without its quotes, or the literal as written; "" also where undefined
	Quoted  bool   // the value is a string
	Comment string // after the value; all of the text of COMMENT and HISTORY
	Raw     string // the 80 bytes, without continuations
	value   bool   // has a value that is defined
}

// A Header is the cards of one HDU in order. Where a keyword stands twice the
// first one counts.
type Header struct {
	Cards []Card

	// Doubled are keys that stand there again with another value, which is ignored.
	Doubled []string

	file, where string
	first       map[string]int
}

// Lookup returns the first card of that key with a defined value. Keys of the
// HIERARCH convention are written in upper case with single blanks.
func (h *Header) Lookup(key string) (Card, bool) {
	i, ok := h.first[key]
	if !ok {
		return Card{}, false
	}
	return h.Cards[i], true
}

// Has reports whether the key has a defined value.
func (h *Header) Has(key string) bool { _, ok := h.first[key]; return ok }

// Str returns a value as text, "" where the key is absent; leading blanks of
// strings are dropped too.
func (h *Header) Str(key string) string {
	c, _ := h.Lookup(key)
	return strings.TrimSpace(c.Value)
}

// Float returns a real or integer value, def where the key is absent, and an
// error where it stands there but is not a finite number.
func (h *Header) Float(key string, def float64) (float64, error) {
	c, ok := h.Lookup(key)
	if !ok {
		return def, nil
	}
	x, ok := ParseNumber(c.Value)
	if !ok { // many writers put numbers in quotes: those are taken as well
		return def, h.Fail(fmt.Sprintf("%s = %q is not a number", key, c.Value), "correct the card")
	}
	return x, nil
}

// Int is Float for integers; "32768.0" is taken.
func (h *Header) Int(key string, def int64) (int64, error) {
	c, ok := h.Lookup(key)
	if !ok {
		return def, nil
	}
	if n, err := strconv.ParseInt(strings.TrimPrefix(strings.TrimSpace(c.Value), "+"), 10, 64); err == nil {
		return n, nil
	}
	x, ok := ParseNumber(c.Value)
	if !ok || x != math.Trunc(x) || math.Abs(x) > 1<<62 {
		return def, h.Fail(fmt.Sprintf("%s = %q is not an integer", key, c.Value), "correct the card")
	}
	return int64(x), nil
}

// Bool returns a logical value, false where the key is absent or no T.
func (h *Header) Bool(key string) bool {
	c, ok := h.Lookup(key)
	return ok && strings.EqualFold(strings.TrimSpace(c.Value), "T")
}

// Fail returns an error of the user's file at this HDU.
func (h *Header) Fail(what, fix string) error { return oops.Input(h.file, h.where, what, fix) }

// ParseNumber reads a FITS number: free format, exponents with E or D in any case.
func ParseNumber(s string) (float64, bool) {
	s = strings.TrimSpace(s)
	if s == "" || len(s) > 70 || strings.Trim(s, "0123456789+-.eEdD") != "" {
		return 0, false
	}
	x, err := strconv.ParseFloat(strings.NewReplacer("d", "e", "D", "e").Replace(s), 64)
	return x, err == nil && !math.IsInf(x, 0)
}

// add parses one card of 80 bytes.
func (h *Header) add(raw string) {
	c := Card{Raw: raw}
	text := ""
	switch {
	case strings.HasPrefix(raw, "CONTINUE  ") && h.proceed(raw):
		return
	case strings.HasPrefix(raw, "HIERARCH ") && strings.Contains(raw, "="):
		name, rest, _ := strings.Cut(raw[9:], "=")
		c.Key, text = strings.ToUpper(strings.Join(strings.Fields(name), " ")), rest
	case raw[8:10] == "= " && strings.TrimSpace(raw[:8]) != "":
		c.Key, text = strings.TrimSpace(raw[:8]), raw[10:]
	default:
		c.Key, c.Comment = strings.TrimSpace(raw[:8]), strings.TrimRight(raw[8:], " ")
		h.Cards = append(h.Cards, c)
		return
	}
	c.parse(text)
	if i, dup := h.first[c.Key]; c.value && !dup {
		h.first[c.Key] = len(h.Cards)
	} else if c.value && h.Cards[i].Value != c.Value && len(h.Doubled) < 100 {
		h.Doubled = append(h.Doubled, c.Key)
	}
	h.Cards = append(h.Cards, c)
}

// parse reads value and comment.
func (c *Card) parse(text string) {
	text = strings.TrimLeft(text, " ")
	if !strings.HasPrefix(text, "'") {
		value, comment, _ := strings.Cut(text, "/")
		c.Value, c.Comment = strings.TrimSpace(value), strings.TrimSpace(comment)
		c.value = c.Value != ""
		return
	}
	var rest string
	c.Value, rest = quoted(text)
	c.Quoted, c.value = true, true
	_, comment, _ := strings.Cut(rest, "/")
	c.Comment = strings.TrimSpace(comment)
}

// quoted reads a string in quotes at the start of text, and what follows it. A
// quote that is never closed ends with the card.
func quoted(text string) (value, rest string) {
	var b strings.Builder
	for i := 1; i < len(text); i++ {
		if text[i] == '\'' {
			if i+1 < len(text) && text[i+1] == '\'' {
				i++
			} else {
				return strings.TrimRight(b.String(), " "), text[i+1:]
			}
		}
		b.WriteByte(text[i])
	}
	return strings.TrimRight(b.String(), " "), ""
}

// proceed joins a CONTINUE card to the card before it; false if it does not
// continue one.
func (h *Header) proceed(raw string) bool {
	n := len(h.Cards)
	text := strings.TrimLeft(raw[10:], " ")
	if n == 0 || !strings.HasPrefix(text, "'") {
		return false
	}
	last := &h.Cards[n-1]
	if !last.Quoted || !strings.HasSuffix(last.Value, "&") {
		return false
	}
	value, rest := quoted(text)
	last.Value = strings.TrimSuffix(last.Value, "&") + value
	if _, comment, ok := strings.Cut(rest, "/"); ok {
		last.Comment = strings.TrimSpace(last.Comment + " " + strings.TrimSpace(comment))
	}
	return true
}
