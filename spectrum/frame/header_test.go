package frame_test

import (
	"math"
	"os"
	"slices"
	"strconv"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/internal/oops"
	"lacuna/spectrum/frame"
)

// cards reads the first two headers of a FITS file, the extension's cards on top.
func cards(t *testing.T, name string) func(string) string {
	t.Helper()
	raw, err := os.ReadFile(check.Shared(t, "realdata/"+name))
	if err != nil {
		t.Fatal(err)
	}
	out := map[string]string{}
	for at, headers := 0, 0; at+80 <= len(raw) && headers < 2; at += 80 {
		c := string(raw[at : at+80])
		if strings.TrimSpace(c) == "END" {
			headers++
			if !strings.HasPrefix(string(raw[(at/2880+1)*2880:]), "XTENSION") {
				break
			}
			at = (at/2880+1)*2880 - 80
			continue
		}
		key, val, ok := strings.Cut(strings.TrimPrefix(c, "HIERARCH "), "=")
		if !ok {
			continue
		}
		if val = strings.TrimSpace(val); strings.HasPrefix(val, "'") {
			val, _, _ = strings.Cut(val[1:], "'")
		} else {
			val, _, _ = strings.Cut(val, "/")
		}
		out[strings.TrimSpace(key)] = strings.TrimSpace(val)
	}
	return func(k string) string { return out[k] }
}

// Headers of public spectra (../shared/realdata/INDEX.md says where they come from).
// The corrections of ESO's pipeline were computed by that pipeline; they differ from
// ours by the time they were made for (two of them by less than 1 m/s at the start
// of the exposure) and by its low-precision formulas.
func TestHeadersESO(t *testing.T) {
	for _, tc := range []struct {
		file   string
		within float64 // km/s
		says   string
	}{
		{"cen-x3/ADP.2021-08-26T17_24_42.195.fits", 0.01, "not applied yet"},
		{"cen-x3/ADP.2021-08-26T17_24_42.172.fits", 0.01, "not applied yet"},
		{"smc-x1/ADP.2021-08-25T12_56_30.964.fits", 0.01, "not applied yet"},
		{"lmc-x4/ADP.2021-09-09T13_16_16.511.fits", 0.013, "made for the start"},
		{"lmc-x4/ADP.2021-09-09T08_23_17.841.fits", 0.013, "made for the start"},
		{"qv-nor/ADP.2020-06-19T08_40_21.544.fits", 0.05, "not applied yet"},
		{"layouts/r.UVES.2011-08-11T232352.266-A01_0000.fits", 0.01, "does not say whether it is applied"},
	} {
		c := cards(t, tc.file)
		e, err := frame.ReadExposure(c)
		if err != nil {
			t.Errorf("%s: %v", tc.file, err)
			continue
		}
		v, err := e.Corrections()
		if err != nil {
			t.Fatal(err)
		}
		helio, err1 := strconv.ParseFloat(c("ESO QC VRAD HELICOR"), 64)
		bary, err2 := strconv.ParseFloat(c("ESO QC VRAD BARYCOR"), 64)
		if err1 != nil || err2 != nil {
			t.Fatalf("%s: %v %v", tc.file, err1, err2)
		}
		near(t, tc.file+" helio", v.Helio, helio, tc.within)
		near(t, tc.file+" bary", v.Bary, bary, tc.within)
		// The velocity of the Sun is the same in both, whatever the time.
		near(t, tc.file+" helio less bary", v.Sun, helio-bary, 1e-4)
		if !(math.Abs(v.Altitude-asNumber(t, c("ESO TEL ALT"))) < 8) { // at the start
			t.Errorf("%s: altitude %.1f°, at the start %s°", tc.file, v.Altitude, c("ESO TEL ALT"))
		}
		j, err := frame.Judge(frame.Claim{Keyword: "HELICOR", V: helio, To: frame.Heliocent, Axis: frame.Kind(c("SPECSYS"))}, e)
		if err != nil || j.Verdict != frame.Agrees || !strings.Contains(j.Text, tc.says) {
			t.Errorf("%s: %v %+v", tc.file, err, j)
		}
		// Read the other way, in m/s and from other frames.
		for v2, want := range map[float64]frame.Verdict{-helio: frame.Opposite, 1e3 * helio: frame.Metres, helio + 5: frame.Differs, v.LSRK: frame.OtherFrame, -v.LSRD: frame.OtherFrame} {
			if j, err := frame.Judge(frame.Claim{Keyword: "X", V: v2, To: frame.Heliocent}, e); err != nil || j.Verdict != want {
				t.Errorf("%s: %.3f km/s: %v %q, want %q", tc.file, v2, err, j.Text, want)
			}
		}
	}
}

