package spectrum

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"lacuna/internal/oops"
	"lacuna/spectrum/fits"
	"lacuna/spectrum/frame"
)

// Each function against the polynomial that it is, written out: T₃ = 4n³ − 3n,
// P₃ = (5n³ − 3n)/2 and lower ones (Abramowitz & Stegun 1964, 22.3); the cubic
// B-spline sums to 6 and its coefficients in steps of 1 make a straight line of
// slope 6 a piece; between two table values lies the straight line.
func TestDispersionFunctions(t *testing.T) {
	n := func(p float64) float64 { return (2*p - 101) / 99 } // domain 1 to 100
	for _, tc := range []struct {
		name, text string
		want       func(p float64) float64
	}{
		{"linear", "1 88 0 5000 0.25 100 0 1 2", func(p float64) float64 { return 5000 + 0.25*(p-1) }},
		{"linear, seven numbers", "1 88 0 5000 0.25 100 0", func(p float64) float64 { return 5000 + 0.25*(p-1) }},
		{"limits unknown", "1 88 0 5000 2.5D-1 100. 0. INDEF INDEF", func(p float64) float64 { return 5000 + 0.25*(p-1) }},
		{"log10, the factor outside", "1 88 1 3.7 1e-5 100 1e-4 1 2", func(p float64) float64 { return math.Pow(10, 3.7+1e-5*(p-1)) / 1.0001 }},
		{"Chebyshev", "1 88 2 0 0 100 0 1 2 1 0 1 4 1 100 5000 10 -3 0.5", func(p float64) float64 {
			x := n(p)
			return 5000 + 10*x - 3*(2*x*x-1) + 0.5*(4*x*x*x-3*x)
		}},
		{"Legendre", "1 88 2 0 0 100 0 1 2 1 0 2 4 1 100 5000 10 -3 0.5", func(p float64) float64 {
			x := n(p)
			return 5000 + 10*x - 3*(3*x*x-1)/2 + 0.5*(5*x*x*x-3*x)/2
		}},
		{"cubic spline", "1 88 2 0 0 100 0 1 2 1 0 3 3 1 100 833 834 835 836 837 838", func(p float64) float64 { return 6 * (833 + 1 + (p-1)/99*3) }},
		{"linear spline", "1 88 2 0 0 100 0 1 2 1 0 4 2 1 100 5000 5010 5030", func(p float64) float64 {
			s := (p - 1) / 99 * 2
			if s < 1 {
				return 5000 + 10*s
			}
			return 5010 + 20*(s-1)
		}},
		{"one piece", "1 88 2 0 0 100 0 1 2 1 0 4 1 1 100 5000 5010", func(p float64) float64 { return 5000 + 10*(p-1)/99 }},
		{"pixel array", "1 88 2 0 0 3 0 1 2 1 0 5 3 5000 5001 5003", func(p float64) float64 { return map[bool]float64{true: 5000 + (p - 1), false: 5001 + 2*(p-2)}[p < 2] }},
		{"sampled, pairs counted", "1 88 2 0 0 100 0 1 2 1 0 6 3 0 1 5000 50 5049 100 5149", func(p float64) float64 {
			return map[bool]float64{true: 5000 + (p - 1), false: 5049 + 2*(p-50)}[p < 50]
		}},
		{"sampled, numbers counted", "1 88 2 0 0 100 0 1 2 1 0 6 6 0 1 5000 50 5049 100 5149", func(p float64) float64 {
			return map[bool]float64{true: 5000 + (p - 1), false: 5049 + 2*(p-50)}[p < 50]
		}},
		{"sampled, then another", "1 88 2 0 0 100 0 1 2 1 0 6 4 0 1 4990 100 5089 3 10 4 1 1 100 5000 5099", func(p float64) float64 { return (4990 + p - 1 + 3*(5010+p-1)) / 4 }},
		{"two weighted functions with zero points", "1 88 2 0 0 100 0 1 2 0.5 7 4 1 1 100 5000 5099 1.5 -1 4 1 1 100 6000 6099", func(p float64) float64 {
			return (0.5*(7+5000+p-1) + 1.5*(-1+6000+p-1)) / 2
		}},
		{"Doppler factor", "1 88 2 0 0 100 -6e-5 1 2 1 0 4 1 1 100 5000 5099", func(p float64) float64 { return (5000 + p - 1) / (1 - 6e-5) }},
	} {
		d, err := parseDispersion(tc.text)
		if err != nil {
			t.Errorf("%s: %v", tc.name, err)
			continue
		}
		for p := 1.0; p <= d.nw; p += 0.5 {
			if got, want := d.at(p), tc.want(p); !(math.Abs(got-want) < 1e-9) {
				t.Errorf("%s: %.10f at pixel %g, want %.10f", tc.name, got, p, want)
				break
			}
		}
	}
	d, err := parseDispersion("1 88 2 0 0 3 0 1 2 1 0 5 3 5000 5001 5003")
	if err != nil || !(math.Abs(d.at(3.5)-5004) < 1e-9) || !math.IsNaN(d.at(4)) {
		t.Errorf("%v: a table must reach half a pixel and no more", err)
	}
}

