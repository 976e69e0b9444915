package table

import (
	"bytes"
	"fmt"
	"strings"
	"unicode/utf8"

	"lacuna/internal/oops"
)

// A field is one field of a text table; quoted tells "" from nothing.
type field struct {
	text   string
	quoted bool
}

// A record is one row of a text table and the line it begins on.
type record struct {
	line   int
	fields []field
}

// normalise strips a byte order mark, makes every line end a LF, and refuses
// bytes that are no text.
func normalise(data []byte, file string) ([]byte, error) {
	data = bytes.TrimPrefix(data, []byte("\xEF\xBB\xBF"))
	if bytes.HasPrefix(data, []byte("\xFF\xFE")) || bytes.HasPrefix(data, []byte("\xFE\xFF")) {
		return nil, oops.Input(file, "", "this is UTF-16 text", "save it as UTF-8")
	}
	data = bytes.ReplaceAll(data, []byte("\r\n"), []byte("\n"))
	data = bytes.ReplaceAll(data, []byte("\r"), []byte("\n"))
	for n, line := range bytes.Split(data, []byte("\n")) {
		if why := badText(string(line), true); why != "" {
			if !utf8.Valid(line) {
				why = "bytes that are not UTF-8 text"
			}
			return nil, oops.Input(file, fmt.Sprintf("line %d", n+1), why, "save the table as plain UTF-8 text")
		}
	}
	return data, nil
}

// scan splits text into records by RFC 4180, from line number first on. Lines
// that begin with # (outside quotes) and blank lines are left out; blanks around
// unquoted fields are dropped. With delim ' ' any run of blanks separates.
func scan(data []byte, delim byte, file string, first int) ([]record, error) {
	s := string(data)
	var out []record
	line, i := first, 0
	for i < len(s) {
		end := strings.IndexByte(s[i:], '\n')
		if end < 0 {
			end = len(s) - i
		}
		if head := strings.TrimLeft(s[i:i+end], " \t"); head == "" || head[0] == '#' {
			i += end + 1
			line++
			continue
		}
		rec := record{line: line}
		for more := true; more; {
			f, next, breaks, err := scanField(s, i, delim)
			if err != "" {
				where := fmt.Sprintf("line %d, field %d", line, len(rec.fields)+1)
				return nil, oops.Input(file, where, err, `put the field in quotes and double the quotes inside ("5"" slit")`)
			}
			rec.fields = append(rec.fields, f)
			line += breaks
			i = next
			switch {
			case i >= len(s):
				more = false
			case s[i] == '\n':
				i++
				line++
				more = false
			default: // the delimiter
				i++
				if delim == ' ' {
					for i < len(s) && isBlank(s[i]) {
						i++
					}
					if i >= len(s) || s[i] == '\n' { // blanks at the end of the line
						more = false
						if i < len(s) {
							i++
							line++
						}
					}
				}
			}
		}
		out = append(out, rec)
	}
	return out, nil
}

// scanField reads one field at s[i:] and returns where its delimiter or line end
// stands, and how many line breaks it held.
func scanField(s string, i int, delim byte) (f field, next, breaks int, bad string) {
	for i < len(s) && isBlank(s[i]) {
		i++
	}
	ends := func(c byte) bool { return c == '\n' || c == delim || delim == ' ' && c == '\t' }
	if i >= len(s) || s[i] != '"' {
		start := i
		for i < len(s) && !ends(s[i]) {
			if s[i] == '"' {
				return f, i, 0, "a quote inside a field that is not quoted"
			}
			i++
		}
		return field{text: strings.TrimRight(s[start:i], " \t")}, i, 0, ""
	}
	var b strings.Builder
	for i++; ; i++ {
		if i >= len(s) {
			return f, i, breaks, "a quote opens here and is never closed"
		}
		if s[i] == '\n' {
			breaks++
		}
		if s[i] != '"' {
			b.WriteByte(s[i])
			continue
		}
		if i+1 < len(s) && s[i+1] == '"' {
			b.WriteByte('"')
			i++
			continue
		}
		break
	}
	i++
	if delim != ' ' {
		for i < len(s) && isBlank(s[i]) {
			i++
		}
	}
	if i < len(s) && !ends(s[i]) {
		return f, i, breaks, "text after a closing quote"
	}
	return field{b.String(), true}, i, breaks, ""
}

func isBlank(c byte) bool { return c == ' ' || c == '\t' }

// quote returns a cell as a field: quoted where RFC 4180, or a reader that drops
// blanks and comments, needs it.
func quote(c Cell) string {
	if !c.Set {
		return ""
	}
	s := c.Text
	if s == "" || strings.ContainsAny(s, ",\"\n\t") || s[0] == '#' || s[0] == ' ' || s[len(s)-1] == ' ' {
		return `"` + strings.ReplaceAll(s, `"`, `""`) + `"`
	}
	return s
}
