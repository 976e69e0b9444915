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
			&cli.StringFlag{Name: "species", Usage: "list `SPECIES` only"},
			&cli.StringFlag{Name: "from", Usage: "list from vacuum wavelength `ANGSTROM` on"},
			&cli.StringFlag{Name: "to", Usage: "list up to vacuum wavelength `ANGSTROM`"},
			&cli.StringFlag{Name: "f-set", Value: "default", Usage: "use `NAME` as set of oscillator strengths; \"list\" lists the sets"},
			&cli.StringFlag{Name: "line-table", Usage: "add transitions of your own from `FILE`, CSV"},
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
			if lo > hi {
				return usage(c, "--from %g is above --to %g", lo, hi)
			}
			rows := table.Lines()
			if s := c.String("species"); s != "" {
				if rows = table.Of(s); len(rows) == 0 {
					return oops.Input("", "--species", fmt.Sprintf("no line of %q in the table", s), "did you mean "+strings.Join(nearSpecies(s, table.Species()), ", ")+"?")
				}
			}
			out := []atomic.Line{}
			for _, l := range rows {
				if l.Wave >= lo && l.Wave <= hi {
					out = append(out, l)
				}
			}
			if c.Bool("json") {
				return report.JSON(c.App.Writer, out)
			}
			return report.LinesText(c.App.Writer, out, textOptions(c))
		},
	}
}

// nearSpecies returns the species of an element or molecule so named, or species
// written like it; all of them where there is none.
func nearSpecies(s string, species []string) []string {
	var of []string
	for _, sp := range species {
		if strings.HasPrefix(strings.ToLower(sp), strings.ToLower(s)+" ") {
			of = append(of, sp)
		}
	}
	if len(of) > 0 {
		return of
	}
	if near := oops.Nearest(s, species, 4); len(near) > 0 {
		return near
	}
	return species
}
