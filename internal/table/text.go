package table

import (
	"bufio"
	"io"
	"strings"
	"unicode"

	"golang.org/x/text/width"
)

// TextOptions says how a table is shown on a terminal.
type TextOptions struct {
	Width int  // columns of the terminal; 0: no limit
	ASCII bool // plain characters only
	Keep  int  // leading columns repeated in every block; 0: one
}

const (
	gap     = 2  // blanks between columns
	minText = 12 // text columns are cut down to this before the table is split
)

// WriteText writes the table for people: names, units where there are any, a
// rule, rows; numbers to the right, text to the left. No line is wider than
// Width (at least 24): long text is cut and marked, and columns that do not fit go into a
// further block below, behind the leading columns once more. Metadata is not shown.
func (t *Table) WriteText(w io.Writer, o TextOptions) error {
	if err := t.Check(); err != nil {
		return err
	}
	g := t.grid(o.ASCII)
	keep := max(o.Keep, 1)
	b := bufio.NewWriter(w)
	if o.Width > 0 {
		o.Width = max(o.Width, 24) // the longest float64 in print
		g.squeeze(o.Width)
	}
	for first, done := true, 0; done < len(t.Cols); first = false {
		var cols []int
		used := 0
		take := func(i int) bool {
			need := g.width[i]
			if len(cols) > 0 {
				need += gap
			}
			if o.Width > 0 && used+need > o.Width && len(cols) > 0 {
				return false
			}
			cols = append(cols, i)
			used += need
			return true
		}
		for i := 0; !first && i < min(keep, done); i++ {
			if used+g.width[i]+2*gap+g.width[done] <= o.Width { // room must be left for a new column
				take(i)
			}
		}
		for done < len(t.Cols) && take(done) {
			done++
		}
		if !first {
			b.WriteByte('\n')
		}
		g.write(b, cols, o)
	}
	return b.Flush()
}

// A textGrid is the shown text of a table, column by column: name, unit, cells.
type textGrid struct {
	cells [][]string
	right []bool
	width []int
	units bool
	dots  string
}

func (t *Table) grid(ascii bool) *textGrid {
	g := &textGrid{dots: "…"}
	if ascii {
		g.dots = ".."
	}
	show := func(s string) string {
		s = strings.NewReplacer("\n", " ", "\t", " ").Replace(s)
		if ascii {
			s = toASCII(s)
		}
		return s
	}
	for i := range t.Cols {
		c := &t.Cols[i]
		col := []string{show(c.Name), show(c.Unit)}
		g.units = g.units || c.Unit != ""
		for _, cell := range c.Cells {
			col = append(col, show(cell.Text))
		}
		wide := 0
		for _, s := range col {
			wide = max(wide, columns(s))
		}
		g.cells = append(g.cells, col)
		g.right = append(g.right, c.Type == Real || c.Type == Integer)
		g.width = append(g.width, wide)
	}
	return g
}

// squeeze narrows text columns, widest first, until all fit or none can give.
// A column wider than the limit by itself is narrowed to it.
func (g *textGrid) squeeze(limit int) {
	for {
		total, widest := -gap, -1
		for i, w := range g.width {
			total += w + gap
			if !g.right[i] && w > minText && (widest < 0 || w > g.width[widest]) {
				widest = i
			}
		}
		if total <= limit || widest < 0 {
			break
		}
		g.width[widest] = max(minText, g.width[widest]-(total-limit))
	}
	for i := range g.width {
		g.width[i] = min(g.width[i], limit)
	}
}

func (g *textGrid) write(b *bufio.Writer, cols []int, o TextOptions) {
	line := func(row int) {
		var s strings.Builder
		for k, i := range cols {
			if k > 0 {
				s.WriteString(strings.Repeat(" ", gap))
			}
			text := cut(g.cells[i][row], g.width[i], g.dots)
			pad := strings.Repeat(" ", g.width[i]-columns(text))
			if g.right[i] {
				s.WriteString(pad + text)
			} else {
				s.WriteString(text + pad)
			}
		}
		b.WriteString(strings.TrimRight(s.String(), " ") + "\n")
	}
	line(0)
	if g.units {
		line(1)
	}
	total := -gap
	for _, i := range cols {
		total += g.width[i] + gap
	}
	rule := "─"
	if o.ASCII {
		rule = "-"
	}
	b.WriteString(strings.Repeat(rule, total) + "\n")
	for row := 2; row < len(g.cells[0]); row++ {
		line(row)
	}
}

// cut shortens text to so many terminal columns and marks it.
func cut(s string, limit int, dots string) string {
	if columns(s) <= limit {
		return s
	}
	if limit < columns(dots) {
		dots = ""
	}
	used := columns(dots)
	var b strings.Builder
	for _, r := range s {
		if used += runeColumns(r); used > limit {
			break
		}
		b.WriteRune(r)
	}
	return b.String() + dots
}

// columns is how many terminal columns text takes.
func columns(s string) int {
	n := 0
	for _, r := range s {
		n += runeColumns(r)
	}
	return n
}

func runeColumns(r rune) int {
	switch {
	case r < 0x300:
		return 1
	case unicode.In(r, unicode.Mn, unicode.Me, unicode.Cf):
		return 0
	}
	switch width.LookupRune(r).Kind() {
	case width.EastAsianWide, width.EastAsianFullwidth:
		return 2
	}
	return 1
}

// toASCII writes the signs of the trade in plain characters; what it does not
// know becomes ?.
func toASCII(s string) string {
	s = asciiFor.Replace(s)
	return strings.Map(func(r rune) rune {
		if r > unicode.MaxASCII {
			return '?'
		}
		return r
	}, s)
}

var asciiFor = strings.NewReplacer(
	"Å", "A", "\u212B", "A", "±", "+-", "−", "-", "–", "-", "—", "-", "…", "..", "×", "x", "·", ".", "≤", "<=", "≥", ">=", "≈", "~", "→", "->",
	"⁻", "^-", "⁺", "+", "²", "2", "³", "3", "¹", "1", "₀", "0", "₁", "1", "₂", "2", "“", `"`, "”", `"`, "‘", "'", "’", "'", "°", "deg",
	"α", "alpha", "β", "beta", "γ", "gamma", "δ", "delta", "Δ", "Delta", "ε", "epsilon", "ζ", "zeta", "η", "eta", "θ", "theta", "ι", "iota", "κ", "kappa",
	"λ", "lambda", "μ", "mu", "µ", "mu", "ν", "nu", "ξ", "xi", "ο", "omicron", "π", "pi", "ρ", "rho", "σ", "sigma", "τ", "tau", "υ", "upsilon", "φ", "phi", "χ", "chi", "ψ", "psi", "ω", "omega",
)
