package main

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"

	"github.com/urfave/cli/v2"

	"lacuna/config"
	"lacuna/internal/oops"
	"lacuna/report"
	"lacuna/survey"
)

func runCommand() *cli.Command {
	return &cli.Command{
		Name: "run", Usage: "the whole chain for every sightline of a survey file",
		ArgsUsage: "SURVEY.toml [--out DIR] [--only NAME]",
		Description: `Reads each sightline's spectra, puts them on vacuum wavelengths and the survey's
velocity frame, places the continuum, measures every line, fits clouds where the survey
asks for them, and turns all that into columns (weak line, apparent optical depth, curve of
growth, fit), sums by species and depletions. The results folder gets journal.jsonl
(everything), widths, clouds, columns, growth and depletions as ECSV, figures as SVG, and
manifest.json. Sightlines whose inputs have not changed since
the last run are taken from the journal.

Example: lacuna run survey.toml --out results --only "Lantern 1"`,
		Flags: []cli.Flag{
			&cli.StringFlag{Name: "out", Usage: "write results into folder `DIR`", DefaultText: "\"results\" beside the survey file"},
			&cli.StringSliceFlag{Name: "only", Usage: "run only sightline `NAME`; may be repeated"},
			&cli.BoolFlag{Name: "dry-run", Usage: "print the fully resolved configuration and stop"},
			&cli.BoolFlag{Name: "fresh", Usage: "measure again even what the journal has"},
			&cli.IntFlag{Name: "workers", Usage: "run `N` sightlines at a time", DefaultText: "one a core"},
			&cli.BoolFlag{Name: "json", Usage: "print the records as JSON"},
		},
		Action: func(c *cli.Context) error {
			path, err := one(c, "survey file")
			if err != nil {
				return err
			}
			cfg, err := config.Load(path)
			if err != nil {
				return err
			}
			if c.Bool("dry-run") {
				_, err := c.App.Writer.Write(cfg.Resolved())
				return err
			}
			if err := cfg.CheckFiles(); err != nil {
				return err
			}
			out := c.String("out")
			if out == "" {
				out = filepath.Join(cfg.Dir, "results")
			}
			for _, n := range cfg.Notes {
				fmt.Fprintln(c.App.ErrWriter, "note:", n)
			}
			return runSurvey(c, cfg, out, c.Bool("fresh"))
		},
	}
}

// runSurvey runs a survey into a folder and prints the summary.
func runSurvey(c *cli.Context, cfg *config.Survey, out string, fresh bool) error {
	if err := known(cfg, c.StringSlice("only")); err != nil {
		return err
	}
	if err := os.MkdirAll(out, 0o755); err != nil {
		return fmt.Errorf("results folder: %w", err)
	}
	records, runErr := survey.RunInto(c.Context, cfg, out, survey.RunOptions{
		Only: c.StringSlice("only"), Workers: c.Int("workers"), Fresh: fresh, Command: c.App.Metadata["args"].([]string),
		Progress: func(done, of int, name string) { progress(c, done, of, name) },
		Warn: func(s string) {
			fmt.Fprintf(c.App.ErrWriter, "note: %s: %s\n", filepath.Join(out, survey.JournalName), s)
		},
	})
	var failed *survey.Failed
	if runErr != nil && !errors.As(runErr, &failed) {
		return runErr
	}
	// Tables and figures are made from the whole journal, so a run of one
	// sightline refreshes its part and keeps the rest.
	all, err := survey.Current(out, cfg)
	if err != nil {
		return err
	}
	if failed != nil && !slices.ContainsFunc(all, func(r survey.Record) bool { return r.Status == "done" }) {
		return runErr // there is nothing to show, and no table without a row
	}
	if err := report.WriteResults(out, all); err != nil {
		return fmt.Errorf("writing results: %w", err)
	}
	if c.Bool("json") {
		if err := report.JSON(c.App.Writer, records); err != nil {
			return err
		}
		return runErr
	}
	if err := report.Summary(c.App.Writer, records, textOptions(c)); err != nil {
		return err
	}
	fmt.Fprintf(c.App.Writer, "\nResults: %s (widths.ecsv, columns.ecsv, depletions.ecsv, figures/)\n", out)
	return runErr
}

// known looks for names of sightlines before anything is written.
func known(cfg *config.Survey, only []string) error {
	var names []string
	for _, s := range cfg.Sightlines {
		names = append(names, s.Name)
	}
	for _, n := range only {
		if slices.Contains(names, n) {
			continue
		}
		fix := "the names are those of [[sightline]] and the catalogue"
		if near := oops.Nearest(n, names, 1); len(near) > 0 {
			fix = fmt.Sprintf("did you mean %q?", near[0])
		}
		return oops.Input(cfg.File, "--only", fmt.Sprintf("there is no sightline %q", n), fix)
	}
	return nil
}

func newCommand() *cli.Command {
	return &cli.Command{
		Name: "new", Usage: "write a commented starter survey into a folder",
		ArgsUsage: "DIR",
		Description: `Writes DIR/survey.toml and DIR/growth.toml with every key explained. Existing files are
never overwritten.

Example: lacuna new my-survey`,
		Action: func(c *cli.Context) error {
			dir, err := one(c, "folder")
			if err != nil {
				return err
			}
			if err := os.MkdirAll(dir, 0o755); err != nil {
				return err
			}
			files := []struct {
				name string
				text []byte
			}{{"survey.toml", config.Starter()}, {"growth.toml", config.StarterGrowth()}}
			for _, f := range files {
				if _, err := os.Lstat(filepath.Join(dir, f.name)); err == nil {
					return oops.Input(filepath.Join(dir, f.name), "", "it is there already", "choose another folder, or move it away")
				}
			}
			for _, f := range files {
				p := filepath.Join(dir, f.name)
				if err := writeFile(p, f.text); err != nil {
					return err
				}
				fmt.Fprintln(c.App.Writer, "wrote", p)
			}
			fmt.Fprintf(c.App.Writer, "next: put your spectra beside it, name them in %s, then lacuna run %[1]s\n", filepath.Join(dir, "survey.toml"))
			return nil
		},
	}
}
