package budget_test

import (
	"encoding/json"
	"math"
	"reflect"
	"strings"
	"testing"

	"lacuna/budget"
)

func TestJSONRoundTrip(t *testing.T) {
	behind := budget.Number{X: -1.5, Shifts: []budget.Shift{{Cause: budget.Photon, D: 1}}}
	for _, tc := range []struct {
		n    budget.Number
		text string // "" not compared
	}{
		{budget.Number{X: 12.25, Shifts: []budget.Shift{{Cause: budget.FValue, Key: "f:CH 4300.31", D: -0.5}}, Flag: budget.Saturated | budget.Lower, Conf: 3},
			`{"x":12.25,"shifts":[{"cause":"f-value","key":"f:CH 4300.31","d":-0.5}],"flag":["lower","saturated"],"conf":3}`},
		{budget.Number{X: 1, Up: 0.25, Lo: math.Inf(1)}, `{"x":1,"up":0.25,"open":["lo"]}`},
		{budget.Number{X: 0}, `{"x":0}`},
		{budget.Number{X: 0.1 + 0.2, Up: 1e-300, Lo: math.Pi * 1e22}, ""},
		{budget.Number{X: 5, Flag: budget.Upper, Conf: 3, Behind: &behind, From: []budget.Ref{{Kind: "line", Key: "K I 7698.97", Note: "λ < 7700 Å"}}}, ""},
		{budget.Number{X: 3, Up: math.Inf(1), Lo: math.Inf(1), Flag: 1<<13 - 1}, ""},
	} {
		b, err := json.Marshal(tc.n)
		if err != nil {
			t.Fatal(err)
		}
		if tc.text != "" && string(b) != tc.text {
			t.Errorf("got  %s\nwant %s", b, tc.text)
		}
		var back budget.Number
		if err := json.Unmarshal(b, &back); err != nil {
			t.Fatal(err)
		}
		if !reflect.DeepEqual(back, tc.n) {
			t.Errorf("%s came back as %+v", b, back)
		}
		again, _ := json.Marshal(back)
		if string(again) != string(b) {
			t.Errorf("%s, the second time %s", b, again)
		}
	}
}

func TestJSONLeavesOutWhatIsNotFinite(t *testing.T) {
	b, err := json.Marshal(budget.Number{X: math.NaN(), Shifts: []budget.Shift{{Cause: budget.Photon, D: math.Inf(1)}}})
	if want := `{"shifts":[{"cause":"photon"}]}`; err != nil || string(b) != want {
		t.Fatalf("got %s, %v, want %s", b, err, want)
	}
	var n budget.Number
	if err := json.Unmarshal(b, &n); err != nil || !math.IsNaN(n.X) || !math.IsNaN(n.Shifts[0].D) {
		t.Errorf("came back as %+v, %v", n, err)
	}
}

func TestJSONRefuses(t *testing.T) {
	for _, n := range []budget.Number{
		{Flag: 1 << 20},
		{Shifts: []budget.Shift{{D: 1}}},
		{Shifts: []budget.Shift{{Cause: budget.Photon, Key: "\xff"}}},
		{From: []budget.Ref{{Key: "\xff.fits"}}},
	} {
		if b, err := json.Marshal(n); err == nil {
			t.Errorf("wrote %s", b)
		}
	}
	for _, s := range []string{`{"flag":["uper"]}`, `{"open":["x"]}`, `{"x":"1"}`, `{"shifts":[{"cause":"foton"}]}`, `[]`} {
		var n budget.Number
		if err := json.Unmarshal([]byte(s), &n); err == nil {
			t.Errorf("read %s", s)
		} else if strings.Contains(s, "uper") && !strings.Contains(err.Error(), `"upper"`) {
			t.Errorf("no suggestion in %v", err)
		}
	}
}

// Any text that reads as a Number writes, and what it writes reads back the same.
func FuzzJSON(f *testing.F) {
	f.Add([]byte(`{"x":1.5,"shifts":[{"cause":"photon","key":"a","d":1}],"up":1,"open":["lo"],"flag":["upper"],"conf":3,"behind":{"x":-1}}`))
	f.Add([]byte(`{}`))
	f.Fuzz(func(t *testing.T, b []byte) {
		var n budget.Number
		if json.Unmarshal(b, &n) != nil {
			return
		}
		one, err := json.Marshal(n)
		if err != nil {
			if strings.Contains(err.Error(), "is no cause") { // a shift without one
				return
			}
			t.Fatalf("read %q, cannot write it: %v", b, err)
		}
		var back budget.Number
		if err := json.Unmarshal(one, &back); err != nil {
			t.Fatal(err)
		}
		if two, _ := json.Marshal(back); string(two) != string(one) {
			t.Fatalf("%s, then %s", one, two)
		}
	})
}

func BenchmarkErr(b *testing.B) {
	ca, fe := lantern()
	n := budget.Combine([]float64{1, -1}, ca, fe)
	b.ReportAllocs()
	for b.Loop() {
		n.Err()
	}
}
