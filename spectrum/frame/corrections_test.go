package frame_test

import (
	"fmt"
	"math"
	"strings"
	"testing"
	"time"

	"lacuna/internal/check"
	"lacuna/internal/oops"
	"lacuna/spectrum/frame"
)

func ExampleCorrections() {
	site, _ := frame.FindSite("ESO-VLT-U2")
	target, _ := frame.ParseTarget("170.312625 -60.62438")
	v, _ := frame.Corrections(time.Date(2002, 2, 22, 6, 38, 9, 0, time.UTC), site, target)
	fmt.Printf("heliocentric %.2f, LSRK %.2f km/s\n", v.Helio, v.LSRK)
	// Output: heliocentric 13.88, LSRK 3.59 km/s
}

func utc(t *testing.T, s string) time.Time {
	t.Helper()
	x, err := time.Parse("2006-01-02T15:04:05", s)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// near reports whether two velocities agree within tol, all km/s.
func near(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s: %.6f km/s, want %.6f, off by %.4f m/s, allowed %g", what, got, want, 1e3*(got-want), 1e3*tol)
	}
}

// checks/velocity_frames.csv: astropy 5.2.1 with its built-in ephemeris, computed
// outside this project and confirmed there by a second chain to 3 mm/s. The gate
// of that table is 1 m/s; what the comment on Corrections promises, 0.1 m/s, is
// tested here.
func TestVelocityFrames(t *testing.T) {
	const tol = 1e-4
	sbd, err := frame.FindSolarMotion("schonrich2010")
	if err != nil {
		t.Fatal(err)
	}
	rows := check.CSV(t, check.Shared(t, "checks/velocity_frames.csv"))
	for _, row := range rows {
		f := func(col string) float64 { return check.F(t, row, col) }
		site := frame.Site{Lon: f("lon_deg"), Lat: f("lat_deg"), Height: f("height_m")}
		target := frame.Target{RA: f("ra_icrs_deg"), Dec: f("dec_icrs_deg")}
		v, err := frame.Corrections(utc(t, row["utc"]), site, target)
		if err != nil {
			t.Fatalf("%s: %v", row["id"], err)
		}
		near(t, row["id"]+" diurnal", v.Diurnal, f("v_diurnal_kms"), tol)
		near(t, row["id"]+" orbit", v.Orbit, f("v_earth_bary_kms"), tol)
		near(t, row["id"]+" helio", v.Helio, f("vcorr_helio_kms"), tol)
		near(t, row["id"]+" bary", v.Bary, f("vcorr_bary_classical_kms"), tol)
		near(t, row["id"]+" bary full", v.BaryFull, f("vcorr_bary_full_kms"), tol)
		near(t, row["id"]+" LSRK", v.Bary+frame.LSRKTerm(target.RA, target.Dec), f("vcorr_lsrk_total_kms"), tol)
		near(t, row["id"]+" (11.1, 12.24, 7.25)", sbd.Term(target.RA, target.Dec), f("dv_lsr_uvw_kms"), tol)
		// The product of Doppler factors, from the columns of the table alone.
		product := frame.C * ((1+f("vcorr_bary_full_kms")/frame.C)*(1+f("dv_lsrk_kms")/frame.C) - 1)
		near(t, row["id"]+" LSRK by product", v.LSRK, product, tol)
	}
	if len(rows) < 29 {
		t.Errorf("%d rows", len(rows))
	}
}

// checks/velocity_published.csv: the worked examples of the help page of IRAF's
// rvcorrect task, two decimals, for mean coordinates of date at Kitt Peak. Gate of
// that table: 0.01 km/s. Its LSR has the apex at RA 18 h, Dec +30°, of 1900.
// It adds velocities as numbers, and so does this test.
func TestVelocityPublished(t *testing.T) {
	site, err := frame.ParseSite("-111.6,31.963333,2120")
	if err != nil {
		t.Fatal(err)
	}
	rows := check.CSV(t, check.Shared(t, "checks/velocity_published.csv"))
	for _, row := range rows {
		f := func(col string) float64 { return check.F(t, row, col) }
		when := utc(t, row["utc"])
		date, err := frame.ParseTarget(row["ra_of_date"] + " " + row["dec_of_date"])
		if err != nil {
			t.Fatal(err)
		}
		year := 2000 + (frame.MJD(when)-51544.5)/365.25
		var target frame.Target
		target.RA, target.Dec = frame.FromEquinox(date.RA, date.Dec, year)
		v, err := frame.Corrections(when, site, target)
		if err != nil {
			t.Fatal(err)
		}
		near(t, row["id"]+" helio", f("v_obs_kms")+v.Helio, f("v_helio_kms"), 0.01)
		near(t, row["id"]+" LSR", f("v_obs_kms")+v.Helio+frame.LSRKTerm(v.RA, v.Dec), f("v_lsr_kms"), 0.01)
		near(t, row["id"]+" diurnal", v.Diurnal, f("v_diurnal_kms"), 0.005)
		// By Doppler factors the velocity of −67.5 km/s moves by v₁v₂/c = 6 m/s more.
		helio, ok := v.Convert(f("v_obs_kms"), frame.Topocentric, frame.Heliocent)
		near(t, row["id"]+" by product", helio, f("v_obs_kms")+v.Helio+f("v_obs_kms")*v.Helio/frame.C, 1e-9)
		if !ok {
			t.Error("no way from TOPOCENT to HELIOCEN")
		}
	}
	if len(rows) < 4 {
		t.Errorf("%d rows", len(rows))
	}
}

