package frame

import (
	"fmt"
	"math"
	"time"
)

// A Claim is a velocity correction that came with a spectrum.
type Claim struct {
	Keyword string  // where it stands
	V       float64 // as written, taken for km/s
	To      Kind    // frame it leads to; Unknown if the keyword does not say
	Axis    Kind    // frame of the wavelengths according to the file; Unknown if it does not say
}

// A Verdict says what a claimed correction is.
type Verdict string

// The verdicts.
const (
	Agrees     Verdict = "agrees"
	Small      Verdict = "agrees, sign open"  // both near zero
	Opposite   Verdict = "opposite sign"      // the observer's velocity, to subtract
	Metres     Verdict = "m/s"                // in m/s
	OtherFrame Verdict = "other frame"        // agrees with the correction to another frame
	OtherTime  Verdict = "other time"         // made for the start or the end of the exposure
	WestEast   Verdict = "longitude reversed" // made with the longitude of the wrong sign
	Differs    Verdict = "differs"
)

// A Judgement compares a claimed correction with ours.
type Judgement struct {
	Verdict Verdict
	Ours    float64 // km/s, to add, for the frame of the claim
	Diff    float64 // km/s, claim − ours, as written
	Text    string  // one sentence or two for the reader
}

// agreeWithin is how far (km/s) a header's correction may be from ours to count
// as the same: the simple formulas of reduction programs reach 5 to 20 m/s, and
// pointing coordinates or the light's mid-time add as much.
const agreeWithin = 0.05

// Judge compares a claimed correction with the one computed for the exposure,
// and says what the difference looks like and whether the claim is already in the
// wavelengths. A value alone never tells the latter: the frame of the axis does,
// or telluric lines (see AppliedFromTelluric).
func Judge(c Claim, e Exposure) (Judgement, error) {
	v, err := e.Corrections()
	if err != nil {
		return Judgement{}, err
	}
	frame := c.To
	ours, ok := v.To(frame)
	if !ok || frame == Topocentric {
		frame = Heliocent
		ours = v.Helio
		if math.Abs(c.V-v.LSRK) < math.Abs(c.V-v.Helio) && math.Abs(c.V-v.LSRK) <= agreeWithin {
			frame, ours = LSRK, v.LSRK
		}
	}
	j := Judgement{Verdict: Differs, Ours: ours, Diff: c.V - ours}
	same := func(x, y float64) bool { return math.Abs(x-y) <= agreeWithin }
	name := fmt.Sprintf("%s %+.3f", c.Keyword, c.V)
	mine := fmt.Sprintf("the correction to %s is %+.3f km/s", frame, ours)
	switch {
	case same(c.V, ours) && same(c.V, -ours):
		j.Verdict, j.Text = Small, fmt.Sprintf("%s agrees with ours within %.0f m/s, but both are too small to tell the sign; %s.", name, math.Ceil(1e3*math.Abs(j.Diff)), mine)
	case same(c.V, ours):
		j.Verdict, j.Text = Agrees, fmt.Sprintf("%s agrees with ours within %.0f m/s: add it; %s.", name, math.Ceil(1e3*math.Abs(j.Diff)), mine)
		if end := moment(c.V, e, frame, 0.002); math.Abs(j.Diff) > 0.005 && end != "" {
			j.Text += fmt.Sprintf(" It was made for the %s of the exposure.", end)
		}
	case same(c.V, -ours):
		j.Verdict, j.Text = Opposite, fmt.Sprintf("%s has the opposite sign: it is the velocity of the observer, to subtract; %s.", name, mine)
	case same(c.V/1000, ours):
		j.Verdict, j.Text = Metres, fmt.Sprintf("%s is in m/s; %s.", name, mine)
	case same(c.V/1000, -ours):
		j.Verdict, j.Text = Metres, fmt.Sprintf("%s is in m/s and has the opposite sign; %s.", name, mine)
	default:
		j.Verdict, j.Text = diagnose(c, e, v, frame)
		if j.Text == "" {
			j.Text = fmt.Sprintf("%s differs from ours by %+.3f km/s, and neither sign, unit, frame nor time explains it: check coordinates, time and site.", name, j.Diff)
			if math.Abs(j.Diff) < 0.3 {
				j.Text = fmt.Sprintf("%s differs from ours by %+.3f km/s, as a rough formula or a time off by minutes would.", name, j.Diff)
			}
		} else {
			j.Text = fmt.Sprintf("%s %s.", name, j.Text)
		}
		j.Text += fmt.Sprintf(" Ours: %s.", mine)
	}
	if v.Altitude < -1 {
		j.Text += fmt.Sprintf(" The target was %.0f° below the horizon then: time, site or coordinates are wrong.", -v.Altitude)
	}
	j.Text += " " + axis(c, frame)
	return j, nil
}

