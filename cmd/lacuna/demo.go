package main

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"

	"github.com/urfave/cli/v2"

	"lacuna/config"
	"lacuna/internal/oops"
	"lacuna/simulate"
	"lacuna/survey"
)

func demoCommand() *cli.Command {
	return &cli.Command{
		Name: "demo", Usage: "the whole job on an invented survey of three stars",
		ArgsUsage: "[--out DIR]",
		Description: `Simulates spectra of three invented stars (noise, blaze, stellar and telluric lines, a
cosmic-ray hit) into a folder, with the truth beside them, and runs the survey: tables and
figures in DIR/results. Look at DIR/survey.toml for how the run was asked for.

Example: lacuna demo --out lantern`,
		Flags: []cli.Flag{
			&cli.StringFlag{Name: "out", Value: "lantern", Usage: "write into folder `DIR`: a new one, or an earlier demo"},
			&cli.IntFlag{Name: "workers", Usage: "run `N` sightlines at a time", DefaultText: "one a core"},
			&cli.BoolFlag{Name: "json", Usage: "print the records as JSON"},
		},
		Action: func(c *cli.Context) error {
			if c.Args().Present() {
				return usage(c, "demo takes options only, not %q; --out names the folder", c.Args().First())
			}
			dir := c.String("out")
			if entries, err := os.ReadDir(dir); err == nil && len(entries) > 0 {
				if _, err := os.Stat(filepath.Join(dir, simulate.TruthName)); err != nil {
					return oops.Input(dir, "", "the folder is there and is not an earlier demo", "name another with --out")
				}
			}
			if err := os.MkdirAll(dir, 0o755); err != nil {
				return fmt.Errorf("the demo's folder: %w", err)
			}
			if err := removeResults(filepath.Join(dir, "results")); err != nil {
				return err
			}
			if err := simulate.WriteLantern(dir); err != nil {
				return err
			}
			cfg, err := config.Load(filepath.Join(dir, "survey.toml"))
			if err != nil {
				return err
			}
			if err := runSurvey(c, cfg, filepath.Join(dir, "results"), true); err != nil {
				return err
			}
			if !c.Bool("json") {
				fmt.Fprintf(c.App.Writer, "Truth:   %s (what the spectra were made from)\nSee:     %s for a first look\n",
					filepath.Join(dir, simulate.TruthName), filepath.Join(dir, "results", "figures", "Lantern_1-lines.svg"))
			}
			return nil
		},
	}
}

// removeResults removes the results of an earlier demo, which go with its
// spectra, unless a run is at work there.
func removeResults(dir string) error {
	if _, err := os.Stat(dir); errors.Is(err, fs.ErrNotExist) {
		return nil
	}
	j, err := survey.OpenJournal(dir)
	if err != nil {
		return err
	}
	if err := j.Close(); err != nil {
		return err
	}
	return os.RemoveAll(dir)
}
