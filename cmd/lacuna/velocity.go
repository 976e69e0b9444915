package main

import (
	"fmt"
	"strings"
	"time"

	"github.com/urfave/cli/v2"

	"lacuna/internal/oops"
	"lacuna/report"
	"lacuna/spectrum/frame"
)

func velocityCommand() *cli.Command {
	return &cli.Command{
		Name: "velocity", Usage: "velocity corrections of an observation, to all frames",
		ArgsUsage: `--target "RA Dec" --time UTC --site NAME`,
		Description: `Computes what to add to a topocentric velocity to reach the Earth's centre, the Sun, the
barycentre and the local standards of rest, from direction, time and place, without network:
within 0.1 m/s for 1950 to 2060. It converts a velocity between these frames (--velocity)
and says what a correction found in a header is (--compare).

Example: lacuna velocity --target "83.8221 -5.3911" --time 2010-01-15T03:20:00 --site paranal`,
		Flags: []cli.Flag{
			&cli.StringFlag{Name: "target", Usage: "direction `\"RA DEC\"`: degrees, or hours and degrees with colons (ICRS)"},
			&cli.StringFlag{Name: "time", Usage: "start of the exposure `UTC`: 2010-01-15T03:20:00, MJD 55211.139 or JD 2455211.639"},
			&cli.StringFlag{Name: "site", Usage: "observatory `NAME` as FITS keywords write it, lon,lat,height (°E, °N, m), or geocentre; \"list\" lists the table"},
			&cli.StringFlag{Name: "exposure", Usage: "length of the exposure in `SECONDS`: its middle is taken"},
			&cli.StringFlag{Name: "pm", Usage: "proper motion `RA,DEC` in mas a year, the first with cos Dec"},
			&cli.StringFlag{Name: "epoch", Usage: "`YEAR` of the position, with --pm (default: 2000)"},
			&cli.StringFlag{Name: "equinox", Usage: "`YEAR` of equator and equinox of the coordinates, if they are not ICRS"},
			&cli.StringFlag{Name: "solar-motion", Usage: "one more local standard of rest: schonrich2010, reid2019, dehnen1998, or `U,V,W` in km/s"},
			&cli.StringFlag{Name: "velocity", Usage: "velocity of the target in `KM/S` (v = cz), to be shown in all frames"},
			&cli.StringFlag{Name: "from", Value: "TOPOCENT", Usage: "`FRAME` of --velocity"},
			&cli.StringFlag{Name: "compare", Usage: "correction `KM/S` found with a spectrum, to be compared"},
			&cli.BoolFlag{Name: "json", Usage: "print the result as JSON"},
		},
		Action: velocity,
	}
}

func velocity(c *cli.Context) error {
	if c.Args().Present() {
		return usage(c, "velocity takes options only, not %q", c.Args().First())
	}
	if c.String("site") == "list" {
		if c.Bool("json") {
			return report.JSON(c.App.Writer, frame.Sites())
		}
		return report.SitesText(c.App.Writer, frame.Sites(), textOptions(c))
	}
	for _, name := range []string{"target", "time", "site"} {
		if c.String(name) == "" {
			return usage(c, "no --%s given", name)
		}
	}
	e, err := exposureOf(c)
	if err != nil {
		return err
	}
	v, err := e.Corrections()
	if err != nil {
		return err
	}
	var motions []frame.SolarMotion
	if s := c.String("solar-motion"); s != "" {
		m, err := frame.FindSolarMotion(s)
		if err != nil {
			return err
		}
		motions = append(motions, m)
	}
	out := report.NewVelocity(v, e.Site, e.Start, e.Mid, motions...)
	if out.Exposure = e.End.Sub(e.Start).Seconds(); out.Exposure > 0 {
		a, err1 := frame.Corrections(e.Start, e.Site, e.Target)
		b, err2 := frame.Corrections(e.End, e.Site, e.Target)
		if err1 == nil && err2 == nil {
			out.Change = b.BaryFull - a.BaryFull
		}
	}
	if v.Altitude < -1 {
		out.Notes = append(out.Notes, "the target is below the horizon: check time, site and coordinates")
	}
	if c.IsSet("velocity") {
		if err := given(c, &out); err != nil {
			return err
		}
	}
	if c.IsSet("compare") {
		x, err := number(c, "compare")
		if err != nil {
			return err
		}
		j, err := frame.Judge(frame.Claim{Keyword: "the value", V: x}, e)
		if err != nil {
			return err
		}
		out.Notes = append(out.Notes, j.Text)
	}
	if c.Bool("json") {
		return report.JSON(c.App.Writer, out)
	}
	return report.VelocityText(c.App.Writer, out, textOptions(c))
}

// exposureOf reads place, time and direction.
func exposureOf(c *cli.Context) (frame.Exposure, error) {
	var e frame.Exposure
	var err error
	if e.Target, err = frame.ParseTarget(c.String("target")); err != nil {
		return e, err
	}
	if c.IsSet("equinox") {
		year, err := positive(c, "equinox")
		if err != nil {
			return e, err
		}
		if !(year >= 1800 && year <= 2100) {
			return e, usage(c, "--equinox %g is not a year from 1800 to 2100", year)
		}
		e.Target.RA, e.Target.Dec = frame.FromEquinox(e.Target.RA, e.Target.Dec, year)
	}
	if c.IsSet("pm") {
		if e.Target.PMRA, e.Target.PMDec, err = two(c, "pm"); err != nil {
			return e, err
		}
	}
	if c.IsSet("epoch") {
		if !c.IsSet("pm") {
			return e, usage(c, "--epoch means nothing without --pm")
		}
		if e.Target.Epoch, err = positive(c, "epoch"); err != nil {
			return e, err
		}
	}
	if e.Site, err = frame.ParseSite(c.String("site")); err != nil {
		return e, err
	}
	if e.Start, err = frame.ParseTime(c.String("time")); err != nil {
		return e, err
	}
	seconds := 0.0
	if c.IsSet("exposure") {
		if seconds, err = positive(c, "exposure"); err != nil {
			return e, err
		}
		if seconds > 172800 {
			return e, usage(c, "--exposure %g s is more than two days", seconds)
		}
	}
	e.End = e.Start.Add(time.Duration(seconds * 1e9))
	e.Mid = e.Start.Add(e.End.Sub(e.Start) / 2)
	return e, nil
}

// given fills in --velocity.
func given(c *cli.Context, out *report.Velocity) error {
	x, err := number(c, "velocity")
	if err != nil {
		return err
	}
	from, err := frame.ParseKind(c.String("from"))
	if err != nil {
		return err
	}
	if !(x > -frame.C) || !out.SetVelocity(x, from) {
		return oops.Input("", "--velocity", fmt.Sprintf("%g km/s in the frame %s cannot be converted", x, from),
			"frames are TOPOCENT, GEOCENTR, HELIOCEN, BARYCENT, LSRK and LSRD")
	}
	return nil
}

// two reads "x,y".
func two(c *cli.Context, option string) (x, y float64, err error) {
	a, b, ok := strings.Cut(c.String(option), ",")
	x, err1 := parseNumber(a)
	y, err2 := parseNumber(b)
	if !ok || err1 != nil || err2 != nil {
		return 0, 0, usage(c, "--%s %q is not two numbers with a comma between", option, c.String(option))
	}
	return x, y, nil
}
