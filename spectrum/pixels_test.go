package spectrum

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"lacuna/internal/oops"
)

func ramp(n int) []float64 {
	w := make([]float64, n)
	for i := range w {
		w[i] = 5000 + 0.01*float64(i)
	}
	return w
}

func level(n int, x float64) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = x
	}
	return v
}

// Photon counts of mean 2 in the core of a line and 400 beside it, errors the
// root of the counts: pixels that count nothing have error 0 and flux 0. Without
// them the mean of the core is 2/(1−e⁻²) = 2.31; with them it is 2, the mean of
// the Poisson distribution. 1,000 trials of 40 pixels scatter by √(2/40000) =
// 0.007; 4σ is allowed.
func TestZeroCountsKeepTheCoreUnbiased(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 7))
	poisson := func(mean float64) float64 { // Knuth's product
		k, p := 0, rng.Float64()
		for limit := math.Exp(-mean); p > limit; k++ {
			p *= rng.Float64()
		}
		return float64(k)
	}
	sum, n, zeros := 0.0, 0, 0
	for range 1000 {
		flux, err := make([]float64, 120), make([]float64, 120)
		for i := range flux {
			m := 400.0
			if i >= 40 && i < 80 {
				m = 2
			}
			flux[i] = poisson(m)
			err[i] = math.Sqrt(flux[i])
		}
		var s Segment
		if e := s.fill(pixels{wave: ramp(120), flux: flux, err: err}); e != nil {
			t.Fatal(e)
		}
		if e := s.Check(); e != nil {
			t.Fatal(e)
		}
		for i := 40; i < 80; i++ {
			if s.Mask[i].Bad() {
				continue
			}
			sum += s.Flux[i]
			n++
			if s.Mask[i]&ZeroCount != 0 {
				zeros++
				if s.Err[i] != 1 { // one count is the smallest error near by
					t.Fatalf("error %g of a pixel of zero counts, want that of one count", s.Err[i])
				}
			}
		}
	}
	if m := sum / float64(n); !(math.Abs(m-2) < 4*math.Sqrt(2/40000.0)) || zeros < 4000 {
		t.Errorf("mean of the core %.4f from %d pixels, %d of zero counts; want 2", m, n, zeros)
	}
}

func TestZeroErrorsElsewhereAreBad(t *testing.T) {
	for name, tc := range map[string]struct {
		from, to int // error and flux 0 there
		core     bool
		want     int // masked
	}{
		"gap between two bright detectors": {100, 130, false, 30},
		"start":                            {0, 30, false, 30},
		"end":                              {170, 200, false, 30},
		"one pixel of a bright continuum":  {50, 51, false, 1},
		"core of a line":                   {100, 130, true, 0},
	} {
		flux, err := level(200, 1), level(200, 0.01)
		for i := tc.from; i < tc.to; i++ {
			flux[i], err[i] = 0, 0
		}
		if tc.core { // wings of two pixels
			for k, f := range []float64{0.05, 0.5} {
				for _, i := range []int{tc.from - 1 - k, tc.to + k} {
					flux[i], err[i] = f, 0.01*math.Sqrt(f)
				}
			}
		}
		var s Segment
		if e := s.fill(pixels{wave: ramp(200), flux: flux, err: err}); e != nil {
			t.Fatal(e)
		}
		if got := 200 - s.Good(); got != tc.want {
			t.Errorf("%s: %d pixels masked, want %d; %q", name, got, tc.want, s.Notes)
		}
		if e := s.Check(); e != nil {
			t.Errorf("%s: %v", name, e)
		}
	}
}

// A quality flag wins over the rule of zero counts.
func TestFlaggedZeroErrorStaysBad(t *testing.T) {
	flux, err, bad := level(60, 0.02), level(60, 0.02), make([]bool, 60)
	flux[30], err[30], bad[30] = 0, 0, true
	flux[40], err[40] = 0, 0
	var s Segment
	if e := s.fill(pixels{wave: ramp(60), flux: flux, err: err, bad: bad}); e != nil {
		t.Fatal(e)
	}
	if !s.Mask[30].Bad() || s.Mask[40].Bad() || s.Mask[40]&ZeroCount == 0 {
		t.Errorf("masks %b, %b; want the flagged one bad, the other kept", s.Mask[30], s.Mask[40])
	}
}

func TestFillerAtTheEnds(t *testing.T) {
	flux := level(100, 1)
	for i := range 20 {
		flux[i], flux[99-i] = 0, 0
		flux[40+i] = 0 // a black core stays
	}
	var s Segment
	if e := s.fill(pixels{wave: ramp(100), flux: flux}); e != nil {
		t.Fatal(e)
	}
	for i, m := range s.Mask {
		if want := i < 20 || i >= 80; m.Bad() != want {
			t.Fatalf("pixel %d masked: %v, want %v", i, m.Bad(), want)
		}
	}
}

