package main

import (
	"fmt"
	"slices"
	"strings"

	"github.com/urfave/cli/v2"

	"lacuna/atomic"
	"lacuna/config"
	"lacuna/internal/oops"
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
		&cli.StringFlag{Name: "layout", Usage: "wavelength axis of an image is `linear|log10|ln`, where the header is wrong; orders: a table lists orders one after another"},
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
	sp := config.Spectrum{File: path, Unit: c.String("unit"), Layout: c.String("layout"), ContinuumColumn: c.String("continuum-column")}
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

// inOptions gives the advice of an error on a spectrum, which is written for
// survey files, in options of the command line.
func inOptions(err error) error {
	if m, ok := err.(*oops.Mistake); ok {
		return oops.Input(m.File, m.Where, m.What, asOptions.Replace(m.Fix))
	}
	return err
}

var asOptions = strings.NewReplacer(
	`medium = "air" or "vacuum"`, "--medium air or --medium vacuum", `medium = "vacuum"`, "--medium vacuum",
	`frame = "topocentric", "heliocentric" or "barycentric"`, "--frame topocentric, heliocentric or barycentric",
	"correction = km/s", "--correction KM/S,", "unit and medium by hand: unit, medium", "unit and medium by hand: --unit, --medium",
	`unit = "Angstrom", "nm", "um", …`, "--unit Angstrom, nm or um", `unit = "Angstrom"`, "--unit Angstrom", `layout = "linear"`, "--layout linear", `layout = "orders"`, "--layout orders", "columns = {wave = …, flux = …}", "--columns WAVE,FLUX", `layout = "log10", or unit`, "--layout log10, or --unit",
	"give ra and dec", "give ra and dec in a survey file",
)

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
			&cli.StringFlag{Name: "b", Usage: "assume Doppler parameter `KM/S` for a limit", DefaultText: "2 for atoms, 1 for molecules"},
		}, slices.Concat(lineFlags(), outputFlags(), spectrumFlags())...),
		Action: measureAction,
	}
}

// An asked is one spectrum with the lines that the command line asks for.
type asked struct {
	path   string
	sp     config.Spectrum
	to     frame.Kind
	table  *atomic.Table
	lights []survey.Light
	info   survey.SpectrumInfo
	tasks  []survey.LineTask
}

// record is the result of one spectrum, to be filled.
func (a asked) record(c *cli.Context) survey.Record {
	rec := survey.Record{Schema: survey.Schema, Name: a.info.Object, Status: "done", Result: survey.Result{
		FSet: c.String("f-set"), Frame: a.to, Spectra: []survey.SpectrumInfo{a.info},
	}}
	if rec.Name == "" {
		rec.Name = a.path
	}
	return rec
}

// lineFlags choose lines and how their continua are placed.
func lineFlags() []cli.Flag {
	return []cli.Flag{
		&cli.StringSliceFlag{Name: "continuum", Usage: "fit the continuum on `LO,HI` km/s; may be repeated", DefaultText: "found"},
		&cli.IntFlag{Name: "degree", Value: -1, Usage: "fit a continuum of degree `N`", DefaultText: "by information criterion"},
		&cli.IntFlag{Name: "order", Usage: "measure in order `N` alone", DefaultText: "every order that holds it"},
		&cli.StringFlag{Name: "to", Value: "heliocentric", Usage: "give velocities in frame `NAME`: heliocentric, barycentric or LSRK"},
		&cli.StringFlag{Name: "zero-level", Usage: "zero level and its error, `LEVEL,ERR`, over the continuum", DefaultText: "measured on black cores, else 0,0.01"},
	}
}

// outputFlags choose data tables and where the result goes.
func outputFlags() []cli.Flag {
	return []cli.Flag{
		&cli.StringFlag{Name: "f-set", Value: "default", Usage: "use `NAME` as set of oscillator strengths"},
		&cli.StringFlag{Name: "line-table", Usage: "add transitions of your own from `FILE`, CSV"},
		&cli.StringFlag{Name: "figure", Usage: "write a figure into `FILE`, ending in .svg or .png"},
		&cli.BoolFlag{Name: "json", Usage: "print the result as JSON"},
	}
}

// ask reads the options of lines and opens the spectrum.
func ask(c *cli.Context) (asked, error) {
	var a asked
	var err error
	if a.path, err = one(c, "spectrum file"); err != nil {
		return a, err
	}
	names := c.StringSlice("line")
	if len(names) == 0 {
		return a, usage(c, `no line given: --line "Na I 5889.95" (lacuna lines lists them)`)
	}
	if !c.IsSet("window") {
		return a, usage(c, "no window given: --window -40,40 in km/s")
	}
	task := survey.LineTask{AutoWindow: c.Bool("auto-window"), Degree: c.Int("degree")}
	if task.Window, err = pair(c, "window", c.String("window")); err != nil {
		return a, err
	}
	task.Velocity = task.Window
	for _, text := range c.StringSlice("continuum") {
		r, err := pair(c, "continuum", text)
		if err != nil {
			return a, err
		}
		if !task.AutoWindow && r[0] < task.Window[1] && r[1] > task.Window[0] {
			return a, usage(c, "--continuum %s reaches into the window %s", text, c.String("window"))
		}
		task.Continuum = append(task.Continuum, r)
	}
	if task.Degree < -1 || task.Degree > 5 {
		return a, usage(c, "--degree %d is not -1 (by information criterion) to 5", task.Degree)
	}
	if c.IsSet("b") {
		if task.B, err = positive(c, "b"); err != nil {
			return a, err
		}
	}
	if c.IsSet("order") {
		n := c.Int("order")
		task.Order = &n
	}
	zero := measure.Zero{Err: 0.01, By: "prior"}
	if c.IsSet("zero-level") {
		if zero, err = zeroFlag(c); err != nil {
			return a, err
		}
	}
	task.Zero = func(string) measure.Zero { return zero }
	if a.sp, err = spectrumOf(c, a.path); err != nil {
		return a, err
	}
	task.ContErr = func(string) float64 { return a.sp.ContinuumErr }
	if a.table, err = survey.Tables(c.String("f-set"), c.String("line-table")); err != nil {
		return a, err
	}
	if a.to, err = frame.ParseKind(c.String("to")); err != nil {
		return a, usage(c, "--to: %v", err)
	}
	if a.lights, a.info, err = survey.Open(a.path, a.sp, nil, a.to, frame.Ciddor1996); err != nil {
		return a, inOptions(err)
	}
	for _, name := range names {
		t := task
		if t.Line, err = a.table.Find(name); err != nil {
			return a, err
		}
		a.tasks = append(a.tasks, t)
	}
	return a, nil
}

func measureAction(c *cli.Context) error {
	a, err := ask(c)
	if err != nil {
		return err
	}
	rec := a.record(c)
	if rec.Result.Widths, _, err = survey.MeasureLines(a.lights, a.tasks, a.table); err != nil {
		return fmt.Errorf("%s: %w", a.path, err)
	}
	if f := c.String("figure"); f != "" {
		if err := report.WriteLineFigure(f, rec); err != nil {
			return err
		}
	}
	if c.Bool("json") {
		return report.JSON(c.App.Writer, rec)
	}
	for i, w := range rec.Result.Widths {
		if i > 0 {
			fmt.Fprintln(c.App.Writer)
		}
		if err := report.WidthText(c.App.Writer, w, a.to, textOptions(c)); err != nil {
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
