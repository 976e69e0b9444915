package frame_test

import (
	"math"
	"strings"
	"testing"
	"time"

	"lacuna/internal/oops"
	"lacuna/spectrum/frame"
)

func TestParseTime(t *testing.T) {
	want := time.Date(2002, 2, 22, 6, 24, 49, 500e6, time.UTC) // MJD 52327.2672396 by hand
	for _, s := range []string{"2002-02-22T06:24:49.5", " 2002-02-22 06:24:49.5 ", "2002-02-22T06:24:49.5Z", "2002-02-22T08:24:49.5+02:00",
		"MJD 52327.267239583", "mjd52327.267239583", "52327.267239583", "JD 2452327.767239583", "2452327.767239583"} {
		got, err := frame.ParseTime(s)
		if err != nil || !(math.Abs(got.Sub(want).Seconds()) < 1e-3) {
			t.Errorf("%q: %v %v", s, got, err)
		}
	}
	if d := frame.MJD(want) - 52327.267239583; !(math.Abs(d) < 1e-8) {
		t.Errorf("MJD off by %g d", d)
	}
	for _, s := range []string{"", "2002-02-22", "22/02/2002", "yesterday", "MJD 2452327.7", "JD 52327.7", "NaN", "1e300", "2002-13-01T00:00:00"} {
		if got, err := frame.ParseTime(s); !oops.IsInput(err) {
			t.Errorf("%q: %v %v", s, got, err)
		}
	}
	if _, err := frame.ParseTime("2002-02-22"); !strings.Contains(err.Error(), "time of day") {
		t.Error(err)
	}
}

func TestParseTarget(t *testing.T) {
	const ra, dec = 15 * (5 + 35./60 + 17.25/3600), -(5 + 23./60 + 28./3600)
	for _, s := range []string{"05:35:17.25 -05:23:28", "5 35 17.25 -5 23 28", "05h35m17.25s -05d23m28s", "83.821875 -5.391111111", "83.821875,-5.391111111", "5h35m17.25s, -5°23′28″"} {
		got, err := frame.ParseTarget(s)
		if err != nil || !(math.Abs(got.RA-ra) < 1e-8) || !(math.Abs(got.Dec-dec) < 1e-8) {
			t.Errorf("%q: %+v %v", s, got, err)
		}
	}
	if got, err := frame.ParseTarget("0:0:1 -0:00:30"); err != nil || !(math.Abs(got.Dec+30./3600) < 1e-12) {
		t.Errorf("minus zero degrees: %+v %v", got, err)
	}
	for _, s := range []string{"", "83.8", "83.8 -95", "400 0", "5:61:00 0:0:0", "5:3x:00 0:0:0", "NaN 0", "a b", "25:00:00 0:0:0", "1 2 3 4 5"} {
		if got, err := frame.ParseTarget(s); !oops.IsInput(err) {
			t.Errorf("%q: %+v %v", s, got, err)
		}
	}
}

func FuzzParseTarget(f *testing.F) {
	f.Add("05:35:17.25 -05:23:28")
	f.Add("83.8 -5.4")
	f.Add("5h35m -5d")
	f.Fuzz(func(t *testing.T, s string) {
		got, err := frame.ParseTarget(s)
		if err == nil && (!(got.RA >= 0 && got.RA <= 360) || !(got.Dec >= -90 && got.Dec <= 90)) {
			t.Fatalf("%q: %+v", s, got)
		}
	})
}

func FuzzParseTime(f *testing.F) {
	f.Add("2002-02-22T06:24:49.5")
	f.Add("MJD 52327.267")
	f.Add("JD 2452327.767")
	f.Fuzz(func(t *testing.T, s string) {
		if got, err := frame.ParseTime(s); err == nil && got.IsZero() && !strings.HasPrefix(strings.TrimSpace(s), "0001") {
			t.Fatalf("%q: %v", s, got)
		}
	})
}
