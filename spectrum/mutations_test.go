package spectrum_test

import (
	"bytes"
	"flag"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"testing"
	"time"

	"lacuna/internal/check"
	"lacuna/internal/oops"
	"lacuna/spectrum"
	"lacuna/spectrum/frame"
)

var (
	mutations    = flag.Int("mutations", 600, "how many damaged files TestMutations reads")
	mutationSeed = flag.Uint64("mutationseed", 1, "seed of the damage")
)

// A mutation damages a file in one way.
type mutation struct {
	name string
	text bool // for text files; else for FITS
	do   func(rng *rand.Rand, b []byte, heads [][2]int) []byte
}

// headers finds the bytes of all FITS headers.
func headers(b []byte) (out [][2]int) {
	for at := 0; at+80 <= len(b); {
		if !bytes.HasPrefix(b[at:], []byte("SIMPLE  =")) && !bytes.HasPrefix(b[at:], []byte("XTENSION=")) {
			at += 2880
			continue
		}
		end := at
		for end+80 <= len(b) && !bytes.HasPrefix(b[end:], []byte("END     ")) {
			end += 80
		}
		out = append(out, [2]int{at, min(end+80, len(b))})
		at = (end/2880 + 1) * 2880
	}
	return out
}

// place picks a byte of the headers, or of the data.
func place(rng *rand.Rand, b []byte, heads [][2]int, inHead bool) int {
	for {
		at := rng.IntN(len(b))
		if inHead && len(heads) > 0 {
			h := heads[rng.IntN(len(heads))]
			at = h[0] + rng.IntN(h[1]-h[0])
		}
		in := slices.ContainsFunc(heads, func(h [2]int) bool { return at >= h[0] && at < h[1] })
		if in == inHead || len(heads) == 0 {
			return at
		}
	}
}

// aCard picks the first byte of a card.
func aCard(rng *rand.Rand, heads [][2]int) int {
	h := heads[rng.IntN(len(heads))]
	return h[0] + 80*rng.IntN((h[1]-h[0])/80)
}

func digit(rng *rand.Rand, b []byte, at func() int) []byte {
	for range 1000 {
		if i := at(); b[i] >= '0' && b[i] <= '9' {
			b[i] = '0' + (b[i]-'0'+byte(1+rng.IntN(9)))%10
			break
		}
	}
	return b
}

var kinds = []mutation{
	{"a bit of the header", false, func(rng *rand.Rand, b []byte, h [][2]int) []byte {
		b[place(rng, b, h, true)] ^= 1 << rng.IntN(8)
		return b
	}},
	{"three bits of the header", false, func(rng *rand.Rand, b []byte, h [][2]int) []byte {
		for range 3 {
			b[place(rng, b, h, true)] ^= 1 << rng.IntN(8)
		}
		return b
	}},
	{"a bit of the data", false, func(rng *rand.Rand, b []byte, h [][2]int) []byte {
		b[place(rng, b, h, false)] ^= 1 << rng.IntN(8)
		return b
	}},
	{"eight bytes of the data", false, func(rng *rand.Rand, b []byte, h [][2]int) []byte {
		at := place(rng, b, h, false)
		for i := at; i < min(at+8, len(b)); i++ {
			b[i] = byte(rng.IntN(256))
		}
		return b
	}},
	{"cut off (FITS)", false, func(rng *rand.Rand, b []byte, h [][2]int) []byte { return b[:rng.IntN(len(b))] }},
	{"two cards swapped", false, func(rng *rand.Rand, b []byte, h [][2]int) []byte {
		i, j := aCard(rng, h), aCard(rng, h)
		a, c := bytes.Clone(b[i:i+80]), bytes.Clone(b[j:j+80])
		copy(b[i:], c)
		copy(b[j:], a)
		return b
	}},
	{"a card over another", false, func(rng *rand.Rand, b []byte, h [][2]int) []byte {
		copy(b[aCard(rng, h):], bytes.Clone(b[aCard(rng, h):][:80]))
		return b
	}},
	{"a card blanked", false, func(rng *rand.Rand, b []byte, h [][2]int) []byte {
		copy(b[aCard(rng, h):], strings.Repeat(" ", 80))
		return b
	}},
	{"a digit of the header", false, func(rng *rand.Rand, b []byte, h [][2]int) []byte {
		return digit(rng, b, func() int { return place(rng, b, h, true) })
	}},
	{"a bit", true, func(rng *rand.Rand, b []byte, _ [][2]int) []byte {
		b[rng.IntN(len(b))] ^= 1 << rng.IntN(8)
		return b
	}},
	{"a digit", true, func(rng *rand.Rand, b []byte, _ [][2]int) []byte {
		return digit(rng, b, func() int { return rng.IntN(len(b)) })
	}},
	{"cut off (text)", true, func(rng *rand.Rand, b []byte, _ [][2]int) []byte { return b[:rng.IntN(len(b))] }},
	{"two lines swapped", true, func(rng *rand.Rand, b []byte, _ [][2]int) []byte {
		l := bytes.Split(b, []byte("\n"))
		i, j := rng.IntN(len(l)), rng.IntN(len(l))
		l[i], l[j] = l[j], l[i]
		return bytes.Join(l, []byte("\n"))
	}},
	{"a line left out", true, func(rng *rand.Rand, b []byte, _ [][2]int) []byte {
		l := bytes.Split(b, []byte("\n"))
		i := rng.IntN(len(l))
		return bytes.Join(slices.Delete(l, i, i+1), []byte("\n"))
	}},
}