func asNumber(t *testing.T, s string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// Each header below has one peculiarity; what is wanted was read off it by eye.
func TestHeaderQuirks(t *testing.T) {
	for _, tc := range []struct {
		file, mid string
		lon, ra   float64
		note      string
	}{
		{"iq-aur/TRES.fits", "2012-09-25T12:30:03", -110.8775, 79.75, "counts west"},
		{"layouts/AAO.fits", "2011-04-18T09:37:07", 149.0661, 165.465172, ""},
		// The header gives UTMIDDLE = 02:25:02.624.
		{"layouts/evega.0039.rs.ec.dispcor.fits", "2007-10-31T02:25:02", -105.820417, 279.234583, "TAI: 33 s"},
		{"layouts/mbgphH201811160014_u1we.fits", "2018-11-16T18:49:09", 20.812, 354.9145, "in hours"},
		{"hd140283/hd140283.fits", "2010-08-06T23:56:19", -70.69242, 235.759583, ""},
		{"layouts/UM669_nF.fits", "2009-12-23T02:18:42", -70.69242, 16.320833, ""},
	} {
		e, err := frame.ReadExposure(cards(t, tc.file))
		if err != nil {
			t.Errorf("%s: %v", tc.file, err)
			continue
		}
		if got := e.Mid.Format("2006-01-02T15:04:05"); got != tc.mid {
			t.Errorf("%s: middle %s, want %s", tc.file, got, tc.mid)
		}
		if !(math.Abs(e.Site.Lon-tc.lon) < 1e-5) || !(math.Abs(e.Target.RA-tc.ra) < 1e-5) {
			t.Errorf("%s: longitude %g, right ascension %g, want %g, %g", tc.file, e.Site.Lon, e.Target.RA, tc.lon, tc.ra)
		}
		if notes := strings.Join(e.Notes, "; "); !strings.Contains(notes, tc.note) || tc.note == "" && notes != "" {
			t.Errorf("%s: notes %q, want %q", tc.file, notes, tc.note)
		}
		v, err := e.Corrections()
		if err != nil || !(v.Altitude > 15) { // a telescope was pointed there
			t.Errorf("%s: altitude %.1f°, %v", tc.file, v.Altitude, err)
		}
	}
	for file, want := range map[string]string{"layouts/IUE_LWP.fits": "in orbit", "bd28-4211/o3zx02070_x1d.fits": "in orbit",
		"layouts/multispec_equispec.fits": "no date", "layouts/alphadra_20220513233026_gbertrand.fits": "no coordinates"} {
		if _, err := frame.ReadExposure(cards(t, file)); !oops.IsInput(err) || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v, want %q", file, err, want)
		}
	}
	// A satellite's header can be compared with the Earth's centre on request: V_HELIO
	// of the archive is the observer's velocity, to subtract.
	c := cards(t, "bd28-4211/o3zx02070_x1d.fits")
	e, _ := frame.ReadExposure(c)
	e.Site = frame.Geocentre
	j, err := frame.Judge(frame.Claim{Keyword: "V_HELIO", V: asNumber(t, c("V_HELIO")), To: frame.Heliocent, Axis: frame.Heliocent}, e)
	if err != nil || j.Verdict != frame.Opposite || !strings.Contains(j.Text, "applied already") {
		t.Errorf("%v %+v", err, j)
	}
}

