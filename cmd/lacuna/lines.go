package main

import (
	"fmt"
	"math"
	"strings"

	"github.com/urfave/cli/v2"

	"lacuna/atomic"
	"lacuna/internal/oops"
	"lacuna/report"
	"lacuna/survey"
)

func linesCommand() *cli.Command {
	return &cli.Command{
		Name: "lines", Usage: "the table of transitions, with sources and status",
		ArgsUsage: `[--species "Ca II"] [--from A] [--to A]`,
		Description: `Lists transitions with wavelength in air and vacuum, oscillator strength, damping,
hyperfine and isotope parts, sources and status. Rows whose value was recalled from memory
and not yet seen in its source are marked.

Example: lacuna lines --species "Ca II" --from 3900 --to 4000`,
		Flags: []cli.Flag{
			&cli.StringFlag{Name: "species", Usage: "only this `SPECIES`"},
			&cli.StringFlag{Name: "from", Usage: "shortest wavelength in vacuum, `ANGSTROM`"},
			&cli.StringFlag{Name: "to", Usage: "longest wavelength in vacuum, `ANGSTROM`"},
			&cli.StringFlag{Name: "f-set", Value: "default", Usage: "set of oscillator strengths `NAME`; \"list\" lists the sets"},
			&cli.StringFlag{Name: "line-table", Usage: "CSV `FILE` with transitions of your own"},
			&cli.BoolFlag{Name: "json", Usage: "print the rows as JSON"},
		},
		Action: func(c *cli.Context) error {
			if c.Args().Present() {
				return usage(c, "lines takes options only, not %q", c.Args().First())
			}
			if c.String("f-set") == "list" {
				for _, s := range atomic.Default().Sets() {
					fmt.Fprintln(c.App.Writer, s)
				}
				return nil
			}
			table, err := survey.Tables(c.String("f-set"), c.String("line-table"))
			if err != nil {
				return err
			}
			lo, hi := 0.0, math.Inf(1)
			if c.IsSet("from") {
				if lo, err = positive(c, "from"); err != nil {
					return err
				}
			}
			if c.IsSet("to") {
				if hi, err = positive(c, "to"); err != nil {
					return err
				}
			}
			rows := table.Lines()
			if s := c.String("species"); s != "" {
				if rows = table.Of(s); len(rows) == 0 {
					return oops.Input("", "", fmt.Sprintf("no line of %q in the table", s), "it has "+strings.Join(nearestOr(s, table.Species()), ", "))
				}
			}
			var out []atomic.Line
			for _, l := range rows {
				if l.Wave >= lo && l.Wave <= hi {
					out = append(out, l)
				}
			}
			if c.Bool("json") {
				return report.JSON(c.App.Writer, out)
			}
			return report.LinesText(c.App.Writer, out, textOptions())
		},
	}
}

// nearestOr returns words like s, or all of them where none is.
func nearestOr(s string, words []string) []string {
	if near := oops.Nearest(s, words, 4); len(near) > 0 {
		return near
	}
	return words
}
