package report

import (
	"bytes"
	"encoding/json"
	"math"
	"strings"
	"testing"

	"lacuna/atomic"
	"lacuna/measure"
	"lacuna/spectrum"
	"lacuna/spectrum/continuum"
	"lacuna/spectrum/frame"
	"lacuna/survey"
)

// inspected is an invented file of two orders, one without an audit.
func inspected() (*spectrum.Spectrum, []Audit) {
	order := func(n int, lo, hi float64, pixels int) spectrum.Segment {
		s := spectrum.Segment{Order: n, Medium: frame.Air, MediumBy: "header", Frame: frame.Topocentric, FrameBy: "header", Unit: "ADU",
			Shift: []frame.Applied{{Keyword: "HELICOR", To: frame.Heliocent, V: -21.437}}, Resolution: 64880}
		for i := range pixels {
			s.Wave = append(s.Wave, lo+(hi-lo)*float64(i)/float64(pixels-1))
			s.Flux, s.Err, s.Mask = append(s.Flux, 1), append(s.Err, 0.01), append(s.Mask, 0)
		}
		s.Mask[3], s.Mask[4] = spectrum.BadCosmic, spectrum.ZeroCount
		return s
	}
	s := &spectrum.Spectrum{Object: "Lantern 1", Layout: "linear image", Segments: []spectrum.Segment{order(87, 3918, 3962, 1800), order(88, 3960, 4004, 1800)},
		Notes: []string{"DATE-OBS is given twice; the first is used"}}
	s.Segments[1].Frame = frame.Unknown
	s.Segments[1].FrameBy = ""
	var st []continuum.Audited
	for i := range 9 {
		st = append(st, continuum.Audited{SN: 100 + 5*float64(i)})
	}
	return s, []Audit{{Noise: continuum.Noise{Ratio: 0.62, Rho: []float64{0.33, 0.02}}, Stretches: st, Lines: []string{"Ca II 3933.66"}},
		{Why: "no stretch of line-free continuum", Lines: []string{"Ca II 3968.47"}}}
}

// texts are all texts for the terminal.
func texts() map[string]func(o Options) ([]byte, error) {
	r, q := lantern1(), uv()
	write := func(f func(b *bytes.Buffer, o Options) error) func(o Options) ([]byte, error) {
		return func(o Options) ([]byte, error) {
			var b bytes.Buffer
			err := f(&b, o)
			return b.Bytes(), err
		}
	}
	return map[string]func(o Options) ([]byte, error){
		"fit": write(func(b *bytes.Buffer, o Options) error {
			r := lantern1()
			return FitText(b, r, o)
		}),
		"summary": write(func(b *bytes.Buffer, o Options) error { return Summary(b, everything(), o) }),
		"width":   write(func(b *bytes.Buffer, o Options) error { return WidthText(b, r.Result.Widths[1], frame.Heliocent, o) }),
		"limit":   write(func(b *bytes.Buffer, o Options) error { return WidthText(b, r.Result.Widths[4], frame.Heliocent, o) }),
		"growth":  write(func(b *bytes.Buffer, o Options) error { return GrowthText(b, []survey.Record{q, hard()[2]}, o) }),
		"batch": write(func(b *bytes.Buffer, o Options) error {
			return GrowthText(b, []survey.Record{q, everything()[2], hard()[2], r}, o)
		}),
		"depletion": write(func(b *bytes.Buffer, o Options) error {
			return DepletionText(b, q.Name, q.Result.Depletions, q.Result.Hydrogen, o)
		}),
		"lines": write(func(b *bytes.Buffer, o Options) error { return LinesText(b, someLines(), o) }),
		"inspect": write(func(b *bytes.Buffer, o Options) error {
			s, a := inspected()
			return InspectText(b, "lantern-1.fits", s, a, o)
		}),
		"nothing": write(func(b *bytes.Buffer, o Options) error {
			for _, f := range []func() error{
				func() error { return Summary(b, nil, o) },
				func() error { return Summary(b, []survey.Record{{}}, o) },
				func() error { return WidthText(b, measure.Width{}, frame.Unknown, o) },
				func() error { return GrowthText(b, nil, o) },
				func() error { return DepletionText(b, "", nil, nil, o) },
				func() error { return LinesText(b, nil, o) },
				func() error { return InspectText(b, "", &spectrum.Spectrum{}, nil, o) },
			} {
				if err := f(); err != nil {
					return err
				}
			}
			return nil
		}),
	}
}

