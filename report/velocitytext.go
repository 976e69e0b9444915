package report

import (
	"fmt"
	"io"
	"math"
	"time"

	"lacuna/spectrum/frame"
)

// A Velocity is what the velocity corrections of one observation are, ready to
// print.
type Velocity struct {
	Target   VelocityTarget  `json:"target"`
	Site     VelocitySite    `json:"site"`
	Start    time.Time       `json:"start"`
	Mid      time.Time       `json:"middle"` // what the corrections are for
	Exposure float64         `json:"exposure_s,omitempty"`
	Change   float64         `json:"change_over_exposure_kms,omitempty"` // of the barycentric correction
	Frames   []VelocityFrame `json:"frames"`
	From     frame.Kind      `json:"velocity_from,omitempty"` // frame in which a velocity was given
	Notes    []string        `json:"notes,omitempty"`
}

// A VelocityTarget is the direction, degrees, at the time of the observation.
type VelocityTarget struct {
	RA       float64  `json:"ra_deg"`
	Dec      float64  `json:"dec_deg"`
	L        float64  `json:"l_deg"`
	B        float64  `json:"b_deg"`
	Altitude *float64 `json:"altitude_deg,omitempty"`
}

// A VelocitySite is the place: degrees east and north, metres.
type VelocitySite struct {
	Name   string  `json:"name"`
	Lon    float64 `json:"lon_deg"`
	Lat    float64 `json:"lat_deg"`
	Height float64 `json:"height_m"`
	Source string  `json:"source"`
	Status string  `json:"status"`
}

// A VelocityFrame is one row: the correction from topocentric, and the given
// velocity in this frame.
type VelocityFrame struct {
	Frame      string   `json:"frame"`
	Correction float64  `json:"correction_kms"`
	Velocity   *float64 `json:"velocity_kms,omitempty"`
	What       string   `json:"what"`
}

// NewVelocity arranges corrections v of a time, a site and a target; motions are
// solar motions to show besides LSRK and LSRD.
func NewVelocity(v frame.Velocities, site frame.Site, start, mid time.Time, motions ...frame.SolarMotion) Velocity {
	out := Velocity{
		Target: VelocityTarget{RA: v.RA, Dec: v.Dec, L: v.L, B: v.B},
		Site:   VelocitySite{site.Name, site.Lon, site.Lat, site.Height, site.Source, site.Status},
		Start:  start, Mid: mid,
	}
	if finite(v.Altitude) {
		out.Target.Altitude = &v.Altitude
	}
	add := func(name string, x float64, what string) {
		out.Frames = append(out.Frames, VelocityFrame{Frame: name, Correction: x, What: what})
	}
	add(string(frame.Topocentric), 0, "the telescope")
	add(string(frame.Geocentric), v.Diurnal, "the Earth's centre: rotation taken off")
	add(string(frame.Heliocent), v.Helio, "the Sun's centre, classical")
	add(string(frame.Barycentric), v.BaryFull, "the solar system's barycentre, with time dilation and gravity")
	add("classical", v.Bary, "the barycentre, classical")
	add(string(frame.LSRK), v.LSRK, "kinematic local standard of rest, 20 km/s to 18 h +30° (1900)")
	add(string(frame.LSRD), v.LSRD, "dynamical local standard of rest, (9, 12, 7) km/s")
	for _, m := range motions {
		add(m.Key, v.Relative(m), fmt.Sprintf("solar motion (%g, %g, %g) km/s, %s", m.U, m.V, m.W, m.Source))
	}
	return out
}

// SetVelocity fills in a velocity of the target (km/s, v = cz) given in one of the
// frames; from must be one that frame.Velocities knows.
func (v *Velocity) SetVelocity(x float64, from frame.Kind) bool {
	for _, f := range v.Frames {
		if f.Frame != string(from) {
			continue
		}
		v.From = from
		for i := range v.Frames {
			y := frame.AddVelocity(frame.SubVelocity(x, f.Correction), v.Frames[i].Correction)
			v.Frames[i].Velocity = &y
		}
		return true
	}
	return false
}

// VelocityText writes the corrections to all frames.
func VelocityText(w io.Writer, v Velocity, o Options) error {
	p := newPage(o)
	g := &grid{indent: 0, align: "lf"}
	say := func(name, text string) { g.add(plainCell(name), plainCell(text)) }
	say("target", minus(fmt.Sprintf("RA %.5f° Dec %+.5f° (ICRS), l %.3f° b %+.3f°", v.Target.RA, v.Target.Dec, v.Target.L, v.Target.B)))
	site := v.Site.Name
	if v.Target.Altitude != nil {
		site += fmt.Sprintf(": %.4f° %+.4f° %.0f m", v.Site.Lon, v.Site.Lat, v.Site.Height)
	}
	if v.Site.Status == "memory" {
		site += " (from memory, not seen in its source)"
	}
	say("site", minus(site))
	mid := v.Mid.Format("2006-01-02T15:04:05.0") + " UTC"
	if v.Exposure > 0 {
		mid += fmt.Sprintf(", middle of %.0f s; the barycentric correction changes by %s km/s in them", v.Exposure, minus(fmt.Sprintf("%+.3f", v.Change)))
	}
	say("time", mid)
	if a := v.Target.Altitude; a != nil {
		say("altitude", minus(fmt.Sprintf("%.1f°", *a)))
	}
	p.grid(g)
	for _, n := range v.Notes {
		p.para("! ", n, warn)
	}
	p.blank()

	t := &grid{indent: 0, align: "lrf", head: []string{"frame", "add (km/s)", "of what"}}
	if v.From != "" {
		t = &grid{indent: 0, align: "lrrf", head: []string{"frame", "add (km/s)", "velocity", "of what"}}
	}
	for _, f := range v.Frames {
		cells := []cell{plainCell(f.Frame), plainCell(minus(fmt.Sprintf("%+.4f", f.Correction)))}
		if v.From != "" {
			x := math.NaN()
			if f.Velocity != nil {
				x = *f.Velocity
			}
			cells = append(cells, plainCell(minus(fmt.Sprintf("%+.4f", x))))
		}
		t.add(append(cells, plainCell(f.What))...)
	}
	p.grid(t)
	p.blank()
	p.para("", "Add to a topocentric velocity as a Doppler factor: 1 + z = (1 + z_topo)(1 + v/c), λ = λ_topo (1 + v/c). Positive: the telescope moves towards the target. Good to 0.1 m/s for given time, place and direction.", faint)
	return p.writeTo(w)
}

// SitesText writes the table of observatories.
func SitesText(w io.Writer, sites []frame.Site, o Options) error {
	p := newPage(o)
	g := &grid{indent: 0, align: "lrrrlf", head: []string{"site", "lon (°E)", "lat (°N)", "m", "status", "source"}}
	for _, s := range sites {
		tone := normal
		if s.Status == "memory" {
			tone = warn
		}
		g.add(plainCell(s.Name), plainCell(minus(fmt.Sprintf("%.4f", s.Lon))), plainCell(minus(fmt.Sprintf("%.4f", s.Lat))),
			plainCell(fmt.Sprintf("%.0f", s.Height)), cell{s.Status, tone}, plainCell(s.Source))
	}
	p.grid(g)
	return p.writeTo(w)
}
