package frame

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"

	"lacuna/internal/oops"
)

// An Exposure is what a velocity correction needs to know of a spectrum, and
// which keywords said it.
type Exposure struct {
	Start, Mid, End time.Time // UTC; all equal where the length is unknown
	TimeBy          string
	Site            Site
	SiteBy          string
	Target          Target
	TargetBy        string
	Notes           []string // what was concluded rather than read
}

func (e *Exposure) note(format string, a ...any) {
	e.Notes = append(e.Notes, fmt.Sprintf(format, a...))
}

// Corrections returns the corrections at the middle of the exposure.
func (e Exposure) Corrections() (Velocities, error) { return Corrections(e.Mid, e.Site, e.Target) }

// Keys of headers, the more reliable first.
var (
	midKeys   = []string{"DATE-AVG", "DATE-MID", "MJD-MID", "MJD-AVG", "LJD-MID", "JD-MID"}
	startKeys = []string{"DATE-OBS", "DATE-BEG", "MJD-OBS", "MJD-BEG", "MJDSTART", "TEXPSTRT", "EXPSTART", "UTMJD", "MJD", "LJD-OBS", "JD-OBS", "JD"}
	endKeys   = []string{"DATE-END", "MJD-END", "MJDEND"}
	dateKeys  = []string{"DATE-OBS", "UT-DATE", "UTDATE", "TDATEOBS", "LDATEOBS"}
	clockKeys = []string{"UT-START", "UTSTART", "TIME-OBS", "UTC-OBS", "UTOPEN", "UTC-STRT", "TTIMEOBS", "LTIMEOBS", "UT-TIME", "UT", "UTC", "OBSTIME", "TM-START"}
	clockEnds = []string{"UT-END", "UTEND"}
	timeKeys  = []string{"EXPTIME", "TEXPTIME", "EXPOSURE", "ITIME", "LEXPTIME"}
	placeKeys = [][3]string{{"ESO TEL GEOLON", "ESO TEL GEOLAT", "ESO TEL GEOELEV"}, {"OBSGEO-L", "OBSGEO-B", "OBSGEO-H"}, {"GEO_LONG", "GEO_LAT", "GEO_ELEV"},
		{"SITELONG", "SITELAT", "SITEELEV"}, {"SITELONG", "SITELAT", "SITEALT"}, {"LONG_OBS", "LAT_OBS", "ALT_OBS"}, {"LONGITUD", "LATITUDE", "HEIGHT"}, {"LONGITUD", "LATITUDE", "ALTITUDE"}, {"OBS-LONG", "OBS-LAT", "OBS-ELEV"}}
	nameKeys = []string{"OBSERVAT", "SITENAME", "TELESCOP", "BSS_SITE"}
	skyKeys  = [][2]string{{"RA_TARG", "DEC_TARG"}, {"RA", "DEC"}, {"RA-D", "DEC-D"}, {"OBJCTRA", "OBJCTDEC"}, {"MEANRA", "MEANDEC"}, {"LTARGRA", "LTARGDEC"}, {"TELRA", "TELDEC"}}
)

// ExposureKeys returns every keyword that ReadExposure may ask for.
func ExposureKeys() []string {
	out := []string{"TIMESYS", "EQUINOX", "EPOCH", "RADESYS", "RADECSYS"}
	for _, k := range [][]string{midKeys, startKeys, endKeys, dateKeys, clockKeys, clockEnds, timeKeys, nameKeys} {
		out = append(out, k...)
	}
	for _, k := range placeKeys {
		out = append(out, k[:]...)
	}
	for _, k := range skyKeys {
		out = append(out, k[:]...)
	}
	return out
}

// ReadExposure finds time, site and direction in the cards of a FITS header: card
// returns the text of a keyword ("ESO TEL GEOLON" for a HIERARCH one), "" where
// there is none.
//
// Nothing is guessed. A longitude whose sign convention the keyword leaves open
// must agree with a known observatory; coordinates of another equinox are precessed;
// times in TAI are converted. The error, the user's, lists all that is missing; the
// exposure then holds what was found.
func ReadExposure(card func(key string) string) (Exposure, error) {
	var e Exposure
	get := func(key string) string { return strings.TrimSpace(card(key)) }
	var missing []string
	for _, err := range []error{e.readTime(get), e.readSite(get), e.readTarget(get)} {
		if err != nil {
			missing = append(missing, err.Error())
		}
	}
	if missing != nil {
		return e, oops.Input("", "header", "no velocity correction can be computed: "+strings.Join(missing, "; "),
			"give the rest to lacuna velocity --target --time --site")
	}
	return e, nil
}

