package report

import (
	"fmt"
	"io"
	"sort"
	"strings"

	"lacuna/atomic"
)

// LinesText writes a table of transitions with what their numbers rest on.
func LinesText(w io.Writer, ls []atomic.Line, o Options) error {
	p := newPage(o)
	g := &grid{indent: 0, align: "llrrrrrllf", head: []string{"line", "alias", "vacuum Å", "air Å", "f", "±", "γ (s⁻¹)", "f, λ", "source of f", "remarks"}}
	memory := 0
	for _, l := range ls {
		air, gamma, alias, ferr := "", "", "", ""
		if l.WaveAir > 0 {
			air = fmt.Sprintf("%.4f", l.WaveAir)
		}
		if l.Gamma > 0 {
			gamma = fmt.Sprintf("%.2e", l.Gamma)
		}
		if len(l.Alias) > 0 {
			alias = l.Alias[0]
		}
		if l.FErr > 0 {
			ferr = fmt.Sprintf("%.0f %%", 100*l.FErr/l.F)
		}
		t := normal
		if l.FStatus == atomic.Memory || l.WaveStatus == atomic.Memory {
			memory++
			t = warn
		}
		g.add(plainCell(l.Name), plainCell(alias), plainCell(fmt.Sprintf("%.4f", l.Wave)), plainCell(air), plainCell(fmt.Sprintf("%.4g", l.F)), plainCell(ferr),
			plainCell(gamma), cell{statusText(l), t}, plainCell(l.FSource), plainCell(lineRemarks(l)))
	}
	if len(ls) == 0 {
		p.para("", "no lines", normal)
		return p.writeTo(w)
	}
	p.grid(g)
	p.blank()
	p.para("", fmt.Sprintf("%s, of these %d with a value from memory (m). f, λ: status of the oscillator strength and of the wavelength: v verified, c computed, m memory, u user's own.",
		count(len(ls), "line"), memory), faint)
	for _, s := range sources(ls) {
		p.para("  ", s, faint)
	}
	return p.writeTo(w)
}

// statusText is the status of f and of the wavelength in one letter each.
func statusText(l atomic.Line) string {
	letter := func(s atomic.Status) string {
		if s == "" {
			return "?"
		}
		return string(s[:1])
	}
	return letter(l.FStatus) + " " + letter(l.WaveStatus)
}

func lineRemarks(l atomic.Line) string {
	var parts []string
	if l.Level != "" && !strings.Contains(l.Name, l.Level) {
		parts = append(parts, "level "+l.Level)
	}
	if l.ELow > 0 {
		parts = append(parts, fmt.Sprintf("from %.1f cm⁻¹", l.ELow))
	}
	if l.FSet != "" && l.FSet != "default" {
		parts = append(parts, "f set "+l.FSet)
	}
	if len(l.Parts) > 0 {
		parts = append(parts, count(len(l.Parts), "part")+" of hyperfine or isotope structure")
	}
	if l.File != "" {
		parts = append(parts, "from "+l.File)
	}
	if l.Missing != "" {
		parts = append(parts, "missing: "+l.Missing)
	}
	return strings.Join(parts, "; ")
}

// sources lists the citations behind the keys of the lines, in order of the keys.
func sources(ls []atomic.Line) []string {
	cite := map[string]bool{}
	for _, l := range ls {
		cite[l.FSource] = true
		cite[l.WaveSource] = true
	}
	keys := make([]string, 0, len(cite))
	for k := range cite {
		if k != "" {
			keys = append(keys, k)
		}
	}
	sort.Strings(keys)
	for i, k := range keys {
		keys[i] = citation(k)
	}
	return keys
}

// citation is a key with the work behind it.
func citation(key string) string {
	if s, ok := atomic.Cite(key); ok {
		return key + ": " + s.Citation
	}
	return key
}
