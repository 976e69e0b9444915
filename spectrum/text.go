package spectrum

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"

	"lacuna/internal/oops"
)

// maxText is the largest text file that is read, in bytes: three million pixels,
// for which reading takes about ten times as much memory.
const maxText = 100 << 20

// A sheet is a text table: cells of each row, with the line it stood on.
type sheet struct {
	names    []string // nil where the file has none
	units    []string // nil likewise
	nameLine int
	rows     [][]string
	lines    []int
	meta     map[string]string // "medium", "frame", … as the file's comments say
	comments []string
	byPlace  bool // names were found in a comment
}

func (r *reader) fail(line int, fix, format string, a ...any) error {
	where := ""
	if line > 0 {
		where = fmt.Sprintf("line %d", line)
	}
	return oops.Inputf(r.c.Name, where, fix, format, a...)
}

// bytes returns the whole content.
func (r *reader) bytes() ([]byte, error) {
	if r.c.Size > maxText {
		return nil, r.fail(0, "cut out what you need", "a text of %d bytes is no spectrum (limit %d)", r.c.Size, maxText)
	}
	b, err := io.ReadAll(io.NewSectionReader(r.c, 0, r.c.Size))
	if err != nil {
		return nil, fmt.Errorf("reading %s: %w", r.c.Name, err)
	}
	return b, nil
}

// text reads plain text and CSV.
func (r *reader) text() error {
	b, err := r.bytes()
	if err != nil {
		return err
	}
	b = bytes.TrimPrefix(b, []byte("\xef\xbb\xbf"))
	b = bytes.TrimRight(b, "\x1a \t\r\n") // DOS end of file
	if i := bytes.IndexByte(b, 0); i >= 0 {
		return r.fail(1+bytes.Count(b[:i], []byte("\n")), "give FITS or text", "NUL byte: this is not text")
	}
	b = bytes.ReplaceAll(bytes.ReplaceAll(b, []byte("\r\n"), []byte("\n")), []byte("\r"), []byte("\n"))
	if !utf8.Valid(b) {
		b = latin1ToUTF8(b)
	}
	sh, err := r.sheet(string(b))
	if err != nil {
		return err
	}
	return r.fromSheet(sh)
}

// latin1ToUTF8 keeps bytes beyond ASCII as the letters of Latin-1.
func latin1ToUTF8(b []byte) []byte {
	out := make([]rune, 0, len(b))
	for _, x := range b {
		out = append(out, rune(x))
	}
	return []byte(string(out))
}

// comment starts; // too.
const commentStarts = "#!;%\\"

// sheet splits a text into cells. The separator is decided once, on the first
// line that is no comment.
func (r *reader) sheet(text string) (*sheet, error) {
	sh := &sheet{meta: map[string]string{}}
	lines := strings.Split(text, "\n")
	sep := byte(0)
	for i, l := range lines {
		t := strings.TrimSpace(l)
		if t == "" {
			lines[i] = ""
			continue
		}
		if strings.IndexByte(commentStarts, t[0]) >= 0 || strings.HasPrefix(t, "//") {
			if len(sh.comments) < 1000 {
				sh.comments = append(sh.comments, strings.TrimSpace(strings.TrimLeft(t, commentStarts+"/ \t")))
			}
			lines[i] = ""
			continue
		}
		if sep == 0 {
			sep = separator(t)
		}
		if !strings.Contains(t, `"`) {
			if k := cutComment(t, sep); k >= 0 {
				t = strings.TrimRight(t[:k], " \t")
			}
		}
		lines[i] = t
	}
	if sep == 0 {
		return nil, r.fail(0, "fetch the file again", "no data in %d lines, only comments", len(lines))
	}
	var err error
	if sep == ' ' {
		r.s.Layout = layoutText
		for i, l := range lines {
			if f := strings.Fields(l); len(f) > 0 {
				sh.rows, sh.lines = append(sh.rows, f), append(sh.lines, i+1)
			}
		}
	} else {
		r.s.Layout = layoutCSV
		err = r.quoted(sh, strings.Join(lines, "\n"), rune(sep))
	}
	if err != nil {
		return nil, err
	}
	sh.remarks()
	return sh, r.regular(sh, sep)
}

// separator looks at one line.
func separator(line string) byte {
	switch {
	case strings.Contains(line, ";") && !numbersBefore(line):
		return ';'
	case strings.Contains(firstPart(line, ";"), ","):
		return ','
	}
	return ' '
}

// numbersBefore reports whether several numbers stand before the first
// semicolon, which then begins a comment.
func numbersBefore(line string) bool {
	words := strings.Fields(firstPart(line, ";"))
	if len(words) < 2 {
		return false
	}
	_, ok := cell(words[0])
	return ok
}

// cutComment returns where a comment begins after data, or −1.
func cutComment(t string, sep byte) int {
	for i := 1; i < len(t); i++ {
		if t[i] == sep {
			continue
		}
		if strings.IndexByte("#!%;", t[i]) >= 0 && (t[i] != '%' || t[i-1] == ' ' || t[i-1] == '\t') || strings.HasPrefix(t[i:], "//") {
			return i
		}
	}
	return -1
}

// quoted reads lines with RFC 4180 quoting.
func (r *reader) quoted(sh *sheet, text string, sep rune) error {
	c := csv.NewReader(strings.NewReader(text))
	c.Comma, c.FieldsPerRecord, c.TrimLeadingSpace = sep, -1, true
	for {
		rec, err := c.Read()
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			var pe *csv.ParseError
			if errors.As(err, &pe) {
				return r.fail(pe.Line, "correct the quotes", "%v", pe.Err)
			}
			return r.fail(0, "", "%v", err)
		}
		line, _ := c.FieldPos(0)
		sh.rows, sh.lines = append(sh.rows, rec), append(sh.lines, line)
	}
}