func TestDispersionRefused(t *testing.T) {
	head := "1 88 2 5000 1 100 0 1 2 1 0 "
	for text, want := range map[string]string{
		"1 88 0 5000 0.25":                           "5 numbers",
		"1 88 0 5000 0.25 abc 0":                     "abc",
		"1 88 0.5 5000 0.25 100 0":                   "dtype",
		"1 88 3 5000 0.25 100 0":                     "dtype 3",
		"1 88 0 5000 0.25 100 -1":                    "1+z",
		"1 88 0 5000 0.25 100 0 1 2 3":               "too many",
		"1 88 0 5000 0 100 0 1 2":                    "dw = 0",
		"1 88 0 5000 1 1 0 1 2":                      "nw",
		"1 88 1 5000 1 100 0 1 2":                    "log10",
		"1 88 2 5000 1 100 0 1 2":                    "without a function",
		head + "7 2 1 100 5000 1":                    "type 7",
		head + "1 4 1 100 5000 10 -3":                "needs 7 numbers, 6 are left",
		head + "1 3 1 100 5000 10 -3 0.5":            "left over",
		head + "1 2 100 1 5000 10":                   "from pixel 100 to 1",
		head + "1 99999999 1 100 5000":               "coefficients",
		head + "1 0 1 100 5000":                      "0 coefficients",
		head + "6 3 0 1 5000 50 5049 50 5149":        "do not ascend",
		head + "5 1 5000":                            "1 entries",
		"1 88 2 5000 1 100 0 1 2 0 0 5 2 5000 5001":  "add up to 0",
		"1 88 2 5000 1 100 0 1 2 1 0 5 2 5000 5001x": "5001x",
	} {
		if _, err := parseDispersion(text); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v; want %q", text, err, want)
		}
	}
}

// Blanks at the ends of cards belong to the text: here one falls on the cut, so
// that "0.25" and "100" would become one number without it.
func TestWATPieces(t *testing.T) {
	text := strings.Repeat("x", 63) + "0.25 100 end"
	cards := watCards(2, text)
	if !strings.HasSuffix(cards[0], "0.25'") {
		t.Fatal(cards[0])
	}
	parse := func(cards ...string) (string, error) {
		f, err := fits.New(fits.FromBytes("a", rawImage([]int{1}, func(int) float64 { return 0 }, cards...)))
		if err != nil {
			t.Fatal(err)
		}
		return watText(&f.HDUs[0].Header, 2)
	}
	if got, err := parse(cards...); err != nil || got != text {
		t.Errorf("%q, %v; want %q", got, err, text)
	}
	if got, err := parse(cards[1], cards[0]); err != nil || got != text {
		t.Errorf("other order: %q, %v", got, err)
	}
	if got, err := parse("WAT2_001= 'a''b'", "WAT2_002= 'c'"); err != nil || got != "a'b"+strings.Repeat(" ", 64)+"c" {
		t.Errorf("a quote: %q, %v", got, err)
	}
	for want, c := range map[string][]string{
		"WAT2_002 is missing between WAT2_001 and WAT2_004": {"WAT2_001= 'a'", "WAT2_004= 'b'"},
		"WAT2_001 is missing":                               {"WAT2_002= 'a'"},
		"twice":                                             {"WAT2_001= 'a'", "WAT2_001= 'b'"},
		"damaged":                                           {"WAT2_001= 12"},
		"WAT2_0x1":                                          {"WAT2_0x1= 'a'"},
	} {
		if got, err := parse(c...); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%v: %q, %v; want %q", c, got, err, want)
		}
	}
	for text, want := range map[string]string{`a b = "1"`: "key = value", `spec1 = "1`: "does not end", `spec1 = "1" spec1 = "2"`: "twice", `= "1"`: "key = value"} {
		if _, err := watEntries(text); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v; want %q", text, err, want)
		}
	}
}

