package report

import (
	"fmt"
	"math"
	"reflect"
	"testing"

	"gonum.org/v1/plot/vg"

	"lacuna/atomic"
	"lacuna/measure"
)

func TestRuns(t *testing.T) {
	for _, tc := range []struct {
		in   string
		want []run
	}{
		{"km s^{−1}", []run{{"km s", 0}, {"−1", 1}}},
		{"N_{a}(v) 10^{11}", []run{{"N", 0}, {"a", -1}, {"(v) 10", 0}, {"11", 1}}},
		{"a_b^c {d}", []run{{"a_b^c {d}", 0}}},
		{plain("x^{2}_{3}"), []run{{"x^{2}_{3}", 0}}},
		{"open^{1", []run{{"open", 0}, {"1", 1}}},
		{"", nil},
	} {
		if got := runs(tc.in); !reflect.DeepEqual(got, tc.want) {
			t.Errorf("runs(%q) = %v, want %v", tc.in, got, tc.want)
		}
	}
}

// What a font lacks is shown as a question mark and not left out: in Liberation
// Sans 2.1 the superscript minus and the Sun's sign are such (seen by drawing).
func TestPlainNeverLosesLetters(t *testing.T) {
	if got := plain("s⁻¹ ☉ Å λ ²"); got != "s?¹ ? Å λ ²" {
		t.Errorf("%q", got)
	}
}

// An index after a power stands below it, and the width is that of the longer.
func TestPowerOverIndex(t *testing.T) {
	f := sans(7, 0)
	out, wide := set("1^{+0.3}_{−0.25}", f)
	if out[1].x != out[2].x || !(out[1].up > 0) || !(out[2].up < 0) {
		t.Errorf("power at %v, %v; index at %v, %v", out[1].x, out[1].up, out[2].x, out[2].up)
	}
	face, _ := out[2].at(f)
	if want := out[2].x + face.Width("−0.25"); wide != want {
		t.Errorf("width %v, want %v", wide, want)
	}
}

// Steps of an even grid, of a gap and of a masked pixel, worked out by hand.
func TestOutline(t *testing.T) {
	v := []float64{0, 1, 2, 5, 6}
	y := []float64{10, 11, 12, 13, 14}
	ox, oy := outline(v, y, func(i int) bool { return i != 1 })
	nan := math.NaN()
	wantX := []float64{-0.5, 0.5, nan, 1.5, 2.5, nan, 4.5, 5.5, 5.5, 6.5}
	wantY := []float64{10, 10, nan, 12, 12, nan, 13, 13, 14, 14}
	if fmt.Sprint(ox) != fmt.Sprint(wantX) || fmt.Sprint(oy) != fmt.Sprint(wantY) {
		t.Errorf("%v\n%v, want\n%v\n%v", ox, oy, wantX, wantY)
	}
	if got := spans(v, func(i int) bool { return i != 1 }); fmt.Sprint(got) != "[[-0.5 0.5] [1.5 2.5] [4.5 6.5]]" {
		t.Errorf("spans %v", got)
	}
}

func TestTicks(t *testing.T) {
	for _, tc := range []struct {
		lo, hi float64
		n      int
		want   string
	}{
		{-52, 47, 6, "−40 −20 0 20 40"},
		{-0.12, 1.15, 4, "0.0 0.5 1.0"},
		{0.937, 1.063, 4, "0.95 1.00 1.05"},
		{14.2, 18.03, 6, "15 16 17 18"},
		{1e-9, 5e-9, 5, "0.000000001 0.000000002 0.000000003 0.000000004 0.000000005"},
	} {
		got := ""
		last := math.Inf(-1)
		for _, k := range ticks(tc.lo, tc.hi, tc.n, 0) {
			if !(k.At > last) || k.At < tc.lo-1e-9 || k.At > tc.hi+1e-9 {
				t.Errorf("tick at %v after %v", k.At, last)
			}
			last = k.At
			if k.Label != "" {
				got += " " + k.Label
			}
		}
		if got != " "+tc.want {
			t.Errorf("ticks(%v, %v): %s, want %s", tc.lo, tc.hi, got, tc.want)
		}
	}
	if ticks(math.NaN(), 1, 4, 0) != nil || ticks(1, 1, 4, 0) != nil {
		t.Error("ticks on no range")
	}
}

func TestNiceBelow(t *testing.T) {
	for _, tc := range []struct{ s, want float64 }{{1, 1}, {1.99, 1}, {2, 2}, {4.99, 2}, {5, 5}, {9.99, 5}, {10, 10}, {3e11, 2e11}, {0.07, 0.05}} {
		x, m, e := niceBelow(tc.s)
		if !(math.Abs(x/tc.want-1) <= 1e-12) || !(math.Abs(float64(m)*math.Pow(10, float64(e))/x-1) <= 1e-12) { // rounding of powers of ten
			t.Errorf("niceBelow(%v) = %v, %v e%v; want %v", tc.s, x, m, e, tc.want)
		}
	}
}

// Names of blends never lie on each other or on another's tick, stay inside the
// panel, and a feature outside the panel is left out.
func TestPlaceMarks(t *testing.T) {
	const wave, lo, hi = 5000.0, -50.0, 50.0
	const wide = vg.Length(200)
	var fs []measure.Feature
	for i := range 9 {
		fs = append(fs, measure.Feature{Name: fmt.Sprintf("Fe I 500%d.12", i), Wave: wave * (1 + (float64(i)*11-48)/atomic.C), Range: [2]float64{-2, 2}})
	}
	fs = append(fs, measure.Feature{Name: "outside", Wave: wave * (1 + 90/atomic.C), Range: [2]float64{-2, 2}})
	far := measure.Feature{Name: "wide", Wave: wave * (1 + 400/atomic.C), Range: [2]float64{-450, 450}}
	marks, _ := placeMarks(append(fs, far), wave, lo, hi, wide)
	if last := marks[len(marks)-1]; last.name != "wide →" || !last.outside || last.v != hi {
		t.Errorf("a feature that reaches in from outside: %+v", last)
	}
	marks, rows := placeMarks(fs, wave, lo, hi, wide)
	if len(marks) != 9 || rows < 2 || rows > maxRows {
		t.Fatalf("%d marks in %d rows", len(marks), rows)
	}
	sty := letters(textSize, ink, 0, 0)
	named := 0
	for i, m := range marks {
		if !(math.Abs(m.v-(float64(i)*11-48)) <= 1e-6) { // km/s; wave(1+v/c) back to v
			t.Errorf("mark %d at %v km/s", i, m.v)
		}
		if m.row < 0 {
			continue
		}
		named++
		half := width(sty, m.name) / 2
		if m.centre < half || m.centre > wide-half {
			t.Errorf("%s leaves the panel", m.name)
		}
		for _, o := range marks[:i] {
			if o.row == m.row && math.Abs(float64(o.centre-m.centre)) < float64(half+width(sty, o.name)/2) {
				t.Errorf("%s lies on %s", m.name, o.name)
			}
		}
	}
	if named < 5 { // three rows of 200 pt hold at least five names of 45 pt
		t.Errorf("%d names of 9 found room", named)
	}
}
