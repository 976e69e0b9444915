package main

import (
	"fmt"
	"slices"
	"strings"

	"github.com/urfave/cli/v2"

	"lacuna/atomic"
	"lacuna/config"
	"lacuna/report"
	"lacuna/survey"
)

func fitCommand() *cli.Command {
	return &cli.Command{
		Name: "fit", Usage: "clouds fitted to lines of one spectrum: v, b and column of each",
		ArgsUsage: `FILE --line "Na I 5889.95" --window -40,20 --clouds -14,-6.5 [options]`,
		Description: `Fits clouds (velocity, Doppler parameter, column density of each species) to one or more
lines together, through the instrument's profile, with the continuum, the zero level and
the width of the profile in the errors. Start from clouds of your own (--clouds) or let
their number be found (--auto). Lines of the air in the windows are masked. The columns by
other methods stand beside the fitted ones. No survey file is needed; [[sightline.fit]] in
one does the same for many stars, and takes bounds, priors and ties.

Example: lacuna fit lantern1_blue.fits --line "Ca II K" --window -40,20 --clouds -14,-6.5`,
		Flags: slices.Concat([]cli.Flag{
			&cli.StringSliceFlag{Name: "line", Usage: "fit transition `NAME`; repeat it for all that are fitted together"},
			&cli.StringFlag{Name: "window", Usage: "the lines absorb within `LO,HI` km/s"},
			&cli.StringFlag{Name: "clouds", Usage: "start from clouds at `V,V,…` km/s"},
			&cli.BoolFlag{Name: "auto", Usage: "find the number of clouds"},
			&cli.IntFlag{Name: "most", Value: 8, Usage: "find `N` clouds at most"},
			&cli.StringFlag{Name: "b", Usage: "start from Doppler parameter `KM/S`", DefaultText: "2 for atoms, 1 for molecules"},
			&cli.BoolFlag{Name: "own-b", Usage: "each species of a cloud has its own b, not one for all"},
			&cli.BoolFlag{Name: "thermal", Usage: "split b into temperature and turbulence; needs species of two masses"},
			&cli.StringFlag{Name: "velocity-zero-err", Usage: "1σ error `KM/S` of the zero point of velocities, in the errors", DefaultText: "0"},
			&cli.BoolFlag{Name: "keep-telluric", Usage: "use pixels where lines of the air are known to fall, too"},
			&cli.StringFlag{Name: "line-spread", Usage: "read the line spread function from `FILE`", DefaultText: "a Gaussian of the resolving power"},
			&cli.IntFlag{Name: "seed", Value: 1, Usage: "seed of the random starts of --auto: `N`, 0 or more"},
		}, lineFlags(), outputFlags(), spectrumFlags()),
		Action: fitAction,
	}
}

func fitAction(c *cli.Context) error {
	a, err := ask(c)
	if err != nil {
		return err
	}
	f, err := fitOf(c)
	if err != nil {
		return err
	}
	var lines []atomic.Line
	for i, t := range a.tasks {
		if slices.Contains(f.Lines, t.Line.Name) {
			return usage(c, "--line %s is there twice", t.Line.Name)
		}
		lines = append(lines, t.Line)
		f.Lines = append(f.Lines, t.Line.Name)
		a.tasks[i].B = 0 // --b is where the fit starts here
	}
	for i := range a.tasks {
		a.tasks[i].Also = f.Lines
	}
	if f, err = startingB(c, f, lines); err != nil {
		return err
	}
	window := a.tasks[0].Window
	for _, cl := range f.Clouds {
		if v := *cl.V.Start; v < window[0] || v > window[1] {
			return usage(c, "--clouds: %g km/s lies outside the window %s", v, c.String("window"))
		}
	}
	pieces := survey.Cut(a.lights, a.tasks, a.table)
	rec := a.record(c)
	res := &rec.Result
	if res.Widths, res.Warnings, err = pieces.Measure(); err != nil {
		return fmt.Errorf("%s: %w", a.path, err)
	}
	fit, err := pieces.Fit(f, survey.FitOptions{Seed: c.Int("seed"), LineSpread: func(string) string { return c.String("line-spread") }})
	if err != nil {
		return fmt.Errorf("%s: %w", a.path, err)
	}
	res.Fits = []survey.Fit{fit}
	if err := survey.Columns(res, config.Sightline{Name: rec.Name, BRange: [2]float64{0.3, 30}, LimitSigma: 3}, a.table); err != nil {
		return fmt.Errorf("%s: %w", a.path, err)
	}
	if name := c.String("figure"); name != "" {
		if err := report.WriteCloudFigure(name, rec); err != nil {
			return err
		}
	}
	if c.Bool("json") {
		return report.JSON(c.App.Writer, rec)
	}
	return report.FitText(c.App.Writer, rec, textOptions(c))
}

