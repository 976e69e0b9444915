package main

import (
	"fmt"
	"io"
	"strings"
	"time"
)

// A row is one class at one S/N.
type row struct {
	snr    float64
	class  population
	trials []trial
}

// groups are the tables' parts: sightlines by the bounds of their poorest cloud.
var groups = []struct {
	name string
	bins []int
}{
	{"every cloud N/σ_N > 5", []int{narrow, firm}},
	{"every cloud N/σ_N > 5 and b/σ_b > 5", []int{firm}},
	{"a cloud with N/σ_N < 5", []int{faint}},
}

// views are what is said of a number in a class, one table each.
var tables = []struct {
	name string
	cell func(t tally) string
}{
	{"68 % intervals that hold the truth (%)", func(t tally) string { return t.in68.String() }},
	{"95 % intervals that hold the truth (%)", func(t tally) string { return t.in95.String() }},
	{"scatter over the Cramér–Rao bound: standard deviation, and half width of the middle 68.3 %", func(t tally) string {
		return fmt.Sprintf("%.2f ± %.2f, %.2f", t.scatter, t.scatterErr, t.core)
	}},
	{"bias over the Cramér–Rao bound: mean, and median", func(t tally) string {
		return fmt.Sprintf("%+.2f ± %.2f, %+.2f", t.bias, t.biasErr, t.middle)
	}},
	{"per mille beyond 5 times the bound, and without an error", func(t tally) string {
		return fmt.Sprintf("%.1f, %.1f", 1000*t.out, 1000*t.lost)
	}},
}

func (p part) String() string { return fmt.Sprintf("%.1f (%.1f–%.1f)", 100*p.x, 100*p.lo, 100*p.hi) }

// leastSightlines is how many a class must have to be shown.
const leastSightlines = 100

// print runs everything and prints the tables. Fits that could not be made have no place in
// them: they are an error, and listed.
func (st study) print(stdout, stderr io.Writer) error {
	var rows []row
	var refused []string
	for _, snr := range st.snr {
		for _, p := range st.chosen() {
			begin := time.Now()
			trials, no := st.trialsOf(p, snr)
			refused = append(refused, no...)
			rows = append(rows, row{snr, p, trials})
			c := count(trials, max(st.first(), column), narrow, firm)
			fmt.Fprintf(stderr, "S/N %g, %s: %d sightlines, %.0f s; %d with N/σ_N > 5, 68 %%: %s\n", snr, p, len(trials), time.Since(begin).Seconds(), c.sightlines, c.in68)
		}
	}
	for _, g := range groups {
		st.group(stdout, rows, g.name, g.bins)
	}
	if len(refused) > 0 {
		return fmt.Errorf("%d fits could not be made:\n%s", len(refused), strings.Join(refused, "\n"))
	}
	return nil
}

// first is the first number that the method scores, last the last.
func (st study) first() int {
	if st.how == searched {
		return total
	}
	return velocity
}

func (st study) last() int {
	if st.how == profiled || st.how == sampled {
		return total
	}
	return width
}

// group prints the tables of one group.
func (st study) group(out io.Writer, rows []row, name string, bins []int) {
	var kept []row
	for _, r := range rows {
		if count(r.trials, total, bins...).sightlines >= min(leastSightlines, st.trials) {
			kept = append(kept, r)
		}
	}
	if len(kept) == 0 {
		return
	}
	if st.how == searched {
		name = strings.Replace(strings.Replace(name, "every cloud N", "ΣN", 1), "a cloud with N/σ_N", "ΣN/σ_N", 1)
		name = strings.Replace(name, "ΣN/σ_N", "ΣN/σ", 1)
		if len(bins) == 1 && bins[0] == firm {
			return // the same as the first group
		}
	}
	for _, t := range tables {
		fmt.Fprintf(out, "**%s: %s**\n\n| S/N | separation/FWHM | τ₀ | sightlines | values |", strings.ToUpper(name[:1])+name[1:], t.name)
		for q := st.first(); q <= st.last(); q++ {
			fmt.Fprintf(out, " %s |", quantityNames[q])
		}
		fmt.Fprint(out, "\n|---|---|---|---|---|", strings.Repeat("---|", st.last()-st.first()+1), "\n")
		for _, r := range kept {
			c := count(r.trials, st.first(), bins...)
			fmt.Fprintf(out, "| %g | %s | %s | %d | %d |", r.snr, r.class.gapName, r.class.depthName, c.sightlines, c.values)
			for q := st.first(); q <= st.last(); q++ {
				fmt.Fprintf(out, " %s |", t.cell(count(r.trials, q, bins...)))
			}
			fmt.Fprintln(out)
		}
		fmt.Fprintln(out)
	}
}