// readTime fills start, middle and end.
func (e *Exposure) readTime(get func(string) string) error {
	shift := time.Duration(0) // what turns the header's scale into UTC
	scale := strings.ToUpper(get("TIMESYS"))
	moment := func(key string) (time.Time, bool) {
		s := get(key)
		var t time.Time
		if x, err := strconv.ParseFloat(s, 64); err == nil { // by size, whatever the keyword
			if x > 2.4e6 {
				x -= 2400000.5
			}
			if !(x > 15000 && x < 1e5) {
				return t, false
			}
			t = FromMJD(x)
		} else if t, err = ParseTime(s); err != nil {
			return t, false
		}
		return t, true
	}
	length, lengthKey := math.NaN(), ""
	for _, k := range timeKeys {
		if x, err := strconv.ParseFloat(get(k), 64); err == nil && x > 0 && x < 1e6 {
			length, lengthKey = x, k
			break
		}
	}
	first := func(keys []string) (time.Time, string) {
		for _, k := range keys {
			if t, ok := moment(k); ok {
				return t, k
			}
		}
		return time.Time{}, ""
	}
	date, dateKey := time.Time{}, ""
	for _, k := range dateKeys {
		day, _, _ := strings.Cut(get(k), "T")
		if t, err := parseDate(day); err == nil {
			date, dateKey = t, k
			break
		}
	}
	clock := func(keys []string) (time.Time, string) {
		for _, k := range keys {
			if d, ok := clockOf(get(k)); ok && dateKey != "" {
				return date.Add(d), dateKey + " and " + k
			}
		}
		return time.Time{}, ""
	}
	start, by := first(startKeys)
	if by == "" {
		start, by = clock(clockKeys)
	} else {
		switch scale {
		case "", "UTC", "UT", "UT1", "GMT":
		case "TAI":
			shift = -time.Duration(TAIOffset(start) * 1e9)
		case "TT", "TDT", "ET", "TDB":
			shift = -time.Duration(ttOffset(start) * 1e9)
		default:
			return fmt.Errorf("its time scale TIMESYS %q is not known", scale)
		}
		if shift != 0 {
			e.note("%s is in %s: %.0f s taken off", by, scale, -shift.Seconds())
		}
		start = start.Add(shift)
	}
	if mid, k := first(midKeys); k != "" {
		e.Mid, e.TimeBy = mid.Add(shift), k
		e.Start, e.End = e.Mid, e.Mid
		if by != "" && !start.After(e.Mid) {
			e.Start = start
			e.End = e.Mid.Add(e.Mid.Sub(start))
		}
		return nil
	}
	if by == "" {
		return fmt.Errorf("no date with a time of day")
	}
	e.Start, e.TimeBy = start, by
	end, endKey := first(endKeys)
	if end = end.Add(shift); endKey == "" {
		if end, endKey = clock(clockEnds); endKey != "" && end.Before(start) {
			end = end.AddDate(0, 0, 1) // past midnight
		}
	}
	switch {
	case endKey != "" && !end.Before(start) && end.Sub(start) < 48*time.Hour:
		e.End, e.TimeBy = end, by+" to "+endKey
	case lengthKey != "":
		e.End, e.TimeBy = start.Add(time.Duration(length*1e9)), by+" and "+lengthKey
	default:
		e.End = start
		e.note("length of the exposure unknown: its start is taken for its middle")
	}
	e.Mid = start.Add(e.End.Sub(start) / 2)
	return nil
}

// readTarget fills the direction.
func (e *Exposure) readTarget(get func(string) string) error {
	type found struct {
		ra, dec float64
		key     string
		number  bool // a number, and no sexagesimal angle
	}
	var all []found
	for _, k := range skyKeys {
		s := get(k[0])
		ra, err1 := ParseAngle(s, true)
		dec, err2 := ParseAngle(get(k[1]), false)
		if s == "" || err1 != nil || err2 != nil || (Target{RA: ra, Dec: dec}).check() != nil {
			continue
		}
		_, err := strconv.ParseFloat(s, 64)
		all = append(all, found{ra, dec, k[0] + ", " + k[1], err == nil})
	}
	if len(all) == 0 {
		return fmt.Errorf("no coordinates")
	}
	f := all[0]
	if f.number {
		for _, o := range all[1:] {
			if o.number || math.Abs(o.dec-f.dec) > 1 {
				continue
			}
			off := func(ra float64) float64 { return math.Abs(math.Mod(ra-o.ra+540, 360) - 180) }
			if off(f.ra) > 2 && off(15*f.ra) < 2 {
				f.ra *= 15
				e.note("%s is in hours: %s says so", f.key, o.key)
			}
			break
		}
	}
	year, key := 2000.0, ""
	if x, err := strconv.ParseFloat(strings.TrimLeft(get("EQUINOX"), "JB"), 64); err == nil {
		year, key = x, "EQUINOX"
	} else if x, err := strconv.ParseFloat(strings.TrimLeft(get("EPOCH"), "JB"), 64); err == nil {
		year, key = x, "EPOCH"
	}
	system := get("RADESYS") + get("RADECSYS")
	switch {
	case strings.HasPrefix(system, "ICRS") || year == 2000:
	case !(year >= 1800 && year <= 2100):
		return fmt.Errorf("%s %g of the coordinates is no year", key, year)
	case key == "EPOCH" && year != math.Trunc(year):
		// Some observatories write the date of the observation there.
		return fmt.Errorf("EPOCH %g may be an equinox or a date, and no EQUINOX says which", year)
	default:
		f.ra, f.dec = FromEquinox(f.ra, f.dec, year)
		e.note("coordinates precessed from %s %g", key, year)
	}
	e.Target, e.TargetBy = Target{RA: f.ra, Dec: f.dec}, f.key
	return nil
}
