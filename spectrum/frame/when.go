package frame

import (
	"fmt"
	"strconv"
	"strings"
	"time"

	"lacuna/internal/oops"
)

// layouts are the ways to write a time; Go reads fractions of seconds with each.
var layouts = []string{"2006-01-02T15:04:05", "2006-01-02 15:04:05", "2006-01-02T15:04:05Z07:00", "2006-01-02 15:04:05Z07:00",
	"2006-01-02T15:04", "2006-01-02 15:04", "2006/01/02 15:04:05", "2006:01:02 15:04:05"}

// ParseTime reads a time in UTC: "2002-02-22T06:24:49.3", the same with a space,
// "MJD 52327.267", "JD 2452327.767", or the bare number of one of these. A zone
// ("+02:00") is obeyed. A date without time of day is refused: the rotation of the
// Earth in a day is worth 0.9 km/s.
func ParseTime(s string) (time.Time, error) {
	s = strings.TrimSpace(s)
	for _, l := range layouts {
		if t, err := time.Parse(l, s); err == nil {
			return t.UTC(), nil
		}
	}
	const fix = "write UTC as 2002-02-22T06:24:49, MJD 52327.267 or JD 2452327.767"
	word := strings.ToUpper(s)
	number := strings.TrimSpace(strings.TrimPrefix(strings.TrimPrefix(word, "M"), "JD"))
	x, err := strconv.ParseFloat(number, 64)
	switch {
	case err != nil || !(x == x):
	case strings.HasPrefix(word, "MJD") && x >= 0 && x < 1e5:
		return FromMJD(x), nil
	case !strings.HasPrefix(word, "MJD") && x >= 2.4e6 && x < 2.5e6:
		return FromMJD(x - 2400000.5), nil
	case !strings.HasPrefix(word, "J") && !strings.HasPrefix(word, "M") && x >= 15000 && x < 1e5:
		return FromMJD(x), nil
	}
	if _, err := parseDate(s); err == nil {
		return time.Time{}, oops.Input("", "time", fmt.Sprintf("%q has no time of day", s), "the Earth's rotation matters: "+fix)
	}
	return time.Time{}, oops.Input("", "time", fmt.Sprintf("%q is not a time", s), fix)
}

// parseDate reads a date without time: "2018-11-16", "2011:04:18", or the form of
// FITS files before 2000, "18/12/93", whose years are of the 20th century.
func parseDate(s string) (time.Time, error) {
	for _, l := range []string{"2006-01-02", "2006:01:02", "2006/01/02", "02/01/2006"} {
		if t, err := time.Parse(l, s); err == nil {
			return t, nil
		}
	}
	t, err := time.Parse("02/01/06", s)
	if err == nil && t.Year() >= 2000 {
		t = t.AddDate(-100, 0, 0)
	}
	return t, err
}

// clockOf reads a time of day as a duration: "18:48:08.265" or seconds ("67688.3").
func clockOf(s string) (time.Duration, bool) {
	if x, err := strconv.ParseFloat(s, 64); err == nil {
		return time.Duration(x * 1e9), x >= 0 && x < 86401
	}
	if strings.Count(s, ":") != 2 {
		return 0, false
	}
	x, err := ParseAngle(s, false)
	return time.Duration(x * 3600e9), err == nil && x >= 0 && x < 24.001
}