// An image cut out as [101:300], and one summed by pairs, keep the dispersion of
// the whole: P = (p − LTV1)/LTM1_1. Lines that were cut out find theirs by LTV2.
func TestMultispecMapping(t *testing.T) {
	spec := []string{"1 10 0 5000 0.5 400 0", "2 11 0 6000 0.5 400 0"}
	for name, tc := range map[string]struct {
		pixels      int
		specs       []string
		cards       []string
		lines, n    int
		first, last float64
		order       int
		wantErr     string
	}{
		"whole":               {pixels: 400, specs: spec, lines: 2, n: 400, first: 5000, last: 5199.5, order: 10},
		"cut":                 {pixels: 200, specs: spec, cards: []string{"LTV1    = -100"}, lines: 2, n: 200, first: 5050, last: 5149.5, order: 10},
		"summed":              {pixels: 200, specs: spec, cards: []string{"LTM1_1  = 0.5", "LTV1    = 0.25"}, lines: 2, n: 200, first: 5000.25, last: 5199.25, order: 10},
		"turned":              {pixels: 400, specs: spec, cards: []string{"LTM1_1  = -1", "LTV1    = 401"}, lines: 2, n: 400, first: 5000, last: 5199.5, order: 10},
		"beyond nw":           {pixels: 410, specs: spec, lines: 2, n: 400, first: 5000, last: 5199.5, order: 10},
		"cut past nw":         {pixels: 400, specs: spec, cards: []string{"LTV1    = -100"}, lines: 2, n: 300, first: 5050, last: 5199.5, order: 10},
		"one aperture":        {pixels: 400, specs: spec[:1], lines: 1, n: 400, first: 5000, last: 5199.5, order: 10},
		"nothing left":        {pixels: 10, specs: spec, cards: []string{"LTV1    = -500"}, wantErr: "nw"},
		"LTM zero":            {pixels: 10, specs: spec, cards: []string{"LTM1_1  = 0"}, wantErr: "LTM1_1"},
		"axes turned":         {pixels: 10, specs: spec, cards: []string{"LTM1_2  = 1"}, wantErr: "LTM1_2"},
		"between lines":       {pixels: 10, specs: spec, cards: []string{"LTV2    = 0.5"}, wantErr: "LTV2"},
		"line without a spec": {pixels: 10, specs: spec, cards: []string{"LTV2    = -1"}, wantErr: "spec3"},
		"unit":                {pixels: 400, specs: []string{"1 10 0 500 0.05 400 0"}, cards: []string{"CUNIT1  = 'nm'"}, lines: 1, n: 400, first: 500, last: 519.95, order: 10}, // WAT1 says angstroms
	} {
		s, err := read(fits.FromBytes("a.fits", multispecImage(tc.pixels, tc.specs, tc.cards...)), Options{})
		if tc.wantErr != "" {
			if !oops.IsInput(err) || !strings.Contains(err.Error(), tc.wantErr) {
				t.Errorf("%s: %v; want %q", name, err, tc.wantErr)
			}
			continue
		}
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		g := &s.Segments[0]
		if len(s.Segments) != tc.lines || len(g.Wave) != tc.n || !(math.Abs(g.Wave[0]-tc.first) < 1e-9) || !(math.Abs(g.Wave[tc.n-1]-tc.last) < 1e-9) || g.Order != tc.order {
			t.Errorf("%s: %d segments, order %d, %d pixels from %.3f to %.3f; want %+v", name, len(s.Segments), g.Order, len(g.Wave), g.Wave[0], g.Wave[len(g.Wave)-1], tc)
		}
	}
	// One row of the image alone, named by its line.
	s, err := read(fits.FromBytes("a.fits", multispecImage(400, spec)), Options{Row: 2})
	if err != nil || len(s.Segments) != 1 || s.Segments[0].Order != 11 || s.Segments[0].Flux[0] != 400 {
		t.Errorf("row 2: %v, %+v", err, s)
	}
	if _, err := read(fits.FromBytes("a.fits", multispecImage(400, spec)), Options{Row: 3}); !oops.IsInput(err) {
		t.Errorf("row 3: %v", err)
	}
	// A second line cut out alone: NAXIS1 only, LTV2 = −1.
	text := `wtype=multispec spec1 = "1 10 0 5000 0.5 5 0" spec2 = "2 11 0 6000 0.5 5 0"`
	b := rawImage([]int{5}, func(int) float64 { return 1 }, append([]string{"WAT0_001= 'system=multispec'", "LTV2    = -1"}, watCards(2, text)...)...)
	if s, err := read(fits.FromBytes("a.fits", b), Options{}); err != nil || s.Segments[0].Wave[0] != 6000 {
		t.Errorf("line 2 alone: %v", err)
	}
}

