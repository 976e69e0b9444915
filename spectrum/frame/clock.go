package frame

import "time"

// leaps are the days from which TAI − UTC has a new value (s): the first of a
// month, from the 10 s of 1972. Source: IERS Bulletin C; from memory, and checked
// against ERFA by a test. The last step was on 2017 January 1.
var leaps = [...]struct {
	year, month int
	tai         float64
}{
	{1972, 1, 10}, {1972, 7, 11}, {1973, 1, 12}, {1974, 1, 13}, {1975, 1, 14}, {1976, 1, 15}, {1977, 1, 16},
	{1978, 1, 17}, {1979, 1, 18}, {1980, 1, 19}, {1981, 7, 20}, {1982, 7, 21}, {1983, 7, 22}, {1985, 7, 23},
	{1988, 1, 24}, {1990, 1, 25}, {1991, 1, 26}, {1992, 7, 27}, {1993, 7, 28}, {1994, 7, 29}, {1996, 1, 30},
	{1997, 7, 31}, {1999, 1, 32}, {2006, 1, 33}, {2009, 1, 34}, {2012, 7, 35}, {2015, 7, 36}, {2017, 1, 37},
}

// deltaT is TT − UT1 (s) before UTC ran at the rate of atomic time, at the
// start of the years. Source: the yearly means of the almanacs (from memory);
// linear between them it is good to 0.5 s, which moves a velocity by 3 mm/s.
var deltaT = [...]struct{ year, dt float64 }{
	{1950, 29.1}, {1955, 31.1}, {1960, 33.1}, {1965, 35.7}, {1970, 40.2}, {1972, 42.2},
}

// TAIOffset returns TAI − UTC in s, from 1972 on (before: the 10 s of 1972).
func TAIOffset(t time.Time) float64 {
	off := leaps[0].tai
	for _, l := range leaps {
		if t.Before(time.Date(l.year, time.Month(l.month), 1, 0, 0, 0, 0, time.UTC)) {
			break
		}
		off = l.tai
	}
	return off
}

// ttOffset returns TT − UTC in s; before 1972 UTC is taken for UT1.
func ttOffset(t time.Time) float64 {
	if t.Year() >= 1972 {
		return TAIOffset(t) + 32.184
	}
	year := 1970 + t.Sub(time.Unix(0, 0)).Hours()/24/365.25
	for i := 1; i < len(deltaT); i++ {
		if a, b := deltaT[i-1], deltaT[i]; year < b.year {
			return a.dt + (b.dt-a.dt)*(year-a.year)/(b.year-a.year)
		}
	}
	return deltaT[len(deltaT)-1].dt
}

// days returns the days of UTC from 2000 January 1, 12 h.
func days(t time.Time) float64 {
	return (float64(t.Unix())+float64(t.Nanosecond())*1e-9)/86400 - 10957.5
}

// FromMJD returns the time of a modified Julian date (UTC), to about 1 µs.
func FromMJD(mjd float64) time.Time {
	whole := int64(mjd)
	frac := mjd - float64(whole)
	return time.Unix((whole-40587)*86400, int64(frac*86400e9)).UTC()
}

// MJD returns the modified Julian date (UTC), JD − 2400000.5.
func MJD(t time.Time) float64 { return days(t) + 51544.5 }