const (
	refused   = "refused"
	identical = "opened identical"
	flagged   = "opened flagged"
	restated  = "opened as restated"
	silent    = "WRONG AND SILENT"
)

// compareScales says what became of the wavelength scale of a damaged file: the
// wavelengths in the file's medium and frame, and those in vacuum at the Sun.
func compareScales(base, got *spectrum.Spectrum) string {
	same, refuses := true, false
	for k := range got.Segments {
		g := &got.Segments[k]
		at := slices.IndexFunc(base.Segments, func(b spectrum.Segment) bool { return partOf(g, &b) })
		if at < 0 {
			same = false
			break
		}
		b := &base.Segments[at]
		v, ok := motion(b)
		w, ok2 := motion(g)
		switch {
		case ok && ok2 && !(math.Abs(v-w) < 0.03), !ok && !sameShifts(g, b):
			same = false
		case ok && !ok2:
			refuses = true
		}
	}
	known := map[string]bool{}
	for _, n := range notes(base) {
		known[n] = true
	}
	switch {
	case same && !refuses:
		return identical
	case same: // it cannot be brought to the Sun any more, and says so when asked
		return flagged
	case slices.ContainsFunc(notes(got), func(n string) bool { return !known[n] }):
		return flagged
	}
	for k := range got.Segments {
		g, b := &got.Segments[k], &base.Segments[min(k, len(base.Segments)-1)]
		if g.Medium == frame.UnknownMedium && b.Medium != g.Medium || g.Frame == frame.Unknown && b.Frame != g.Frame {
			return flagged // it cannot be used before the user says what it is
		}
	}
	return silent
}

// motion returns the velocity that takes the file's wavelengths to the Sun's frame
// in vacuum; false where that is refused.
func motion(s *spectrum.Segment) (float64, bool) {
	c := *s
	c.Wave, c.Shift, c.Notes = slices.Clone(s.Wave), slices.Clone(s.Shift), nil
	if c.ToVacuum(frame.Ciddor1996) != nil {
		return 0, false
	}
	vacuum := c.Wave[0]
	if c.ToFrame(frame.Heliocent) != nil {
		return 0, false
	}
	return frame.C * (c.Wave[0]/vacuum - 1), true
}

// sameShifts reports whether the corrections of g are among those of b.
func sameShifts(g, b *spectrum.Segment) bool {
	for _, x := range g.Shift {
		if !slices.ContainsFunc(b.Shift, func(y frame.Applied) bool {
			return x.Keyword == y.Keyword && x.Done == y.Done && math.Abs(x.V-y.V) < 0.03
		}) {
			return false
		}
	}
	return true
}

// notes are all words of warning: also the rule of thumb by which medium or frame
// were decided, which is said with every spectrum.
func notes(s *spectrum.Spectrum) []string {
	out := slices.Clone(s.Notes)
	for k := range s.Segments {
		out = append(out, s.Segments[k].Notes...)
		for _, by := range []string{s.Segments[k].MediumBy, s.Segments[k].FrameBy} {
			if strings.HasPrefix(by, "rule") {
				out = append(out, by)
			}
		}
	}
	return out
}