// fitOf reads the options of the fit itself.
func fitOf(c *cli.Context) (config.Fit, error) {
	f := config.Fit{Degree: c.Int("degree"), Auto: c.Bool("auto"), Most: c.Int("most"), ShareB: !c.Bool("own-b"), ShareV: true,
		Thermal: c.Bool("thermal"), Telluric: "mask"}
	if c.Bool("keep-telluric") {
		f.Telluric = "keep"
	}
	switch {
	case f.Auto && c.IsSet("clouds"):
		return f, usage(c, "--auto finds the clouds, and --clouds gives them: keep one")
	case !f.Auto && !c.IsSet("clouds"):
		return f, usage(c, "no cloud to start from: --clouds -14,-6.5, or --auto")
	case f.Most < 1 || f.Most > 20:
		return f, usage(c, "--most %d is not 1 to 20", f.Most)
	case f.Thermal && !f.ShareB:
		return f, usage(c, "with --thermal the b of each species follows from temperature and turbulence: leave --own-b out")
	case c.Int("seed") < 0:
		return f, usage(c, "--seed %d is below 0", c.Int("seed"))
	}
	if c.IsSet("velocity-zero-err") {
		var err error
		if f.VelocityZeroErr, err = positive(c, "velocity-zero-err"); err != nil {
			return f, err
		}
	}
	if f.Auto {
		return f, nil
	}
	if n := strings.Count(c.String("clouds"), ",") + 1; n > config.MostClouds {
		return f, usage(c, "--clouds gives %d velocities; %d clouds at most", n, config.MostClouds)
	}
	for i, text := range strings.Split(c.String("clouds"), ",") {
		v, err := parseNumber(text)
		if err != nil {
			return f, usage(c, "--clouds %q is not a list of velocities with commas between (-14,-6.5)", c.String("clouds"))
		}
		if v < -maxVelocity || v > maxVelocity {
			return f, usage(c, "--clouds: %g km/s goes beyond ±%d km/s", v, maxVelocity)
		}
		f.Clouds = append(f.Clouds, config.FitCloud{Name: fmt.Sprintf("cloud %d", i+1), V: config.StartAt(v)})
	}
	return f, nil
}

// startingB gives clouds the b that they start from, and the fit its name.
func startingB(c *cli.Context, f config.Fit, lines []atomic.Line) (config.Fit, error) {
	b, err := 1.0, error(nil)
	masses := map[float64]bool{}
	var species []string
	for _, l := range lines {
		masses[l.Mass()] = true
		if !l.Molecule() {
			b = 2
		}
		if !slices.Contains(species, l.Carrier()) {
			species = append(species, l.Carrier())
		}
	}
	f.Name = strings.Join(species, " + ")
	if c.IsSet("b") {
		if b, err = positive(c, "b"); err != nil {
			return f, err
		}
	}
	if f.Thermal && len(masses) < 2 {
		return f, usage(c, "--thermal needs species of two masses: with one, temperature cannot be told from turbulence")
	}
	for i := range f.Clouds {
		if f.Thermal {
			t, turb := config.StartAt(100), config.StartAt(b/2)
			f.Clouds[i].T, f.Clouds[i].Turbulence = &t, &turb
			continue
		}
		p := config.StartAt(b)
		f.Clouds[i].B = &p
	}
	return f, nil
}
