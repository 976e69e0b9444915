// Package oops holds the one kind of error that is the user's to mend.
package oops

import (
	"errors"
	"fmt"
	"sort"
	"strings"
)

// A Mistake is something wrong in what the user wrote or gave: which file, where
// in it, what is wrong and how to mend it. Programs end with exit code 2 on it.
type Mistake struct{ File, Where, What, Fix string }

func (m *Mistake) Error() string {
	var parts []string
	for _, s := range []string{m.File, m.Where, m.What} {
		if s != "" {
			parts = append(parts, s)
		}
	}
	s := strings.Join(parts, ": ")
	if m.Fix != "" {
		s += "; " + m.Fix
	}
	return s
}

// Input returns a Mistake as an error. Empty parts are left out of the text.
func Input(file, where, what, fix string) error {
	return &Mistake{file, where, what, fix}
}

// Inputf is Input with a formatted What.
func Inputf(file, where, fix, format string, a ...any) error {
	return &Mistake{file, where, fmt.Sprintf(format, a...), fix}
}

// IsInput reports whether err is, or wraps, a Mistake.
func IsInput(err error) bool {
	var m *Mistake
	return errors.As(err, &m)
}

// Nearest returns up to n of the words that look most like word, best first:
// by Levenshtein distance without regard to case, ties in the order given.
// Words that share nothing with it are left out.
func Nearest(word string, among []string, n int) []string {
	type cand struct {
		s string
		d int
	}
	w := strings.ToLower(word)
	var c []cand
	for _, s := range among {
		d := distance(w, strings.ToLower(s))
		if d <= max(2, (len([]rune(w))+1)/2) {
			c = append(c, cand{s, d})
		}
	}
	sort.SliceStable(c, func(i, j int) bool { return c[i].d < c[j].d })
	var out []string
	for i := 0; i < len(c) && i < n; i++ {
		out = append(out, c[i].s)
	}
	return out
}

func distance(a, b string) int {
	x, y := []rune(a), []rune(b)
	row := make([]int, len(y)+1)
	for j := range row {
		row[j] = j
	}
	for i := range x {
		diag := row[0]
		row[0] = i + 1
		for j := range y {
			cost := diag
			if x[i] != y[j] {
				cost++
			}
			diag = row[j+1]
			row[j+1] = min(cost, row[j+1]+1, row[j]+1)
		}
	}
	return row[len(y)]
}
