package main

import (
	"fmt"
	"strings"

	"github.com/urfave/cli/v2"

	"lacuna/config"
	"lacuna/measure"
	"lacuna/report"
	"lacuna/spectrum/frame"
	"lacuna/survey"
)

// spectrumFlags are the user's word on a spectrum file, for commands without a
// survey.
func spectrumFlags() []cli.Flag {
	return []cli.Flag{
		&cli.StringFlag{Name: "medium", Usage: "wavelengths are in `air|vacuum`, where the file does not say"},
		&cli.StringFlag{Name: "frame", Usage: "wavelengths are in velocity frame `NAME`, where the file does not say: topocentric, geocentric, heliocentric, barycentric, LSRK, LSRD or source"},
		&cli.StringFlag{Name: "correction", Usage: "add velocity `KM/S` to reach the frame of the results, in place of the header's"},
		&cli.StringFlag{Name: "unit", Usage: "wavelengths are in `Angstrom|nm|um`, where the file does not say"},
		&cli.StringFlag{Name: "columns", Usage: "read columns `WAVE,FLUX[,ERR]`, by name or number from 1"},
		&cli.IntFlag{Name: "hdu", Value: -1, Usage: "read FITS unit `N`, 0 being the primary one", DefaultText: "found"},
		&cli.StringFlag{Name: "resolving-power", Usage: "take `R` as λ/FWHM of the instrument, in place of the header's"},
		&cli.BoolFlag{Name: "normalised", Usage: "the continuum was divided out; needs --continuum-err"},
		&cli.StringFlag{Name: "continuum-err", Usage: "relative 1σ error `X` of a continuum that was given"},
		&cli.StringFlag{Name: "continuum-column", Usage: "take the continuum from `COLUMN` of the file; needs --continuum-err"},
	}
}

// spectrumOf reads those flags.
func spectrumOf(c *cli.Context, path string) (config.Spectrum, error) {
	sp := config.Spectrum{File: path, Unit: c.String("unit"), ContinuumColumn: c.String("continuum-column")}
	var err error
	if w := c.String("medium"); w != "" {
		if sp.Medium, err = frame.ParseMedium(w); err != nil {
			return sp, usage(c, "--medium: %v", err)
		}
	}
	if w := c.String("frame"); w != "" {
		if sp.Frame, err = frame.ParseKind(w); err != nil {
			return sp, usage(c, "--frame: %v", err)
		}
	}
	if c.IsSet("correction") {
		v, err := number(c, "correction")
		if err != nil {
			return sp, err
		}
		sp.Correction = &v
	}
	if c.IsSet("resolving-power") {
		if sp.R, err = positive(c, "resolving-power"); err != nil {
			return sp, err
		}
	}
	if c.IsSet("continuum-err") {
		if sp.ContinuumErr, err = positive(c, "continuum-err"); err != nil {
			return sp, err
		}
	}
	if c.Bool("normalised") {
		yes := true
		sp.Normalised = &yes
	}
	if (sp.Normalised != nil || sp.ContinuumColumn != "") && sp.ContinuumErr == 0 {
		return sp, usage(c, "a continuum that was given needs its relative error: --continuum-err 0.01, say")
	}
	if h := c.Int("hdu"); h >= 0 {
		sp.HDU = &h
	}
	if w := c.String("columns"); w != "" {
		names := strings.Split(w, ",")
		if len(names) < 2 || len(names) > 3 {
			return sp, usage(c, "--columns %q is not WAVE,FLUX or WAVE,FLUX,ERR", w)
		}
		sp.Columns = config.Names{Wave: strings.TrimSpace(names[0]), Flux: strings.TrimSpace(names[1])}
		if len(names) == 3 {
			sp.Columns.Err = strings.TrimSpace(names[2])
		}
	}
	return sp, nil
}

func measureCommand() *cli.Command {
	return &cli.Command{
		Name: "measure", Usage: "one line in one spectrum: width, column or limit",
		ArgsUsage: `FILE --line "Na I 5889.95" --window -40,40 [options]`,
		Description: `Measures the equivalent width of a line with its error split by cause, the column from
the apparent optical depth, or an upper limit where nothing is there. No survey file is
needed. Velocities are in the frame of --to; say medium, frame and correction where the
file does not.

Example: lacuna measure lantern1_red.fits --line "Na I 5889.95" --window -40,40`,
		Flags: append([]cli.Flag{
			&cli.StringSliceFlag{Name: "line", Usage: "measure transition `NAME`; may be repeated"},
			&cli.StringFlag{Name: "window", Usage: "integrate over `LO,HI` km/s"},
			&cli.BoolFlag{Name: "auto-window", Usage: "--window is the range to search; the one used is found"},
			&cli.StringSliceFlag{Name: "continuum", Usage: "fit the continuum on `LO,HI` km/s; may be repeated", DefaultText: "found"},
			&cli.IntFlag{Name: "degree", Value: -1, Usage: "fit a continuum of degree `N`", DefaultText: "by information criterion"},
			&cli.IntFlag{Name: "order", Usage: "measure in order `N` alone", DefaultText: "every order that holds it"},
			&cli.StringFlag{Name: "to", Value: "heliocentric", Usage: "give velocities in frame `NAME`: heliocentric, barycentric or LSRK"},
			&cli.StringFlag{Name: "zero-level", Usage: "zero level and its error, `LEVEL,ERR`, over the continuum", DefaultText: "measured on black cores, else 0,0.01"},
			&cli.StringFlag{Name: "b", Usage: "assume Doppler parameter `KM/S` for a limit", DefaultText: "2 for atoms, 1 for molecules"},
			&cli.StringFlag{Name: "f-set", Value: "default", Usage: "use `NAME` as set of oscillator strengths"},
			&cli.StringFlag{Name: "line-table", Usage: "add transitions of your own from `FILE`, CSV"},
			&cli.StringFlag{Name: "figure", Usage: "write a figure into `FILE`, ending in .svg or .png"},
			&cli.BoolFlag{Name: "json", Usage: "print the result as JSON"},
		}, spectrumFlags()...),
		Action: measureAction,
	}
}

