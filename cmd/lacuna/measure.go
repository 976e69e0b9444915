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
		&cli.StringFlag{Name: "medium", Usage: "wavelengths of the file: `air|vacuum`, where it does not say"},
		&cli.StringFlag{Name: "frame", Usage: "velocity frame of the file, where it does not say: `topocentric|heliocentric|...`"},
		&cli.StringFlag{Name: "correction", Usage: "velocity `KM/S` to add to reach the frame of the results, in place of the header's"},
		&cli.StringFlag{Name: "unit", Usage: "unit of the wavelengths, where the file does not say: `Angstrom|nm|um`"},
		&cli.StringFlag{Name: "columns", Usage: "columns to read, `WAVE,FLUX[,ERR]` by name or number from 1"},
		&cli.IntFlag{Name: "hdu", Value: -1, Usage: "FITS unit `N` to read, 0 the primary one", DefaultText: "found"},
		&cli.StringFlag{Name: "resolving-power", Usage: "λ/FWHM of the instrument, `R`, in place of the header's"},
		&cli.BoolFlag{Name: "normalised", Usage: "the continuum was divided out; needs --continuum-err"},
		&cli.StringFlag{Name: "continuum-err", Usage: "relative 1σ error `X` of a continuum that is not our own"},
		&cli.StringFlag{Name: "continuum-column", Usage: "`COLUMN` of the file that holds the continuum; needs --continuum-err"},
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
		return sp, usage(c, "a continuum that is not our own needs its relative error: --continuum-err 0.01, say")
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
			&cli.StringSliceFlag{Name: "line", Usage: "the transition `NAME`; may be repeated"},
			&cli.StringFlag{Name: "window", Usage: "integration range `LO,HI` in km/s"},
			&cli.BoolFlag{Name: "auto-window", Usage: "--window is the range to search; the one used is found"},
			&cli.StringSliceFlag{Name: "continuum", Usage: "continuum range `LO,HI` in km/s; may be repeated; else found"},
			&cli.IntFlag{Name: "degree", Value: -1, Usage: "degree of the continuum `N`", DefaultText: "by information criterion"},
			&cli.IntFlag{Name: "order", Usage: "the one order `N` to measure it in", DefaultText: "every order that holds it"},
			&cli.StringFlag{Name: "to", Value: "heliocentric", Usage: "frame of the results: `heliocentric|barycentric|LSRK`"},
			&cli.StringFlag{Name: "zero-level", Usage: "zero level and its error `LEVEL,ERR` over the continuum", DefaultText: "measured on black cores, else 0 ± 0.01"},
			&cli.StringFlag{Name: "b", Usage: "Doppler parameter `KM/S` assumed for a limit"},
			&cli.StringFlag{Name: "f-set", Value: "default", Usage: "set of oscillator strengths `NAME`"},
			&cli.StringFlag{Name: "line-table", Usage: "CSV `FILE` with transitions of your own"},
			&cli.StringFlag{Name: "figure", Usage: "write a figure to `FILE.svg`"},
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
		if err := report.WidthText(c.App.Writer, w, to, textOptions()); err != nil {
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
