package spectrum

import (
	"math"
	"strings"
	"testing"

	"lacuna/internal/oops"
	"lacuna/spectrum/fits"
	"lacuna/spectrum/frame"
)

func readText(text string, o Options) (*Spectrum, error) {
	return read(fits.FromBytes("lantern1.txt", []byte(text)), o)
}

func TestText(t *testing.T) {
	for name, tc := range map[string]struct {
		text  string
		o     Options
		first float64
		n     int
		err   bool
		bad   int
	}{
		"two columns":              {"5000 1\n5001 2\n", Options{}, 5000, 2, false, 0},
		"D exponents":              {"5.0D3 1d0\n5.001D+03 2\n", Options{}, 5000, 2, false, 0},
		"lone CR":                  {"5000 1 .1\r5001 2 .1\r", Options{}, 5000, 2, true, 0},
		"semicolons":               {"wave;flux;err\n5000;1;.1\n5001;2;.1\n", Options{}, 5000, 2, true, 0},
		"comments after data":      {"5000 1 ; good\n5001 2 # too\n5002 3 // and this\n", Options{}, 5000, 3, false, 0},
		"missing":                  {"5000 1 .1\n5001 - .1\n5002 nan .1\n5003 inf .1\n5004 1 .1\n", Options{}, 5000, 5, true, 3},
		"mask in column 4":         {"5000 1 .1 0\n5001 2 .1 4\n5002 2 .1 0\n", Options{}, 5000, 3, true, 1},
		"continuum in column 4":    {"5000 1 .1 1.5\n5001 2 .1 1.6\n", Options{}, 5000, 2, true, 0},
		"unit in the name":         {"wave_nm flux\n500.0 1\n500.1 2\n", Options{}, 5000, 2, false, 0},
		"unit in brackets":         {"lambda [um],flux\n0.5,1\n0.51,2\n", Options{}, 5000, 2, false, 0},
		"unit by the user":         {"500.0 1\n500.1 2\n", Options{WaveUnit: "nm"}, 5000, 2, false, 0},
		"wavenumbers":              {"20000 1\n19999 2\n", Options{WaveUnit: "cm-1"}, 5000, 2, false, 0},
		"variance":                 {"wave,flux,variance\n5000,1,.04\n5001,1,.04\n", Options{}, 5000, 2, true, 0},
		"inverse variance":         {"wave,flux,ivar\n5000,1,25\n5001,1,0\n5002,1,25\n", Options{}, 5000, 3, true, 1},
		"columns by the user":      {"x y z\n1 5000 7\n2 5001 8\n", Options{WaveCol: "y", FluxCol: "3"}, 5000, 2, false, 0},
		"no errors, says the user": {"5000 1 7\n5001 2 8\n", Options{ErrCol: "none"}, 5000, 2, false, 0},
		"text column not used":     {"wave,flux,note\n5000,1,ok\n5001,2,\"a, b\"\n", Options{}, 5000, 2, false, 0},
		"good or missing":          {"wave,flux,good\n5000,1,True\n5001,1,\n5002,1,False\n", Options{}, 5000, 3, false, 2},
		"no line end":              {"5000 1\n5001 2", Options{}, 5000, 2, false, 0},
		"Latin-1 comment":          {"# \xc5ngstr\xf6m\n5000 1\n5001 2\n", Options{}, 5000, 2, false, 0},
	} {
		s, err := readText(tc.text, tc.o)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		g := &s.Segments[0]
		if !(math.Abs(g.Wave[0]-tc.first) < 1e-6) || len(g.Wave) != tc.n || (g.Err != nil) != tc.err || tc.n-g.Good() != tc.bad {
			t.Errorf("%s: from %.6f Å, %d pixels, errors %v, %d bad; want %g, %d, %v, %d", name, g.Wave[0], len(g.Wave), g.Err != nil, tc.n-g.Good(), tc.first, tc.n, tc.err, tc.bad)
		}
		if strings.Contains(name, "variance") && !(math.Abs(g.Err[0]-0.2) < 1e-12) {
			t.Errorf("%s: error %g, want 0.2", name, g.Err[0])
		}
		if (g.Continuum != nil) != strings.Contains(name, "continuum") {
			t.Errorf("%s: continuum %v", name, g.Continuum)
		}
	}
}

