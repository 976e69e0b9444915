package frame_test

import (
	"math"
	"testing"

	"lacuna/spectrum/frame"
)

// One name stands for one site, every row has a source and a place that exists.
func TestSites(t *testing.T) {
	owner := map[string]string{}
	sites := frame.Sites()
	for _, s := range sites {
		if s.Source == "" || s.Status != "verified" && s.Status != "memory" {
			t.Errorf("%s: source %q, status %q", s.Name, s.Source, s.Status)
		}
		if !(s.Height >= 0 && s.Height < 5200) || s.Lon == 0 && s.Name != "Greenwich" || !(math.Abs(s.Lat) < 61) {
			t.Errorf("%s: %g %g %g", s.Name, s.Lon, s.Lat, s.Height)
		}
		for _, a := range append([]string{s.Name}, s.Aliases...) {
			got, err := frame.FindSite(a)
			if err != nil || got.Name != s.Name {
				t.Errorf("%q leads to %q, wanted %q: %v", a, got.Name, s.Name, err)
			}
			if o, ok := owner[a]; ok && o != s.Name {
				t.Errorf("%q stands at %q and %q", a, o, s.Name)
			}
			owner[a] = s.Name
		}
	}
	if len(sites) < 60 {
		t.Errorf("%d sites", len(sites))
	}
	// Places given by the headers of public spectra taken there, within 1′.
	for word, at := range map[string][2]float64{"ESO-VLT-U2": {-70.4048, -24.6272}, "Clay (Mag.II)": {-70.69242, -29.01423}, "APO": {-105.820417, 32.780361},
		"flwo1": {-(110 + 52./60 + 39./3600), 31 + 40./60 + 51.4/3600}, "SALT": {20.812, -32.3795}, "Anglo-Australian Telescope": {149.0661, -31.27704}} {
		s, err := frame.FindSite(word)
		if err != nil || !(math.Abs(s.Lon-at[0]) < 1./60) || !(math.Abs(s.Lat-at[1]) < 1./60) {
			t.Errorf("%s: %+v %v", word, s, err)
		}
	}
}

// ../shared/formats/frames.md, section 3, gives these terms to 0.001 km/s, computed
// outside this project, for directions in Galactic coordinates. Their ICRS values
// are from memory and checked first.
func TestSolarMotions(t *testing.T) {
	keys := []string{"LSRK", "LSRD", "schonrich2010", "reid2019"}
	for _, tc := range []struct {
		ra, dec, l, b float64
		want          [4]float64
	}{
		{266.404996, -28.936172, 0, 0, [4]float64{10.271, 9, 11.1, 10.6}},
		{318.004402, 48.329640, 90, 0, [4]float64{15.317, 12, 12.24, 10.7}},
		{86.404996, 28.936172, 180, 0, [4]float64{-10.271, -9, -11.1, -10.6}},
		{138.004402, -48.329640, 270, 0, [4]float64{-15.317, -12, -12.24, -10.7}},
	} {
		l, b := frame.Galactic(tc.ra, tc.dec)
		if !(math.Abs(math.Mod(l-tc.l+540, 360)-180) < 2e-4) || !(math.Abs(b-tc.b) < 2e-4) {
			t.Errorf("%g %g: l = %.5f, b = %.5f, want %g, %g", tc.ra, tc.dec, l, b, tc.l, tc.b)
		}
		for i, k := range keys {
			m, err := frame.FindSolarMotion(k)
			if err != nil {
				t.Fatal(err)
			}
			if got := m.Term(tc.ra, tc.dec); !(math.Abs(got-tc.want[i]) < 6e-4) {
				t.Errorf("%s at %g, %g: %.4f, want %g", k, tc.l, tc.b, got, tc.want[i])
			}
		}
	}
	// The sample targets of the same section.
	for _, tc := range [][3]float64{{312.2345, 44.1234, 16.307}, {17.6021, -38.2750, -10.089}, {83.8221, -5.3911, -18.049}} {
		if got := frame.SolarMotions()[0].Term(tc[0], tc[1]); !(math.Abs(got-tc[2]) < 6e-4) {
			t.Errorf("LSRK at %g, %g: %.4f, want %g", tc[0], tc[1], got, tc[2])
		}
		if a, b := frame.SolarMotions()[0].Term(tc[0], tc[1]), frame.LSRKTerm(tc[0], tc[1]); !(math.Abs(a-b) < 1e-6) {
			t.Errorf("LSRK by U, V, W %.8f, by its vector %.8f", a, b)
		}
	}
	m, err := frame.FindSolarMotion("11.1, 12.24, 7.25")
	if err != nil || m.V != 12.24 {
		t.Errorf("%+v %v", m, err)
	}
	if m, err := frame.FindSolarMotion("Schönrich2010"); err != nil || m.Key != "schonrich2010" {
		t.Errorf("%+v %v", m, err)
	}
	for _, s := range []string{"", "1,2", "500,0,0", "mars"} {
		if _, err := frame.FindSolarMotion(s); err == nil {
			t.Errorf("%q was taken", s)
		}
	}
}
