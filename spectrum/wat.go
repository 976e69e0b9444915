package spectrum

import (
	"fmt"
	"strconv"
	"strings"

	"lacuna/spectrum/fits"
)

// watPiece is how many characters of a WAT string one card holds.
const watPiece = 68

// watText joins the cards WATn_001, WATn_002 … of an IRAF header into one text.
// They are pieces of exactly 68 characters, whose trailing blanks FITS does not
// keep: all but the last are filled up again. A piece that is missing, or stands
// there twice with different texts, is an error.
func watText(h *fits.Header, axis int) (string, error) {
	prefix := fmt.Sprintf("WAT%d_", axis)
	pieces := map[int]string{}
	last := 0
	for _, c := range h.Cards {
		digits, ok := strings.CutPrefix(c.Key, prefix)
		if !ok {
			continue
		}
		n, err := strconv.Atoi(digits)
		if err != nil || n < 1 || n > 999 || !c.Quoted {
			return "", fmt.Errorf("card %s is damaged", c.Key)
		}
		text := c.Value
		if strings.Contains(text, "'") { // '' in the card counts as two characters of the piece
			text += strings.Repeat(" ", max(0, watPiece-len(text)-strings.Count(text, "'")))
		} else {
			text += strings.Repeat(" ", max(0, watPiece-len(text)))
		}
		if old, dup := pieces[n]; dup && old != text {
			return "", fmt.Errorf("%s%03d stands there twice with different texts", prefix, n)
		}
		pieces[n] = text
		last = max(last, n)
	}
	var b strings.Builder
	for n := 1; n <= last; n++ {
		text, ok := pieces[n]
		if !ok {
			where := ""
			if n > 1 {
				next := n + 1
				for pieces[next] == "" {
					next++
				}
				where = fmt.Sprintf(" between %s%03d and %s%03d", prefix, n-1, prefix, next)
			}
			return "", fmt.Errorf("%s%03d is missing%s", prefix, n, where)
		}
		b.WriteString(text)
	}
	return strings.TrimRight(b.String(), " "), nil
}

// wat is watText for hints that may be absent.
func (r *reader) wat(h *fits.HDU, axis int) string {
	text, err := watText(&h.Header, axis)
	if err != nil {
		return ""
	}
	return text
}

// watEntries takes the text of WAT2 apart: key = value or key = "text".
func watEntries(text string) (map[string]string, error) {
	out := map[string]string{}
	for rest := strings.TrimLeft(text, " "); rest != ""; rest = strings.TrimLeft(rest, " ") {
		key, after, ok := strings.Cut(rest, "=")
		key = strings.TrimRight(key, " ")
		if !ok || key == "" || strings.ContainsAny(key, ` "`) {
			return nil, fmt.Errorf("'%.30s' is not key = value", rest)
		}
		after = strings.TrimLeft(after, " ")
		var value string
		if quoted, isQuoted := strings.CutPrefix(after, `"`); isQuoted {
			if value, rest, ok = strings.Cut(quoted, `"`); !ok {
				return nil, fmt.Errorf("the text of %s does not end", key)
			}
		} else {
			value, rest, _ = strings.Cut(after, " ")
		}
		if _, dup := out[key]; dup {
			return nil, fmt.Errorf("%s stands there twice", key)
		}
		out[key] = value
	}
	return out, nil
}
