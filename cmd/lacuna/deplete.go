package main

import (
	"fmt"
	"strings"

	"github.com/urfave/cli/v2"

	"lacuna/abundance"
	"lacuna/internal/table"
	"lacuna/report"
	"lacuna/survey"
)

func depleteCommand() *cli.Command {
	var columns string
	for _, col := range abundance.TableColumns {
		for i, line := range fold(col[1], helpWidth-20) {
			if i > 0 {
				col[0] = ""
			}
			columns += fmt.Sprintf("\n  %-16s  %s", col[0], line)
		}
	}
	return &cli.Command{
		Name: "deplete", Usage: "depletions from a table of columns and hydrogen columns",
		ArgsUsage: "TABLE --scale asplund2021",
		Description: `Reads a CSV or ECSV table with one row a species and gives D(X) with and without the
error of the solar scale, or says why an ion cannot give one. Columns:` + columns + `

Example: lacuna deplete columns.csv --scale asplund2021`,
		Flags: []cli.Flag{
			&cli.StringFlag{Name: "scale", Usage: "use solar abundance scale `NAME`; required, none is taken silently"},
			&cli.StringFlag{Name: "out", Usage: "write the depletions into `FILE`, as ECSV"},
			&cli.BoolFlag{Name: "json", Usage: "print the results as JSON"},
		},
		Action: func(c *cli.Context) error {
			path, err := one(c, "table")
			if err != nil {
				return err
			}
			t, err := table.Read(path)
			if err != nil {
				return err
			}
			sightlines, err := abundance.DepleteTable(t, c.String("scale"))
			if err != nil {
				if !strings.HasPrefix(err.Error(), path+":") { // of the table, its errors say where
					err = fmt.Errorf("%s: %w", path, err)
				}
				return err
			}
			var records []survey.Record
			for i, s := range sightlines {
				records = append(records, survey.Record{Schema: survey.Schema, Name: s.Name, Index: i, Status: "done", Result: survey.Result{
					Scale: c.String("scale"), Columns: s.Columns, Adopted: s.Columns, Hydrogen: s.Hydrogen, Depletions: s.Depletions,
				}})
			}
			if out := c.String("out"); out != "" {
				if err := writeTable(out, report.Depletions(records)); err != nil {
					return err
				}
			}
			if c.Bool("json") {
				return report.JSON(c.App.Writer, records)
			}
			for i, s := range sightlines {
				if i > 0 {
					fmt.Fprintln(c.App.Writer)
				}
				if err := report.DepletionText(c.App.Writer, s.Name, s.Depletions, s.Hydrogen, textOptions(c)); err != nil {
					return err
				}
			}
			return nil
		},
	}
}
