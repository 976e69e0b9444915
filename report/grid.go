package report

import "strings"

// A grid is a table on the terminal. Each letter of align is one column: l left,
// r right, n numbers (aligned at ±, + or …), f remarks; there is at most one f.
//
// No number is ever cut. Where the page is too narrow the remarks wrap, then
// stand below their row, and at last each row becomes a sentence.
type grid struct {
	indent int
	align  string
	head   []string
	rows   [][]cell
}

const (
	gridGap      = 2
	leastRemarks = 26 // columns below which remarks go under their row
	mostLines    = 3  // of a remark, above which they go there too
)

func (g *grid) add(cells ...cell) { g.rows = append(g.rows, cells) }

// used drops columns in which no row has anything, and cleans all text.
func (p *page) used(g *grid) *grid {
	out := &grid{indent: g.indent, rows: make([][]cell, len(g.rows))}
	for c := range g.align {
		empty := true
		for _, r := range g.rows {
			empty = empty && strings.TrimSpace(value(r, c).text) == ""
		}
		if empty {
			continue
		}
		out.align += g.align[c : c+1]
		out.head = append(out.head, p.clean(value(g.head, c)))
		for i, r := range g.rows {
			x := value(r, c)
			x.text = p.clean(x.text)
			out.rows[i] = append(out.rows[i], x)
		}
	}
	return out
}

// A layout is the widths of a grid's columns; left is that of the part of a
// number before its error.
type layout struct {
	wide, left []int
	flex       int  // column of the remarks, −1 none
	below      bool // remarks stand under their row
}

// lay finds the widths, and whether the grid fits into room columns at all.
func lay(g *grid, room int) (layout, bool) {
	n := len(g.align)
	l := layout{wide: make([]int, n), left: make([]int, n), flex: strings.IndexByte(g.align, 'f')}
	total := gridGap * (n - 1)
	for c := range n {
		right := 0
		for _, r := range g.rows {
			if g.align[c] == 'n' {
				a, b := split(r[c].text)
				l.left[c], right = max(l.left[c], columns(a)), max(right, columns(b))
				l.wide[c] = l.left[c] + right
			} else {
				l.wide[c] = max(l.wide[c], columns(r[c].text))
			}
		}
		l.wide[c] = max(l.wide[c], columns(g.head[c]))
		total += l.wide[c]
	}
	if total <= room {
		return l, true
	}
	if l.flex < 0 {
		return l, false
	}
	natural := l.wide[l.flex]
	if left := natural - (total - room); left >= min(natural, leastRemarks) && tallest(g, l.flex, left) <= mostLines {
		l.wide[l.flex] = left
		return l, true
	}
	l.below = true
	return l, total-natural-gridGap <= room
}

// tallest is the number of lines that the longest cell of a column wraps to.
func tallest(g *grid, c, wide int) int {
	most := 0
	for _, r := range g.rows {
		most = max(most, len(wrap(r[c].text, wide)))
	}
	return most
}

// grid writes a table no wider than the page.
func (p *page) grid(g *grid) {
	g = p.used(g)
	if len(g.rows) == 0 {
		return
	}
	l, ok := lay(g, p.o.Width-g.indent)
	if !ok {
		for _, r := range g.rows {
			p.sentence(g, r)
		}
		return
	}
	if strings.Join(g.head, "") != "" {
		head := make([]cell, len(g.head))
		for c := range head {
			head[c] = cell{g.head[c], faint}
			if g.align[c] == 'n' { // centred on the column of the ±
				pad := min(l.left[c]-columns(g.head[c])/2, l.wide[c]-columns(g.head[c]))
				head[c].text = strings.Repeat(" ", max(pad, 0)) + g.head[c]
			}
		}
		p.row(g, l, head, true)
	}
	for _, r := range g.rows {
		p.row(g, l, r, false)
	}
}

func (p *page) row(g *grid, l layout, cells []cell, head bool) {
	remark := []string{""}
	if l.flex >= 0 && !l.below {
		remark = wrap(cells[l.flex].text, l.wide[l.flex])
	}
	for i := range remark {
		line := strings.Repeat(" ", g.indent)
		blank := 0 // columns of blanks that wait for something to stand after them
		for c := range g.align {
			if c == l.flex && l.below {
				continue
			}
			if c > 0 {
				blank += gridGap
			}
			s := ""
			switch {
			case c == l.flex:
				s = remark[i]
			case i == 0:
				s = cells[c].text
			}
			s = strings.TrimRight(s, " ")
			if s == "" {
				blank += l.wide[c]
				continue
			}
			lead := 0
			switch {
			case g.align[c] == 'r':
				lead = l.wide[c] - columns(s)
			case g.align[c] == 'n' && !head:
				a, _ := split(s)
				lead = l.left[c] - columns(a)
			}
			lead = max(lead, 0)
			line += strings.Repeat(" ", blank+lead) + p.paint(s, cells[c].tone)
			blank = max(l.wide[c]-lead-columns(s), 0)
		}
		p.b.WriteString(strings.TrimRight(line, " ") + "\n")
	}
	if l.below && !head && cells[l.flex].text != "" {
		p.para(strings.Repeat(" ", g.indent+4), cells[l.flex].text, cells[l.flex].tone)
	}
}

// sentence writes a row as "first: head value, head value; remarks".
func (p *page) sentence(g *grid, cells []cell) {
	var parts []string
	t := normal
	for c := 1; c < len(cells); c++ {
		if cells[c].text == "" {
			continue
		}
		if cells[c].tone != normal {
			t = cells[c].tone
		}
		if g.align[c] == 'f' {
			parts = append(parts, cells[c].text)
			continue
		}
		parts = append(parts, strings.TrimSpace(g.head[c]+" "+cells[c].text))
	}
	p.para(strings.Repeat(" ", g.indent), cells[0].text+": "+strings.Join(parts, ", "), t)
}

// split parts a number from its error: "48.6" and " ± 0.5".
func split(s string) (a, b string) {
	at := len(s)
	for _, sep := range []string{" ± ", " +", " … ", " .. "} {
		if i := strings.Index(s, sep); i >= 0 && i < at {
			at = i
		}
	}
	return s[:at], s[at:]
}
