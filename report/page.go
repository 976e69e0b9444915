package report

import (
	"io"
	"regexp"
	"strings"
	"unicode"
)

// Options are how text is shown on a terminal.
type Options struct {
	Width int  // columns at most; 0: 100; never below 40
	Color bool // ANSI colours
	ASCII bool // no character beyond ASCII
}

// A tone is how a piece of text is set off; it never says anything alone.
type tone string

const (
	normal tone = ""
	strong tone = "1"  // headings
	faint  tone = "2"  // what is secondary
	warn   tone = "33" // limits, saturation, warnings
	fail   tone = "31"
)

// A cell is a piece of text of a grid.
type cell struct {
	text string
	tone tone
}

func plainCell(s string) cell { return cell{text: s} }

// A page collects text and writes it at once.
type page struct {
	o Options
	b strings.Builder
}

func newPage(o Options) *page {
	if o.Width == 0 {
		o.Width = 100
	}
	o.Width = max(o.Width, 40)
	return &page{o: o}
}

func (p *page) writeTo(w io.Writer) error {
	_, err := io.WriteString(w, p.b.String())
	return err
}

// clean makes any text fit to print: control characters (a file name may hold an
// escape sequence) become spaces, and with ASCII set the rest its plain spelling.
func (p *page) clean(s string) string {
	s = strings.Map(func(r rune) rune {
		if unicode.IsControl(r) {
			return ' '
		}
		return r
	}, s)
	s = unitSigns.Replace(negative.ReplaceAllString(s, "${1}−${2}"))
	if p.o.ASCII {
		s = ascii(s)
	}
	return s
}

// In text for people a negative number has a true minus sign and a unit its
// exponent raised; notes are written in plain ASCII, for tables.
var (
	negative  = regexp.MustCompile(`(^|[\s([<>=±,])-(\.?\d)`)
	unitSigns = strings.NewReplacer("cm-2", "cm⁻²", "cm-3", "cm⁻³", "N(H2)", "N(H₂)")
)

var asciiWords = strings.NewReplacer("±", "+/-", "−", "-", "–", "-", "—", "-", "…", "..", "Å", "A", "σ", "sigma", "·", "|", "─", "-",
	"²", "2", "³", "3", "¹", "1", "⁻", "-", "⁺", "+", "₀", "0", "₁", "1", "₂", "2", "τ", "tau", "λ", "lambda", "Δ", "d", "χ", "chi", "δ", "d", "γ", "gamma",
	"ε", "eps", "ρ", "rho", "≤", "<=", "≥", ">=", "×", "x", "µ", "u", "μ", "u", "√", "sqrt", "▪", "#", "∞", "inf", "°", " deg", "∗", "*", "’", "'", "“", `"`, "”", `"`)

func ascii(s string) string {
	s = asciiWords.Replace(s)
	return strings.Map(func(r rune) rune {
		if r > 126 {
			return '?'
		}
		return r
	}, s)
}

// columns returns how many terminal columns s takes: none for combining marks,
// two for wide East Asian characters and pictures.
func columns(s string) int {
	n := 0
	for _, r := range s {
		switch {
		case unicode.In(r, unicode.Mn, unicode.Me, unicode.Cf):
		case r >= 0x1100 && (r <= 0x115F || r >= 0x2E80 && r <= 0xA4CF || r >= 0xAC00 && r <= 0xD7A3 ||
			r >= 0xF900 && r <= 0xFAFF || r >= 0xFE30 && r <= 0xFE6F || r >= 0xFF00 && r <= 0xFF60 || r >= 0x1F300 && r <= 0x1FAFF):
			n += 2
		default:
			n++
		}
	}
	return n
}

// paint sets text in a tone; call it after padding.
func (p *page) paint(s string, t tone) string {
	if !p.o.Color || t == normal || strings.TrimSpace(s) == "" {
		return s
	}
	return "\x1b[" + string(t) + "m" + s + "\x1b[0m"
}

func (p *page) blank() { p.b.WriteByte('\n') }

// para writes text wrapped at the page's width. The first line starts with lead,
// the others with as many spaces.
func (p *page) para(lead, s string, t tone) {
	lead, s = p.clean(lead), p.clean(s)
	indent := strings.Repeat(" ", columns(lead))
	for i, line := range wrap(s, p.o.Width-columns(lead)) {
		if i > 0 {
			lead = indent
		}
		p.b.WriteString(p.paint(strings.TrimRight(lead+line, " "), t) + "\n")
	}
}

// heading writes a title and a rule as wide as the page.
func (p *page) heading(title string) {
	p.para("", title, strong)
	p.b.WriteString(p.paint(p.clean(strings.Repeat("─", p.o.Width)), faint) + "\n")
}

// wrap breaks text at spaces into lines of at most n columns; a word longer than
// that is broken too.
func wrap(s string, n int) []string {
	n = max(n, 1)
	var out []string
	line := ""
	for _, word := range strings.Fields(s) {
		for columns(word) > n {
			head, rest := cut(word, n)
			if line != "" {
				out = append(out, line)
				line = ""
			}
			out = append(out, head)
			word = rest
		}
		switch {
		case word == "":
		case line == "":
			line = word
		case columns(line)+1+columns(word) <= n:
			line += " " + word
		default:
			out = append(out, line)
			line = word
		}
	}
	if line != "" || len(out) == 0 {
		out = append(out, line)
	}
	return out
}

// cut splits s after at most n columns, but after one character at least.
func cut(s string, n int) (head, rest string) {
	used := 0
	for i, r := range s {
		w := columns(string(r))
		if i > 0 && used+w > n {
			return s[:i], s[i:]
		}
		used += w
	}
	return s, ""
}
