package main

import (
	"fmt"

	"github.com/urfave/cli/v2"

	"lacuna/report"
	"lacuna/spectrum"
	"lacuna/survey"
)

func inspectCommand() *cli.Command {
	return &cli.Command{
		Name: "inspect", Usage: "what is in a spectrum file",
		ArgsUsage: "FILE...",
		Description: `Tells layout, orders, range, sampling, units, medium, velocity frame and how each is
known; audits the error array on line-free pixels (rms/σ and correlation); and lists which
of our lines fall where. Nothing is measured.

Example: lacuna inspect lantern1_blue.fits`,
		Flags: append([]cli.Flag{
			&cli.BoolFlag{Name: "json", Usage: "print the result as JSON"},
		}, spectrumFlags()...),
		Action: func(c *cli.Context) error {
			if !c.Args().Present() {
				return usage(c, "no spectrum file given")
			}
			type inspected struct {
				File     string             `json:"file"`
				Spectrum *spectrum.Spectrum `json:"spectrum"`
				Audits   []report.Audit     `json:"audits"`
			}
			var all []inspected
			var failed []error
			for _, path := range c.Args().Slice() {
				sp, err := spectrumOf(c, path)
				if err != nil {
					return err
				}
				s, audits, err := survey.Inspect(path, sp)
				if err != nil { // the other files may still be looked at
					failed = append(failed, err)
					continue
				}
				var as []report.Audit
				for _, a := range audits {
					as = append(as, report.Audit(a))
				}
				all = append(all, inspected{path, s, as})
			}
			var err error
			if failed != nil {
				err = &survey.Failed{Of: c.Args().Len(), Errs: failed}
			}
			if len(all) == 0 {
				return err
			}
			if c.Bool("json") {
				for i := range all { // the pixels are in the file already
					for k := range all[i].Spectrum.Segments {
						seg := &all[i].Spectrum.Segments[k]
						seg.Wave, seg.Flux, seg.Err, seg.Continuum, seg.Mask = []float64{seg.Wave[0], seg.Wave[len(seg.Wave)-1]}, nil, nil, nil, nil
					}
				}
				if err := report.JSON(c.App.Writer, all); err != nil {
					return err
				}
				return err
			}
			for i, in := range all {
				if i > 0 {
					fmt.Fprintln(c.App.Writer)
				}
				if err := report.InspectText(c.App.Writer, in.File, in.Spectrum, in.Audits, textOptions(c)); err != nil {
					return err
				}
			}
			return err
		},
	}
}