// diagnose looks for another frame, time or sign of the longitude that makes the claim.
func diagnose(c Claim, e Exposure, v Velocities, frame Kind) (Verdict, string) {
	for _, sign := range []float64{1, -1} {
		tail := ""
		if sign < 0 {
			tail = ", with the opposite sign"
		}
		x := sign * c.V
		same := func(y float64) bool { return math.Abs(x-y) <= agreeWithin }
		if end := moment(x, e, frame, 0.01); end != "" {
			return OtherTime, fmt.Sprintf("was made for the %s of the exposure, not its middle%s", end, tail)
		}
		for _, k := range []Kind{Heliocent, LSRK, LSRD, Geocentric} {
			if y, _ := v.To(k); k != frame && same(y) {
				return OtherFrame, fmt.Sprintf("is the correction to %s%s", k, tail)
			}
		}
		if same(v.Helio - v.Diurnal) {
			return OtherFrame, fmt.Sprintf("lacks the rotation of the Earth, %+.3f km/s%s", v.Diurnal, tail)
		}
		mirror := e.Site
		mirror.Lon = -mirror.Lon
		if w, err := Corrections(e.Mid, mirror, e.Target); err == nil {
			if y, _ := w.To(frame); same(y) {
				return WestEast, fmt.Sprintf("was made with the longitude of the wrong sign%s", tail)
			}
		}
	}
	return Differs, ""
}

// moment says at which end of the exposure x (km/s) is the correction, within tol.
func moment(x float64, e Exposure, frame Kind, tol float64) string {
	for _, t := range []struct {
		when time.Time
		name string
	}{{e.Start, "start"}, {e.End, "end"}} {
		if w, err := Corrections(t.when, e.Site, e.Target); err == nil {
			if y, _ := w.To(frame); math.Abs(x-y) <= tol {
				return t.name
			}
		}
	}
	return ""
}

// axis says whether the claim is in the wavelengths.
func axis(c Claim, frame Kind) string {
	switch {
	case c.Axis == Topocentric:
		return "The file gives topocentric wavelengths: not applied yet."
	case c.Axis == Unknown:
		return "The file does not say whether it is applied: telluric lines at 0 km/s mean no, at the correction itself yes."
	case c.Axis == frame, c.Axis == Heliocent && frame == Barycentric, c.Axis == Barycentric && frame == Heliocent:
		return fmt.Sprintf("The file gives %s wavelengths: applied already, do not add it again.", c.Axis)
	}
	return fmt.Sprintf("The file gives %s wavelengths: apply only what leads on from there.", c.Axis)
}

// AppliedFromTelluric tells from the velocity (km/s, v = cz, with its error) at
// which telluric lines are found in a spectrum's own scale what was done with a
// correction v: those lines rest in the observer's frame, so they show the shift
// that was applied. The second result is false where the hypotheses lie too
// close, within 3 σ of each other at the measured place, or none fits.
func AppliedFromTelluric(shift, err, v float64) (string, bool) {
	options := []struct {
		at   float64
		text string
	}{
		{0, "not applied: telluric lines stand at rest"},
		{v, "applied: telluric lines stand at the correction"},
		{-v, "applied with the wrong sign"},
		{AddVelocity(v, v), "applied twice"},
	}
	// Besides the statistical error 0.3 km/s of the zero point of a slit spectrograph.
	tol := 3 * math.Hypot(err, 0.3)
	var fits []string
	for _, o := range options {
		if math.Abs(shift-o.at) <= tol {
			fits = append(fits, o.text)
		}
	}
	switch {
	case !(tol >= 0) || len(fits) == 0:
		return fmt.Sprintf("telluric lines at %+.2f km/s fit neither 0 nor the correction %+.2f km/s", shift, v), false
	case len(fits) > 1:
		return fmt.Sprintf("telluric lines at %+.2f ± %.2f km/s cannot tell: the correction is only %+.2f km/s", shift, err, v), false
	}
	return fits[0], true
}