func TestOrder(t *testing.T) {
	nan := math.NaN()
	var s Segment
	flux, err, cont := []float64{1, 2, 3, 4}, []float64{.1, .2, .3, .4}, []float64{5, 6, 7, 8}
	if e := s.fill(pixels{wave: []float64{5003, nan, 5001, 5000}, flux: flux, err: err, cont: cont}); e != nil {
		t.Fatal(e)
	}
	want := []float64{5000, 5001, 5002, 5003}
	for i := range want {
		if s.Wave[i] != want[i] || s.Flux[i] != float64(4-i) || s.Continuum[i] != float64(8-i) || s.Mask[i].Bad() != (i == 2) {
			t.Errorf("pixel %d: %g, %g, %g, %v", i, s.Wave[i], s.Flux[i], s.Continuum[i], s.Mask[i])
		}
	}
	if notes := strings.Join(s.Notes, "; "); !strings.Contains(notes, "turned round") || !strings.Contains(notes, "index 1") {
		t.Errorf("notes %q", notes)
	}
	// Wavelengths missing at both ends, near zero: they must stay positive.
	for _, wave := range [][]float64{{nan, nan, nan, nan, 2, 4, nan}, {nan, 4, 2, nan, nan, nan, nan}} {
		s = Segment{}
		if e := s.fill(pixels{wave: wave, flux: level(7, 1)}); e != nil {
			t.Fatal(e)
		}
		if e := s.Check(); e != nil {
			t.Errorf("%v: %v", wave, e)
		}
	}
	for name, wave := range map[string][]float64{"falls": {1, 2, 1.5}, "twice": {1, 2, 2}, "negative": {-1, 1, 2}, "lost": {nan, nan, 1}, "rises": {3, 2, 4}} {
		s = Segment{Label: "x"}
		if e := s.fill(pixels{wave: wave, flux: level(3, 1)}); !oops.IsInput(e) {
			t.Errorf("%s: %v", name, e)
		}
	}
}

func TestErrorColumns(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for name, tc := range map[string]struct {
		err  []float64
		nil_ bool
		bad  int
	}{
		"all zero":        {[]float64{0, 0, 0, 0}, true, 0},
		"all missing":     {[]float64{nan, nan, nan, nan}, true, 0},
		"zero or missing": {[]float64{0, nan, 0, nan}, true, 0},
		"some negative":   {[]float64{-1, 1, 1, inf}, false, 2},
		"one missing":     {[]float64{1, nan, 1, 1}, false, 1},
	} {
		var s Segment
		if e := s.fill(pixels{wave: ramp(4), flux: []float64{1, -2, 3, 4}, err: tc.err}); e != nil {
			t.Fatal(e)
		}
		if (s.Err == nil) != tc.nil_ || 4-s.Good() != tc.bad || len(s.Notes) == 0 {
			t.Errorf("%s: errors dropped %v, %d masked, notes %q; want %v, %d", name, s.Err == nil, 4-s.Good(), s.Notes, tc.nil_, tc.bad)
		}
	}
}

func TestCheckAndCut(t *testing.T) {
	good := func() Segment {
		return Segment{Wave: []float64{1, 2, 3}, Flux: []float64{1, 2, 3}, Err: []float64{1, 1, 1}, Mask: make([]Reason, 3)}
	}
	s := good()
	if err := s.Check(); err != nil {
		t.Fatal(err)
	}
	c := s.Cut(1.5, 3)
	if len(c.Wave) != 2 || len(c.Err) != 2 || c.Wave[0] != 2 {
		t.Errorf("cut %v", c)
	}
	c.Wave[0] = 9
	if s.Wave[1] != 2 {
		t.Error("a cut shares memory with its segment")
	}
	if c := s.Cut(5, 6); len(c.Wave) != 0 {
		t.Errorf("cut outside: %v", c.Wave)
	}
	for name, spoil := range map[string]func(*Segment){
		"order": func(s *Segment) { s.Wave[1] = 3 }, "NaN": func(s *Segment) { s.Wave[0] = math.NaN() }, "length": func(s *Segment) { s.Flux = s.Flux[:2] },
		"flux": func(s *Segment) { s.Flux[2] = math.NaN() }, "error": func(s *Segment) { s.Err[2] = 0 }, "empty": func(s *Segment) { s.Wave = nil },
	} {
		s := good()
		spoil(&s)
		if s.Check() == nil {
			t.Errorf("%s passed", name)
		}
	}
}