// someLines are invented rows in the shape of the line table.
func someLines() []atomic.Line {
	return []atomic.Line{
		{Name: "Xx II 2345.68", Species: "Xx II", Wave: 2345.678, WaveAir: 2344.96, F: 0.0561, FErr: 0.0028, Gamma: 2.1e8, FSource: "AuthorC2010", WaveSource: "AuthorB1995", FStatus: atomic.Verified, WaveStatus: atomic.Memory, FSet: "default"},
		{Name: "Xx I 5891.58", Species: "Xx I", Alias: []string{"D2", "D₂"}, Wave: 5893.2, WaveAir: 5891.58, F: 0.641, Gamma: 6.16e7, FSource: "AuthorA2001", WaveSource: "AuthorA2001", FStatus: atomic.Computed, WaveStatus: atomic.Verified,
			FSet: "other", ELow: 16.4, Parts: make([]atomic.Part, 6), Missing: "isotope structure", File: "mine.csv"},
	}
}

// Every text fits the page and holds what it was given, whatever the options.
func TestTextsFitThePage(t *testing.T) {
	for name, f := range texts() {
		for _, width := range []int{40, 60, 72, 80, 100, 140} {
			for _, o := range []Options{{Width: width}, {Width: width, ASCII: true}, {Width: width, Color: true}} {
				b, err := f(o)
				if err != nil {
					t.Fatalf("%s: %v", name, err)
				}
				s := string(b)
				for i, line := range strings.Split(stripColour(s), "\n") {
					if n := columns(line); n > width {
						t.Errorf("%s at %+v: line %d takes %d columns: %q", name, o, i+1, n, line)
					}
					if strings.HasSuffix(line, " ") {
						t.Errorf("%s at %+v: line %d ends with a blank: %q", name, o, i+1, line)
					}
				}
				if !o.Color && strings.Contains(s, "\x1b") {
					t.Errorf("%s: colour without being asked", name)
				}
				for _, r := range s {
					if o.ASCII && r > 126 {
						t.Errorf("%s: %q in ASCII text", name, r)
						break
					}
				}
				if strings.Contains(s, "NaN") || strings.Contains(s, "Inf") {
					t.Errorf("%s: NaN or Inf in print:\n%s", name, s)
				}
			}
		}
	}
}

// A name may hold an escape sequence; it must not reach the terminal.
func TestControlCharactersAreStripped(t *testing.T) {
	r := lantern1()
	r.Name = "Lantern \x1b[31m\a1\r\n2"
	r.Result.Warnings = []string{"\x1b]0;title\a"}
	var b bytes.Buffer
	if err := Summary(&b, []survey.Record{r}, Options{}); err != nil {
		t.Fatal(err)
	}
	if strings.ContainsAny(b.String(), "\x1b\a\r") {
		t.Errorf("control characters in %q", b.String())
	}
}

// Numbers are never cut, however narrow the page.
func TestNumbersAreWhole(t *testing.T) {
	for _, width := range []int{40, 60, 80, 100} {
		b, err := texts()["summary"](Options{Width: width})
		if err != nil {
			t.Fatal(err)
		}
		s := strings.Join(strings.Fields(string(b)), " ")
		for _, want := range []string{"256.2 ± 1.5", "13.86 +0.10 −0.13", "> 12.59", "< 10.74", "−2.13 ± 0.08", "trace ion: needs ionization correction"} {
			if !strings.Contains(s, want) {
				t.Errorf("width %d: %q is not in the summary", width, want)
			}
		}
	}
}

func stripColour(s string) string {
	for {
		i := strings.IndexByte(s, 0x1b)
		if i < 0 {
			return s
		}
		j := strings.IndexByte(s[i:], 'm')
		s = s[:i] + s[i+j+1:]
	}
}

func TestTextsGolden(t *testing.T) {
	for name, f := range texts() {
		b, err := f(Options{})
		if err != nil {
			t.Fatal(err)
		}
		golden(t, name+".txt", b)
	}
	for name, o := range map[string]Options{"summary-ascii": {ASCII: true, Width: 80}, "summary-color": {Color: true}} {
		b, err := texts()["summary"](o)
		if err != nil {
			t.Fatal(err)
		}
		golden(t, name+".txt", b)
	}
}

func TestJSON(t *testing.T) {
	var b bytes.Buffer
	if err := JSON(&b, everything()); err != nil {
		t.Fatal(err)
	}
	var back []survey.Record
	if err := json.Unmarshal(b.Bytes(), &back); err != nil {
		t.Fatal(err)
	}
	if got, want := back[0].Result.Widths[0].W.X, everything()[0].Result.Widths[0].W.X; got != want {
		t.Errorf("W came back as %v, was %v", got, want)
	}
	if err := JSON(&b, math.NaN()); err == nil {
		t.Error("NaN written as JSON")
	}
}