func TestTextRefuses(t *testing.T) {
	for name, tc := range map[string]struct{ text, want string }{
		"stars":              {"5000 1\n5001 ********\n", "line 2"},
		"decimal comma":      {"5000,5 1,0\n5001,5 1,0\n", "decimal comma"},
		"decimal commas":     {"5000,5;1,0\n5001,5;1,0\n", "decimal comma"},
		"hexadecimal":        {"wave flux\n0x10 1\n0x11 2\n", "line 2"},
		"duplicate":          {"5000 1\n5001 1\n5001 1\n", "line 3"},
		"one column":         {"5000\n5001\n", "one field"},
		"only comments":      {"# a\n# b\n", "no data"},
		"only names":         {"wave flux\n", "no data"},
		"unknown names":      {"a b\n1 2\n3 4\n", "columns = "},
		"no unit by size":    {"500 1\n501 2\n", "unit = "},
		"bad quotes":         {"wave,flux\n\"5000,1\n5001,2\n", "line"},
		"NUL":                {"5000 1\n5001 2\n" + strings.Repeat("5002 3\n", 1000) + "\x00\n", "NUL"},
		"empty":              {"", "empty"},
		"names against data": {"wave,flux,err\n5000,1\n5001,2\n", "3 names for 2 columns"},
		"all bad":            {"5000 nan\n5001 nan\n", "no pixel"},
		"bzip2":              {"BZh91AY", "bunzip2"},
		"zip":                {"PK\x03\x04", "unzip"},
		"UTF-16":             {"\xff\xfe5\x000\x00", "UTF-8"},
		"VOTable":            {"<?xml version='1.0'?><VOTABLE/>", "without a table"},
	} {
		_, err := readText(tc.text, Options{})
		if !oops.IsInput(err) || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("%s: %v; want %q", name, err, tc.want)
		}
	}
	_, err := readText("wave flux\n5000 1\n5001 2\n", Options{FluxCol: "fluks"})
	if !oops.IsInput(err) || !strings.Contains(err.Error(), "did you mean flux") {
		t.Errorf("misspelt column: %v", err)
	}
}

func TestTextHeaderWords(t *testing.T) {
	body := "5000 1\n5001 2\n"
	for name, tc := range map[string]struct {
		head   string
		medium frame.Medium
		kind   frame.Kind
	}{
		"keys":                 {"# medium: air\n# frame = TOPOCENT\n# correction: 12.5\n", frame.Air, frame.Topocentric},
		"sentence":             {"# wavelength: Angstrom, vacuum, heliocentric\n", frame.Vacuum, frame.Heliocent},
		"both media":           {"# wavelengths converted from air to vacuum\n", frame.UnknownMedium, frame.Unknown},
		"both frames":          {"# wavelength barycentric, was topocentric\n", frame.UnknownMedium, frame.Unknown},
		"not about wavelength": {"# the air was calm\n", frame.UnknownMedium, frame.Unknown},
		"nothing":              {"", frame.UnknownMedium, frame.Unknown},
	} {
		s, err := readText(tc.head+body, Options{})
		if err != nil {
			t.Fatal(err)
		}
		if g := s.Segments[0]; g.Medium != tc.medium || g.Frame != tc.kind {
			t.Errorf("%s: %q, %q; want %q, %q", name, g.Medium, g.Frame, tc.medium, tc.kind)
		}
	}
	// The user's word wins, and is recorded.
	v := 10.0
	s, err := readText("# medium: air\n"+body, Options{Medium: frame.Vacuum, Correction: &v, Resolution: 80000, Normalised: true})
	if err != nil {
		t.Fatal(err)
	}
	g := s.Segments[0]
	if g.Medium != frame.Vacuum || g.MediumBy != "user" || g.Frame != frame.Topocentric || g.Resolution != 80000 || !g.Normalised {
		t.Errorf("%+v", g)
	}
	if err := g.ToFrame(frame.Heliocent); err != nil || !(math.Abs(frame.Velocity(g.Wave[0], 5000)-10) < 1e-6) {
		t.Errorf("%v, %.6f", err, g.Wave[0])
	}
	// Two orders in one table.
	s, err = readText("order,wave,flux\n7,5000,1\n7,5001,1\n8,4990,1\n8,5000.5,1\n", Options{})
	if err != nil || len(s.Segments) != 2 || s.Segments[1].Order != 8 {
		t.Errorf("orders: %v, %d segments", err, len(s.Segments))
	}
}