func TestCorrectionsRefuse(t *testing.T) {
	kp, _ := frame.FindSite("kpno")
	now := time.Date(2010, 6, 1, 0, 0, 0, 0, time.UTC)
	star := frame.Target{RA: 10, Dec: 20}
	for what, f := range map[string]func() error{
		"1949":         func() error { _, err := frame.Corrections(now.AddDate(-61, 0, 0), kp, star); return err },
		"2061":         func() error { _, err := frame.Corrections(now.AddDate(51, 0, 0), kp, star); return err },
		"declination":  func() error { _, err := frame.Corrections(now, kp, frame.Target{RA: 10, Dec: 91}); return err },
		"NaN":          func() error { _, err := frame.Corrections(now, kp, frame.Target{RA: math.NaN()}); return err },
		"latitude":     func() error { _, err := frame.Corrections(now, frame.Site{Lat: -100}, star); return err },
		"proper":       func() error { _, err := frame.Corrections(now, kp, frame.Target{PMRA: math.Inf(1)}); return err },
		"height":       func() error { _, err := frame.Corrections(now, frame.Site{Height: math.NaN()}, star); return err },
		"site word":    func() error { _, err := frame.FindSite("Kit Peak"); return err },
		"satellite":    func() error { _, err := frame.FindSite("HST"); return err },
		"site numbers": func() error { _, err := frame.ParseSite("1,2"); return err },
		"motion":       func() error { _, err := frame.FindSolarMotion("reid"); return err },
		"target":       func() error { _, err := frame.ParseTarget("12:00:00"); return err },
	} {
		if err := f(); !oops.IsInput(err) {
			t.Errorf("%s: %v", what, err)
		}
	}
	if _, err := frame.FindSite("Kit Peak"); !strings.Contains(fmt.Sprint(err), "did you mean Kitt Peak") {
		t.Errorf("Kit Peak: %v", err)
	}
}

// A star moves by its proper motion: Barnard's star, −801.55 and 10362.39 mas a
// year (Gaia DR3, from memory), goes 103.6″ to the north in ten years.
func TestProperMotion(t *testing.T) {
	kp, _ := frame.FindSite("kpno")
	star := frame.Target{RA: 269.452, Dec: 4.693, PMRA: -801.55, PMDec: 10362.39}
	v, err := frame.Corrections(time.Date(2010, 1, 1, 12, 0, 0, 0, time.UTC), kp, star)
	if err != nil {
		t.Fatal(err)
	}
	if d := (v.Dec - star.Dec) * 3600; !(math.Abs(d-103.62) < 0.05) {
		t.Errorf("went %.2f″ to the north", d)
	}
	if d := (v.RA - star.RA) * 3600 * math.Cos(4.7*math.Pi/180); !(math.Abs(d+8.016) < 0.05) {
		t.Errorf("went %.3f″ to the east", d)
	}
}

// At the Earth's centre nothing rotates, and what is left is the orbit.
func TestGeocentre(t *testing.T) {
	site, err := frame.ParseSite("geocentre")
	if err != nil {
		t.Fatal(err)
	}
	v, err := frame.Corrections(time.Date(1997, 9, 19, 15, 25, 21, 0, time.UTC), site, frame.Target{RA: 327.796125, Dec: 28.864389})
	if err != nil || v.Diurnal != 0 || v.Bary != v.Orbit || !math.IsNaN(v.Altitude) {
		t.Errorf("%+v, %v", v, err)
	}
	// V_HELIO of the header of an HST/STIS spectrum of BD+28°4211 taken then is
	// +6.1095: the velocity of the Earth away from the star, relative to the Sun. That
	// header is made for the start of the exposure, 9 minutes before (5 m/s).
	near(t, "HST", -v.Helio, 6.10950298569941, 0.02)
}

func BenchmarkCorrections(b *testing.B) {
	site, _ := frame.FindSite("paranal")
	when := time.Date(2010, 1, 1, 0, 0, 0, 0, time.UTC)
	for b.Loop() {
		if _, err := frame.Corrections(when, site, frame.Target{RA: 83, Dec: -5}); err != nil {
			b.Fatal(err)
		}
	}
}