func TestHeaderMade(t *testing.T) {
	base := map[string]string{"DATE-OBS": "1993-12-18", "UT": "05:10:00", "EXPTIME": "600", "OBSERVAT": "kpno", "RA": "5:35:17", "DEC": "-5:23:28", "EQUINOX": "1950"}
	read := func(changes ...string) (frame.Exposure, error) {
		return frame.ReadExposure(func(k string) string {
			for i := 0; i < len(changes); i += 2 {
				if changes[i] == k {
					return changes[i+1]
				}
			}
			return base[k]
		})
	}
	e, err := read()
	if err != nil {
		t.Fatal(err)
	}
	// θ¹ Ori C: 5h32m49.0s −5°25′16″ (1950) is 5h35m16.5s −5°23′23″ (2000), from memory, so
	// precession moves by about 148 s in RA; here the 1950 values are those of 2000.
	if d := (e.Target.RA - 15*(5+35.0/60+17.0/3600)) * 3600 / 15; !(math.Abs(d-147.5) < 1) {
		t.Errorf("precessed by %.1f s, want 147.5", d)
	}
	if e.Site.Name != "Kitt Peak (4 m)" || e.Mid.Format("15:04:05") != "05:15:00" {
		t.Errorf("%+v", e)
	}
	old, err := read("DATE-OBS", "18/12/93")
	if err != nil || !old.Mid.Equal(e.Mid) {
		t.Errorf("18/12/93: %v %v", old.Mid, err)
	}
	for what, changes := range map[string][]string{
		"no such time scale": {"DATE-OBS", "1993-12-18T05:10:00", "TIMESYS", "LMST"},
		"no time of day":     {"UT", ""},
		"open longitude":     {"OBSERVAT", "", "LONGITUD", "40", "LATITUDE", "10"},
		"no site":            {"OBSERVAT", "our roof"},
		"epoch of what":      {"EQUINOX", "", "EPOCH", "2010.6"},
		"no equinox":         {"EQUINOX", "0"},
		"declination":        {"DEC", "-95:00:00"},
	} {
		if e, err := read(changes...); !oops.IsInput(err) {
			t.Errorf("%s: %v %+v", what, err, e)
		}
	}
	// Longitudes that count the other way, and coordinates far from the named site.
	if e, err := read("SITELONG", "111:36:00", "SITELAT", "31:57:48"); err != nil || !(math.Abs(e.Site.Lon+111.6) < 1e-9) {
		t.Errorf("west: %+v %v", e, err)
	}
	if e, err := read("SITELONG", "20", "SITELAT", "-32"); err != nil || !(math.Abs(e.Site.Lon+111.599) < 0.01) || len(e.Notes) != 2 {
		t.Errorf("far from the named site: %+v %v", e, err)
	}
	if e, err := read("OBSERVAT", "", "SITELONG", "111:36:00", "SITELAT", "31:57:48"); err != nil || !(math.Abs(e.Site.Lon+111.6) < 1e-9) {
		t.Errorf("west, no name: %+v %v", e, err)
	}
	// A claim for the end of a long exposure, and with the longitude reversed.
	e, _ = read("EXPTIME", "14400")
	end, _ := frame.Corrections(e.End, e.Site, e.Target)
	j, err := frame.Judge(frame.Claim{Keyword: "VHELIO", V: end.Helio, To: frame.Heliocent}, e)
	if err != nil || j.Verdict != frame.OtherTime {
		t.Errorf("end of the exposure: %v %+v", err, j)
	}
	mirror := e.Site
	mirror.Lon *= -1
	west, _ := frame.Corrections(e.Mid, mirror, e.Target)
	if j, err := frame.Judge(frame.Claim{Keyword: "VHELIO", V: west.Helio, To: frame.Heliocent}, e); err != nil || j.Verdict != frame.WestEast {
		t.Errorf("longitude reversed: %v %+v", err, j)
	}
	for _, k := range []string{"UT", "SITELAT", "ESO TEL GEOLON", "RA_TARG", "TIMESYS", "DATE-OBS"} {
		if !slices.Contains(frame.ExposureKeys(), k) {
			t.Errorf("ExposureKeys lacks %s", k)
		}
	}
}

func TestAppliedFromTelluric(t *testing.T) {
	for _, tc := range []struct {
		shift, err, v float64
		want          string
		sure          bool
	}{
		{0.1, 0.1, 20, "not applied", true}, {20.2, 0.1, 20, "applied: ", true}, {-19.9, 0.1, 20, "wrong sign", true}, {40, 0.1, 20, "twice", true},
		{0.4, 0.1, 0.6, "cannot tell", false}, {10, 0.1, 20, "neither", false}, {math.NaN(), 0.1, 20, "neither", false}, {0, math.NaN(), 20, "neither", false},
	} {
		text, sure := frame.AppliedFromTelluric(tc.shift, tc.err, tc.v)
		if sure != tc.sure || !strings.Contains(text, tc.want) {
			t.Errorf("%+v: %q %v", tc, text, sure)
		}
	}
}

func FuzzReadExposure(f *testing.F) {
	f.Add("DATE-OBS=1993-12-18T05:10:00|EXPTIME=600|OBSERVAT=kpno|RA=5:35:17|DEC=-5:23:28")
	f.Add("MJD-OBS=55784.97491049|ESO TEL GEOLON=-70.4|ESO TEL GEOLAT=-24.6|RA=230.9|DEC=-38.4|TIMESYS=TAI|EQUINOX=1950")
	f.Add("UTDATE=2011:04:18|UTSTART=09:32:07|UTEND=00:42:08|SITELONG=110:52:39|SITELAT=31:40:51|RA=23.6|TELRA=23:39:47|TELDEC=-69|DEC=-69")
	f.Fuzz(func(t *testing.T, in string) {
		c := map[string]string{}
		for _, kv := range strings.Split(in, "|") {
			if k, v, ok := strings.Cut(kv, "="); ok {
				c[k] = v
			}
		}
		e, err := frame.ReadExposure(func(k string) string { return c[k] })
		if err != nil {
			if !oops.IsInput(err) {
				t.Fatal(err)
			}
			return
		}
		v, err := e.Corrections()
		if err != nil {
			return // a date outside the range
		}
		// The Earth: 30.3 km/s around the Sun and 0.47 about its axis.
		if !(math.Abs(v.Helio) < 31) || !(math.Abs(v.BaryFull) < 31) || !(math.Abs(v.LSRK) < 51) || e.Mid.Before(e.Start) || e.End.Before(e.Mid) {
			t.Fatalf("%+v of %+v", v, e)
		}
		if _, err := frame.Judge(frame.Claim{V: 10}, e); err != nil {
			t.Fatal(err)
		}
	})
}