// partOf reports whether all good wavelengths of g are wavelengths of b, to a tenth
// of a pixel, in the same medium and frame.
func partOf(g, b *spectrum.Segment) bool {
	if g.Medium != b.Medium || g.Frame != b.Frame {
		return false
	}
	for i, w := range g.Wave {
		if g.Mask[i].Bad() {
			continue
		}
		j, _ := slices.BinarySearch(b.Wave, w)
		near := math.Inf(1)
		for _, k := range []int{j - 1, j} {
			if k >= 0 && k < len(b.Wave) {
				near = min(near, math.Abs(b.Wave[k]-w))
			}
		}
		j = max(1, min(j, len(b.Wave)-1))
		if !(near < 0.1*(b.Wave[j]-b.Wave[j-1])) {
			return false
		}
	}
	return true
}

// TestMutations damages the samples in every way of kinds, in turn, and reads what
// is left: no panic, no hang, no large allocation, and no wavelength scale that is
// neither refused, nor the old one, nor said to be doubtful, nor what the bytes now
// say. More of them:
//
//	go test ./spectrum -run TestMutations -v -mutations 10000
func TestMutations(t *testing.T) {
	dir := check.Shared(t, "formats/samples")
	names, _ := filepath.Glob(filepath.Join(dir, "[0-9]*"))
	rng := rand.New(rand.NewPCG(20310305, *mutationSeed))
	count := map[string]map[string]int{}
	whole := map[string]*spectrum.Spectrum{}
	path := filepath.Join(t.TempDir(), "mutant")
	var most uint64
	for n := range *mutations {
		name := names[n%len(names)]
		original, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		heads := headers(original)
		var fit []mutation
		for _, m := range kinds {
			if m.text == (len(heads) == 0) {
				fit = append(fit, m)
			}
		}
		m := fit[n/len(names)%len(fit)]
		mutant := m.do(rng, bytes.Clone(original), heads)
		if err := os.WriteFile(path, mutant, 0o644); err != nil {
			t.Fatal(err)
		}
		base := whole[name]
		if base == nil {
			if base, err = spectrum.Read(name, spectrum.Options{}); err != nil {
				t.Fatal(err)
			}
			whole[name] = base
		}
		what := fmt.Sprintf("mutation %d (%s, %s)", n, filepath.Base(name), m.name)
		hang := time.AfterFunc(time.Minute, func() { panic(what + " hangs") })
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		got, err := spectrum.Read(path, spectrum.Options{})
		runtime.ReadMemStats(&after)
		hang.Stop()
		if used := after.TotalAlloc - before.TotalAlloc; used > most {
			if most = used; most > 1<<30 {
				t.Errorf("%s: %d MB allocated", what, used>>20)
			}
		}
		result := refused
		if err == nil {
			result = compareScales(base, got)
			for k := range got.Segments {
				if err := got.Segments[k].Check(); err != nil {
					t.Errorf("%s: %v", what, err)
				}
			}
		} else if !oops.IsInput(err) {
			t.Errorf("%s: not an error of the input: %v", what, err)
		}
		if result == silent && says(filepath.Base(name), mutant, got) {
			result = restated
		}
		if result == silent {
			g, b := &got.Segments[0], &base.Segments[0]
			t.Errorf("%s: %s", what, describeSilent(g, b))
			if err := os.WriteFile(filepath.Join(os.TempDir(), fmt.Sprintf("mutant-%d", n)), mutant, 0o644); err == nil {
				t.Logf("kept as %s", filepath.Join(os.TempDir(), fmt.Sprintf("mutant-%d", n)))
			}
		}
		key := m.name
		if count[key] == nil {
			count[key] = map[string]int{}
		}
		count[key][result]++
	}
	var out strings.Builder
	fmt.Fprintf(&out, "%-26s", "damage")
	classes := []string{refused, identical, flagged, restated, silent}
	for _, c := range classes {
		fmt.Fprintf(&out, " %18s", c)
	}
	for _, m := range kinds {
		fmt.Fprintf(&out, "\n%-26s", m.name)
		for _, c := range classes {
			fmt.Fprintf(&out, " %18d", count[m.name][c])
		}
	}
	t.Logf("%d damaged files, at most %d kB allocated for one:\n%s", *mutations, most>>10, out.String())
}

func describeSilent(g, b *spectrum.Segment) string {
	return fmt.Sprintf("%.3f to %.3f Å in %s, %s, corrections %v; before %.3f to %.3f in %s, %s, %v", g.Wave[0], g.Wave[len(g.Wave)-1], g.Medium, g.Frame, g.Shift,
		b.Wave[0], b.Wave[len(b.Wave)-1], b.Medium, b.Frame, b.Shift)
}