// Bands of a third axis by BANDIDn; the error band of the second aperture is line
// 2 of its own plane. Apertures whose APID is sky are no object.
func TestMultispecBands(t *testing.T) {
	text := `wtype=multispec spec1 = "1 3 0 5000 0.5 5 0" spec2 = "2 4 0 6000 0.5 5 0" spec3 = "3 5 0 7000 0.5 5 0"`
	cards := append([]string{"WAT0_001= 'system=multispec'", "BANDID1 = 'background - fit'", "BANDID2 = 'spectrum - weights none'", "BANDID3 = 'sigma - from counts'", "APID2   = 'sky'"}, watCards(2, text)...)
	b := rawImage([]int{5, 3, 3}, func(i int) float64 { return 100*float64(i/15) + 10*float64(i/5%3) + float64(i%5) + 1 }, cards...)
	s, err := read(fits.FromBytes("a.fits", b), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if len(s.Segments) != 2 || s.Segments[1].Order != 5 {
		t.Fatalf("%d segments: %+v", len(s.Segments), s.Segments)
	}
	if g := &s.Segments[1]; g.Flux[1] != 122 || g.Err[1] != 222 || g.Wave[0] != 7000 {
		t.Errorf("flux %v, errors %v", g.Flux, g.Err)
	}
	notes := strings.Join(s.Notes, "; ")
	for _, want := range []string{"1 (background)", "sky"} {
		if !strings.Contains(notes, want) {
			t.Errorf("notes %q do not mention %s", notes, want)
		}
	}
}

// The factor 1+z of WAT2 is one motion with what VHELIO or DOPCOR say.
func TestMultispecDoppler(t *testing.T) {
	v := 18.4252
	z := fmt.Sprintf("%.14g", 1/(1+v/frame.C)-1)
	spec := []string{"1 10 0 5000 0.5 400 " + z}
	for name, tc := range map[string]struct {
		cards []string
		kind  frame.Kind
		note  string
	}{
		"alone":         {nil, frame.Unknown, "not to which frame"},
		"VHELIO":        {[]string{"VHELIO  = 18.4252"}, frame.Heliocent, "VHELIO"},
		"DOPCOR":        {[]string{"DOPCOR01= '" + z + " all'"}, frame.Unknown, "DOPCOR01"},
		"they disagree": {[]string{"DOPCOR01= '-7e-05 all'"}, frame.Unknown, "the latter was divided out"},
		"SPECSYS":       {[]string{"SPECSYS = 'BARYCENT'"}, frame.Barycentric, ""},
	} {
		s, err := read(fits.FromBytes("a.fits", multispecImage(400, spec, tc.cards...)), Options{})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		g := &s.Segments[0]
		if notes := strings.Join(g.Notes, "; "); g.Frame != tc.kind || !strings.Contains(notes, tc.note) {
			t.Errorf("%s: frame %q, notes %q; want %q, %q", name, g.Frame, notes, tc.kind, tc.note)
		}
		if !(math.Abs(g.Wave[0]-5000*(1+v/frame.C)) < 1e-6) {
			t.Errorf("%s: first wavelength %.7f", name, g.Wave[0])
		}
		if name != "SPECSYS" && (len(g.Shift) == 0 || !g.Shift[0].Done || !(math.Abs(g.Shift[0].V-v) < 1e-3)) {
			t.Errorf("%s: corrections %+v", name, g.Shift)
		}
	}
}

func TestMultispecSaysWhatIsOdd(t *testing.T) {
	function := " 1 0 4 1 1 400 5000 5199.5"
	for name, tc := range map[string]struct {
		specs []string
		want  string
	}{
		"w1 and function":   {[]string{"1 10 2 5003 0.5 400 0 1 2" + function}, "one of them is wrong"},
		"z differ":          {[]string{"1 10 2 5000 0.5 400 0 1 2" + function, "2 11 2 5000 0.5 400 6e-5 1 2" + function}, "Doppler factors of the apertures differ"},
		"one uncalibrated":  {[]string{"1 10 2 5000 0.5 400 0 1 2" + function, "2 11 -1 0 1 400 0 1 2"}, "not calibrated"},
		"agreement":         {[]string{"1 10 2 5000 0.5 400 0 1 2" + function}, ""},
		"beams are no key":  {[]string{"1 0 2 5000 0.5 400 0 1 2" + function, "2 0 2 5000 0.5 400 0 1 2" + function}, ""},
		"descending orders": {[]string{"1 10 0 5000 -0.5 400 0"}, "turned round"},
	} {
		s, err := read(fits.FromBytes("a.fits", multispecImage(400, tc.specs)), Options{})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		notes := strings.Join(append(s.Notes, s.Segments[0].Notes...), "; ")
		if !strings.Contains(notes, tc.want) || tc.want == "" && notes != "" {
			t.Errorf("%s: notes %q, want %q", name, notes, tc.want)
		}
	}
	_, err := read(fits.FromBytes("a.fits", multispecImage(400, []string{"1 10 -1 0 1 400 0"})), Options{})
	if !oops.IsInput(err) || !strings.Contains(err.Error(), "calibrated") {
		t.Errorf("all uncalibrated: %v", err)
	}
}

func FuzzMultispec(f *testing.F) {
	for _, s := range []string{"1 88 0 5000 0.25 9 0 1 2", "1 88 1 3.7 1e-5 9 1e-4 1 2", "1 88 2 0 0 9 0 1 2 1 0 1 4 1 9 5000 10 -3 0.5", "1 88 2 0 0 9 0 1 2 1 0 2 2 1 9 5000 10",
		"1 88 2 0 0 9 0 1 2 1 0 3 3 1 9 833 834 835 836 837 838", "1 88 2 0 0 9 0 1 2 1 0 4 2 1 9 5000 5010 5030", "1 88 2 0 0 3 0 1 2 1 0 5 3 5000 5001 5003",
		"1 88 2 0 0 9 0 1 2 1 0 6 3 0 1 5000 5 5049 9 5149", "1 88 2 0 0 9 0 1 2 0.5 7 4 1 1 9 5000 5099 1.5 -1 4 1 1 9 6000 6099", "1 0 -1 0 0 9 0"} {
		f.Add(s, "units=nm", 0.0, 1.0)
		f.Add(s, "", -1.0, 0.5)
	}
	f.Fuzz(func(t *testing.T, spec, wat1 string, ltv, ltm float64) {
		if strings.ContainsAny(spec+wat1, "'\"") || len(spec) > 2000 || len(wat1) > 60 {
			return
		}
		cards := append(watCards(2, `wtype=multispec spec1 = "`+spec+`"`), "WAT0_001= 'system=multispec'", "WAT1_001= '"+wat1+"'", fmt.Sprintf("LTV1    = %.12g", ltv), fmt.Sprintf("LTM1_1  = %.12g", ltm))
		fuzzRead(t, rawImage([]int{9}, func(i int) float64 { return float64(i) }, cards...), Options{})
	})
}
