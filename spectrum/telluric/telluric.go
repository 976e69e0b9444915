package telluric

import (
	"embed"
	"encoding/csv"
	"fmt"
	"slices"
	"sort"
	"strconv"
	"strings"
	"sync"

	"lacuna/atomic"
	"lacuna/spectrum/frame"
)

// A Strength is a class of depth, for R = 44,000, airmass near 1 and usual
// humidity. Water varies by a factor of five and more between nights.
type Strength string

// The classes of depth.
const (
	Weak      Strength = "weak"      // below 10 %
	Medium    Strength = "medium"    // 10 to 30 %
	Strong    Strength = "strong"    // 30 to 55 %
	Saturated Strength = "saturated" // deeper: black when resolved
)

// Rank orders the classes: 1 for weak to 4 for saturated, 0 for an unknown one.
func (s Strength) Rank() int {
	return slices.Index([]Strength{Weak, Medium, Strong, Saturated}, s) + 1
}

// A Line is one telluric line.
type Line struct {
	Name     string // "H2O 5885.97", "O2 A PQ(21) 7664.87"
	Molecule string // "H2O", "O2"
	Wave     float64
	WaveAir  float64 // Å
	WaveErr  float64 // 1σ, Å
	Strength Strength
	Source   string // key of Cite
	Status   atomic.Status
	Note     string
}

// A Range is a stretch of spectrum where the air absorbs.
type Range struct {
	Molecule     string
	Lo, Hi       float64 // vacuum Å
	LoAir, HiAir float64 // Å
	Strength     Strength
	Broad        bool   // structure wider than lines, or lines not resolved
	Source       string // key of Cite
	Status       atomic.Status
	Note         string
}

//go:embed *.csv
var tables embed.FS

// rows reads one of our own tables; a fault in it is ours, so it panics, and the
// tests read every table.
func rows(name string) []map[string]string {
	f, err := tables.Open(name)
	if err != nil {
		panic("telluric: " + err.Error())
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	all, err := r.ReadAll()
	if err != nil {
		panic("telluric: " + name + ": " + err.Error())
	}
	var out []map[string]string
	for _, rec := range all[1:] {
		m := map[string]string{}
		for i, k := range all[0] {
			m[k] = rec[i]
		}
		out = append(out, m)
	}
	return out
}

func number(name string, m map[string]string, col string) float64 {
	x, err := strconv.ParseFloat(m[col], 64)
	if err != nil {
		panic(fmt.Sprintf("telluric: %s: %s %q is not a number", name, col, m[col]))
	}
	return x
}

var sources = sync.OnceValue(func() map[string]string {
	out := map[string]string{}
	for _, m := range rows("sources.csv") {
		out[m["key"]] = m["citation"] + " (" + m["read"] + ")"
	}
	return out
})

// Cite returns what a source key stands for.
func Cite(key string) (string, bool) {
	s, ok := sources()[key]
	return s, ok
}

// held stops a row without a known source, class or status.
func held(where, src string, class Strength, status atomic.Status) {
	_, ok := Cite(src)
	known := status == atomic.Verified || status == atomic.Computed || status == atomic.Memory
	if !ok || class.Rank() == 0 || !known {
		panic(fmt.Sprintf("telluric: %s: source %q, class %q or status %q is unknown", where, src, class, status))
	}
}

var lines = sync.OnceValue(func() []Line {
	out := oxygen()
	for _, m := range rows("water.csv") {
		l := Line{Molecule: m["molecule"], WaveAir: number("water.csv", m, "lambda_air_A"), WaveErr: number("water.csv", m, "lambda_err_A"),
			Strength: Strength(m["strength"]), Source: m["src"], Status: atomic.Status(m["status"]), Note: m["note"]}
		held("water.csv: "+m["lambda_air_A"], l.Source, l.Strength, l.Status)
		l.Wave = frame.ToVacuum(l.WaveAir, frame.Ciddor1996)
		l.Name = fmt.Sprintf("%s %.2f", l.Molecule, l.WaveAir)
		out = append(out, l)
	}
	sort.SliceStable(out, func(i, j int) bool { return out[i].Wave < out[j].Wave })
	return out
})

// Lines returns all telluric lines, ascending in wavelength.
func Lines() []Line { return slices.Clone(lines()) }

// Near returns the lines with lo ≤ Wave ≤ hi, vacuum Å in the observer's frame,
// ascending.
func Near(lo, hi float64) []Line {
	if !(lo <= hi) {
		return nil
	}
	l := lines()
	i := sort.Search(len(l), func(i int) bool { return l[i].Wave >= lo })
	j := sort.Search(len(l), func(i int) bool { return l[i].Wave > hi })
	return slices.Clone(l[i:j])
}

var ranges = sync.OnceValue(func() []Range {
	var out []Range
	for _, m := range rows("ranges.csv") {
		r := Range{Molecule: m["molecule"], LoAir: number("ranges.csv", m, "from_air_A"), HiAir: number("ranges.csv", m, "to_air_A"),
			Strength: Strength(m["strength"]), Broad: m["form"] == "broad", Source: m["src"], Status: atomic.Status(m["status"]), Note: m["note"]}
		held("ranges.csv: "+m["from_air_A"], r.Source, r.Strength, r.Status)
		r.Lo, r.Hi = frame.ToVacuum(r.LoAir, frame.Ciddor1996), frame.ToVacuum(r.HiAir, frame.Ciddor1996)
		out = append(out, r)
	}
	return out
})

// Ranges returns the stretches of spectrum where the air absorbs, ascending in
// Lo; they overlap. Inside one, a window without a tabulated line need not be
// clean: see Note.
func Ranges() []Range {
	out := slices.Clone(ranges())
	sort.SliceStable(out, func(i, j int) bool { return out[i].Lo < out[j].Lo })
	return out
}

// Covering returns the ranges that overlap lo to hi (vacuum Å), ascending in Lo.
func Covering(lo, hi float64) []Range {
	return slices.DeleteFunc(Ranges(), func(r Range) bool { return !(r.Lo <= hi && r.Hi >= lo) })
}

// String names the range for a report.
func (r Range) String() string {
	form := "lines"
	if r.Broad {
		form = "broad structure"
	}
	return strings.TrimSpace(fmt.Sprintf("%s %s, %.0f to %.0f Å, up to %s", r.Molecule, form, r.LoAir, r.HiAir, r.Strength))
}