func measureAction(c *cli.Context) error {
	path, err := one(c, "spectrum file")
	if err != nil {
		return err
	}
	names := c.StringSlice("line")
	if len(names) == 0 {
		return usage(c, `no line given: --line "Na I 5889.95" (lacuna lines lists them)`)
	}
	if !c.IsSet("window") {
		return usage(c, "no window given: --window -40,40 in km/s")
	}
	task := survey.LineTask{AutoWindow: c.Bool("auto-window"), Degree: c.Int("degree")}
	if task.Window, err = pair(c, "window", c.String("window")); err != nil {
		return err
	}
	task.Velocity = task.Window
	for _, text := range c.StringSlice("continuum") {
		r, err := pair(c, "continuum", text)
		if err != nil {
			return err
		}
		if !task.AutoWindow && r[0] < task.Window[1] && r[1] > task.Window[0] {
			return usage(c, "--continuum %s reaches into the window %s", text, c.String("window"))
		}
		task.Continuum = append(task.Continuum, r)
	}
	if task.Degree < -1 || task.Degree > 5 {
		return usage(c, "--degree %d is not -1 (by information criterion) to 5", task.Degree)
	}
	if c.IsSet("b") {
		if task.B, err = positive(c, "b"); err != nil {
			return err
		}
	}
	if c.IsSet("order") {
		n := c.Int("order")
		task.Order = &n
	}
	zero := measure.Zero{Err: 0.01, By: "prior"}
	if c.IsSet("zero-level") {
		if zero, err = zeroFlag(c); err != nil {
			return err
		}
	}
	task.Zero = func(string) measure.Zero { return zero }
	sp, err := spectrumOf(c, path)
	if err != nil {
		return err
	}
	task.ContErr = func(string) float64 { return sp.ContinuumErr }
	table, err := survey.Tables(c.String("f-set"), c.String("line-table"))
	if err != nil {
		return err
	}
	to, err := frame.ParseKind(c.String("to"))
	if err != nil {
		return usage(c, "--to: %v", err)
	}
	lights, info, err := survey.Open(path, sp, nil, to, frame.Ciddor1996)
	if err != nil {
		return err
	}
	var tasks []survey.LineTask
	for _, name := range names {
		t := task
		if t.Line, err = table.Find(name); err != nil {
			return err
		}
		tasks = append(tasks, t)
	}
	widths, _, err := survey.MeasureLines(lights, tasks, table)
	if err != nil {
		return fmt.Errorf("%s: %w", path, err)
	}
	rec := survey.Record{Schema: survey.Schema, Name: info.Object, Status: "done", Result: survey.Result{
		FSet: c.String("f-set"), Frame: to, Spectra: []survey.SpectrumInfo{info}, Widths: widths,
	}}
	if rec.Name == "" {
		rec.Name = path
	}
	if f := c.String("figure"); f != "" {
		if err := report.WriteLineFigure(f, rec); err != nil {
			return err
		}
	}
	if c.Bool("json") {
		return report.JSON(c.App.Writer, rec)
	}
	for i, w := range widths {
		if i > 0 {
			fmt.Fprintln(c.App.Writer)
		}
		if err := report.WidthText(c.App.Writer, w, to, textOptions(c)); err != nil {
			return err
		}
	}
	return nil
}

// zeroFlag reads "0.003,0.001".
func zeroFlag(c *cli.Context) (measure.Zero, error) {
	level, errText, ok := strings.Cut(c.String("zero-level"), ",")
	z := measure.Zero{By: "user"}
	var err1, err2 error
	z.Level, err1 = parseNumber(level)
	z.Err, err2 = parseNumber(errText)
	if !ok || err1 != nil || err2 != nil || z.Err < 0 || z.Err > 0.5 || z.Level < -0.5 || z.Level > 0.5 {
		return z, usage(c, "--zero-level %q is not a level and its error, as parts of the continuum (0.003,0.001)", c.String("zero-level"))
	}
	return z, nil
}
