package frame

import (
	_ "embed"
	"encoding/csv"
	"fmt"
	"math"
	"strconv"
	"strings"
	"sync"

	"lacuna/internal/oops"
)

// A Site is a place on the Earth.
type Site struct {
	Name     string
	Aliases  []string `json:",omitempty"` // words of FITS keywords and of everyday use
	Lon, Lat float64  // degrees, east and north positive, geodetic (WGS84)
	Height   float64  // m
	Source   string
	Status   string // "verified" or "memory": whether the numbers were seen in the source
	Centre   bool   `json:",omitempty"` // the Earth's centre: no rotation, no horizon
}

// Geocentre stands for the Earth's centre: the corrections lack the observer's
// motion about it, up to 0.47 km/s on the ground and 8 km/s for a satellite in
// low orbit.
var Geocentre = Site{Name: "Earth's centre", Centre: true, Status: "definition"}

//go:embed sites.csv
var sitesCSV string

var siteTable = sync.OnceValue(func() []Site {
	r := csv.NewReader(strings.NewReader(sitesCSV))
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		panic("frame: sites.csv: " + err.Error())
	}
	var out []Site
	for _, f := range rows[1:] {
		s := Site{Name: f[0], Aliases: strings.Split(f[1], ";"), Source: f[5], Status: f[6]}
		for i, p := range []*float64{&s.Lon, &s.Lat, &s.Height} {
			if *p, err = strconv.ParseFloat(f[2+i], 64); err != nil {
				panic("frame: sites.csv: " + err.Error())
			}
		}
		out = append(out, s)
	}
	return out
})

// Sites returns the table of observatories, with source and status of each row.
func Sites() []Site { return append([]Site(nil), siteTable()...) }

// orbiting are telescopes that no place on the ground stands for.
var orbiting = []string{"HST", "IUE", "FUSE", "Copernicus", "OAO-3", "ORFEUS", "Hubble Space Telescope", "GHRS", "EUVE", "JWST", "Swift", "GALEX"}

// FindSite returns the row of the table that a word names: its name or an alias,
// in any case, without regard to spaces and punctuation ("ESO-VLT-U2", "kpno",
// "Keck I"), or "geocentre". The error is the user's to mend and says the nearest
// names; for a satellite it says why there is none.
func FindSite(word string) (Site, error) {
	key := letters(word)
	if key == "geocentre" || key == "geocenter" || key == "earthscentre" {
		return Geocentre, nil
	}
	var names []string
	for _, s := range siteTable() {
		for _, a := range append([]string{s.Name}, s.Aliases...) {
			if key != "" && letters(a) == key {
				return s, nil
			}
			names = append(names, a)
		}
	}
	for _, o := range orbiting {
		if letters(o) == key {
			return Site{}, oops.Input("", "site", word+" is in orbit: no place on the ground stands for it",
				"take the velocity correction from the file's header; \"geocentre\" leaves out the orbit, up to 8 km/s")
		}
	}
	return Site{}, oops.Input("", "site", fmt.Sprintf("%q is not in the table of observatories", word),
		hint(word, names, "lacuna velocity --site list shows all, or write lon,lat,height: degrees east and north, metres"))
}

// ParseSite is FindSite that also takes "lon,lat,height": degrees, east and
// north positive, and metres above sea level.
func ParseSite(s string) (Site, error) {
	if x, ok := numbers(s, 3); ok {
		site := Site{Name: "given by the user", Lon: x[0], Lat: x[1], Height: x[2], Source: "user", Status: "user"}
		return site, site.check()
	}
	if strings.Contains(s, ",") {
		return Site{}, oops.Input("", "site", fmt.Sprintf("%q is not lon,lat,height", s), "write three numbers: degrees east and north, metres (-70.403,-24.625,2635)")
	}
	return FindSite(s)
}

func (s Site) check() error {
	if s.Centre {
		return nil
	}
	if !(s.Lon >= -360 && s.Lon <= 360) || !(s.Lat >= -90 && s.Lat <= 90) || !(s.Height >= -500 && s.Height <= 20000) {
		return oops.Input("", "site", fmt.Sprintf("longitude %g°, latitude %g°, height %g m is no place of an observatory", s.Lon, s.Lat, s.Height),
			"write degrees east (−360 to 360) and north, and metres (−500 to 20000)")
	}
	return nil
}

// vectors returns place (km), velocity (km/s) and zenith of the site relative to
// the Earth's centre, in equatorial axes, for days of UT1 and centuries of TT.
func (s Site) vectors(ut, t float64) (place, motion, zenith vec) {
	if s.Centre {
		return vec{}, vec{}, vec{}
	}
	sl, cl := math.Sincos(s.Lon * degree)
	sf, cf := math.Sincos(s.Lat * degree)
	// Radius of curvature across the meridian; the ellipsoid's other axis is
	// shorter by (1−f).
	e2 := flattening * (2 - flattening)
	r := earthAxis / math.Sqrt(1-e2*sf*sf)
	h := s.Height / 1000
	fixed := vec{(r + h) * cf * cl, (r + h) * cf * sl, (r*(1-e2) + h) * sf}
	turn := rotation(ut, t)
	return turn.of(fixed), turn.of(vec{-spin * fixed[1], spin * fixed[0], 0}), turn.of(vec{cf * cl, cf * sl, sf})
}

// distance returns the angle between two sites in degrees.
func (s Site) distance(o Site) float64 {
	a := Target{RA: s.Lon, Dec: s.Lat}.direction(2000)
	b := Target{RA: o.Lon, Dec: o.Lat}.direction(2000)
	return math.Acos(max(-1, min(1, a.dot(b)))) / degree
}

// numbers reads n numbers with commas between.
func numbers(s string, n int) ([]float64, bool) {
	words := strings.Split(s, ",")
	if len(words) != n {
		return nil, false
	}
	out := make([]float64, n)
	for i, w := range words {
		x, err := strconv.ParseFloat(strings.TrimSpace(w), 64)
		if err != nil || math.IsNaN(x) || math.IsInf(x, 0) {
			return nil, false
		}
		out[i] = x
	}
	return out, true
}

// letters keeps letters and digits, in lower case and without accents.
func letters(s string) string {
	s = strings.NewReplacer("é", "e", "á", "a", "ó", "o", "ö", "o", "ü", "u", "ř", "r", "ş", "s", "ı", "i", "İ", "i", "ő", "o", "ž", "z", "Ü", "u", "Ö", "o").Replace(s)
	return strings.Map(func(r rune) rune {
		if r >= 'a' && r <= 'z' || r >= '0' && r <= '9' {
			return r
		}
		return -1
	}, strings.ToLower(s))
}
