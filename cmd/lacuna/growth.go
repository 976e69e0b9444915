package main

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"

	"github.com/urfave/cli/v2"

	"lacuna/config"
	"lacuna/report"
	"lacuna/survey"
)

func growthCommand() *cli.Command {
	return &cli.Command{
		Name: "growth", Usage: "a curve-of-growth batch: measured widths → N and b",
		ArgsUsage: "BATCH.toml [--out DIR]",
		Description: `For each sightline and species, the measured widths of several transitions give N and
b with errors and a confidence contour: one figure each, one table (growth.ecsv).

Example: lacuna growth growth.toml --out growth-results`,
		Flags: []cli.Flag{
			&cli.StringFlag{Name: "out", Usage: "write results into folder `DIR`", DefaultText: "\"growth-results\" beside the batch file"},
			&cli.BoolFlag{Name: "no-figures", Usage: "write the table only"},
			&cli.BoolFlag{Name: "dry-run", Usage: "print the fully resolved batch and stop"},
			&cli.IntFlag{Name: "workers", Usage: "run `N` sightlines at a time", DefaultText: "one a core"},
			&cli.BoolFlag{Name: "json", Usage: "print the results as JSON"},
		},
		Action: func(c *cli.Context) error {
			path, err := one(c, "batch file")
			if err != nil {
				return err
			}
			cfg, err := config.LoadGrowth(path)
			if err != nil {
				return err
			}
			if c.Bool("dry-run") {
				_, err := c.App.Writer.Write(cfg.Resolved())
				return err
			}
			for _, n := range cfg.Notes {
				fmt.Fprintln(c.App.ErrWriter, "note:", n)
			}
			out := c.String("out")
			if out == "" {
				out = filepath.Join(cfg.Dir, "growth-results")
			}
			if err := os.MkdirAll(out, 0o755); err != nil {
				return fmt.Errorf("results folder: %w", err)
			}
			records, runErr := survey.RunGrowth(c.Context, cfg, c.Int("workers"), func(done, of int, name string) { progress(c, done, of, name) })
			var failed *survey.Failed
			if runErr != nil && !errors.As(runErr, &failed) {
				return runErr
			}
			if err := report.WriteGrowth(out, records, !c.Bool("no-figures")); err != nil {
				return fmt.Errorf("writing results: %w", err)
			}
			if c.Bool("json") {
				if err := report.JSON(c.App.Writer, records); err != nil {
					return err
				}
				return runErr
			}
			if err := report.GrowthText(c.App.Writer, records, textOptions(c)); err != nil {
				return err
			}
			what := "growth.ecsv, figures/"
			if c.Bool("no-figures") {
				what = "growth.ecsv"
			}
			fmt.Fprintf(c.App.Writer, "\nResults: %s (%s)\n", out, what)
			return runErr
		},
	}
}