// regular takes the line of names off and checks that all lines have equally many
// fields, and no decimal commas.
func (r *reader) regular(sh *sheet, sep byte) error {
	first := sh.rows[0]
	if _, ok := cell(first[0]); !ok {
		sh.names, sh.nameLine = first, sh.lines[0]
		sh.rows, sh.lines = sh.rows[1:], sh.lines[1:]
	}
	if len(sh.rows) == 0 {
		return r.fail(sh.nameLine, "fetch the file again", "names, but no data")
	}
	n := len(sh.rows[0])
	var odd []int
	for i, row := range sh.rows {
		if len(row) != n {
			odd = append(odd, i)
		}
	}
	if len(odd) > 0 {
		others := ""
		if len(odd) > 1 {
			others = fmt.Sprintf(" (also line %d", sh.lines[odd[1]])
			if len(odd) > 2 {
				others += fmt.Sprintf(" and %d more", len(odd)-2)
			}
			others += ")"
		}
		return r.fail(sh.lines[odd[0]], "correct the line", "%d fields, expected %d as in line %d%s", len(sh.rows[odd[0]]), n, sh.lines[0], others)
	}
	if n < 2 {
		return r.fail(sh.lines[0], "give wavelength and flux in columns", "one field in a line, at least 2 are needed")
	}
	for i, row := range sh.rows[:min(len(sh.rows), 50)] {
		for _, f := range row {
			if a, b, ok := strings.Cut(f, ","); ok && digits(a) && digits(b) || sep == ',' && strings.Count(strings.TrimSpace(f), " ") > 0 && digits(strings.ReplaceAll(f, " ", "")) {
				return r.fail(sh.lines[i], "write decimal points", "'%s' looks like a decimal comma", strings.Join(row, string(sep)))
			}
		}
	}
	if sh.names != nil && len(sh.names) != n {
		return r.fail(sh.nameLine, "name every column once", "%d names for %d columns", len(sh.names), n)
	}
	if sh.names == nil {
		sh.namesFromComment(n)
	}
	return nil
}

func digits(s string) bool {
	s = strings.Trim(strings.TrimSpace(s), "+-")
	return s != "" && strings.Trim(s, "0123456789.") == ""
}

// namesFromComment takes the last comment that names n columns, the first two of
// them a wavelength and a flux.
func (sh *sheet) namesFromComment(n int) {
	for _, c := range slices.Backward(sh.comments) {
		if label, rest, ok := strings.Cut(c, ":"); ok && sameText(label, "columns", "column", "names") {
			c = rest
		}
		words := strings.Fields(strings.ReplaceAll(c, ",", " "))
		if len(words) != n {
			continue
		}
		a, _ := columnName(words[0])
		b, _ := columnName(words[1])
		if slices.Contains(waveNames, a) && slices.Contains(fluxNames, b) {
			sh.names, sh.byPlace = words, true
			return
		}
	}
}

// remarks reads "key: value" and "key = value" comments, and a comment on the
// wavelengths that names air or vacuum and a frame.
func (sh *sheet) remarks() {
	for _, c := range sh.comments {
		i := strings.IndexAny(c, ":=")
		if i > 0 {
			if key := strings.ToLower(strings.TrimSpace(c[:i])); slices.Contains(metaKeys, key) {
				if _, dup := sh.meta[key]; !dup {
					sh.meta[key] = strings.TrimSpace(c[i+1:])
				}
				continue
			}
		}
		low := strings.ToLower(c)
		if !strings.Contains(low, "wave") && !strings.Contains(low, "lambda") {
			continue
		}
		words := strings.FieldsFunc(low, func(r rune) bool { return r < 'a' || r > 'z' })
		air, vac := slices.Contains(words, "air"), slices.Contains(words, "vacuum") || slices.Contains(words, "vac")
		if _, dup := sh.meta["medium"]; !dup && air != vac {
			sh.meta["medium"] = map[bool]string{true: "air", false: "vacuum"}[air]
		}
		found := ""
		for _, f := range []string{"barycentric", "heliocentric", "topocentric", "geocentric", "lsrk"} {
			if slices.Contains(words, f) {
				if found != "" {
					found = "?"
					break
				}
				found = f
			}
		}
		if _, dup := sh.meta["frame"]; !dup && found != "" && found != "?" {
			sh.meta["frame"] = found
		}
	}
}

// metaKeys are what a text header may say of a spectrum.
var metaKeys = []string{"object", "medium", "frame", "correction", "correction_to", "resolution", "ra", "dec", "normalised", "flux_unit", "date", "exposure_s", "instrument"}

// cell reads a number; "", "-" and their kin are missing (NaN).
func cell(s string) (float64, bool) {
	s = strings.TrimSpace(s)
	switch strings.ToLower(s) {
	case "", "-", "nan", "+nan", "-nan", "null", "--":
		return math.NaN(), true
	case "inf", "+inf", "infinity":
		return math.Inf(1), true
	case "-inf", "-infinity":
		return math.Inf(-1), true
	case "true":
		return 1, true
	case "false":
		return 0, true
	}
	if x, err := strconv.ParseFloat(s, 64); err == nil || errors.Is(err, strconv.ErrRange) {
		return x, !strings.ContainsAny(s, "xX_pP")
	}
	if strings.ContainsAny(s, "dD") {
		if x, ok := parseFloat(s); ok {
			return x, !strings.ContainsAny(s, "xX_pP")
		}
	}
	return 0, false
}
