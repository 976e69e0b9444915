package main

import (
	"fmt"
	"math"

	"github.com/urfave/cli/v2"

	"lacuna/report"
	"lacuna/spectrum"
	"lacuna/spectrum/frame"
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
		Action: inspectAction,
	}
}

func inspectAction(c *cli.Context) error {
	if !c.Args().Present() {
		return usage(c, "no spectrum file given")
	}
	type inspected struct {
		file     string
		spectrum *spectrum.Spectrum
		audits   []report.Audit
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
			failed = append(failed, inOptions(err))
			continue
		}
		in := inspected{file: path, spectrum: s}
		for _, a := range audits {
			in.audits = append(in.audits, report.Audit(a))
		}
		all = append(all, in)
	}
	var err error
	if failed != nil {
		err = &survey.Failed{Of: c.Args().Len(), Errs: failed}
	}
	if len(all) == 0 {
		return err
	}
	if c.Bool("json") {
		var facts []fileFacts
		for _, in := range all {
			facts = append(facts, factsOf(in.file, in.spectrum, in.audits))
		}
		if jerr := report.JSON(c.App.Writer, facts); jerr != nil {
			return jerr
		}
		return err
	}
	for i, in := range all {
		if i > 0 {
			fmt.Fprintln(c.App.Writer)
		}
		if werr := report.InspectText(c.App.Writer, in.file, in.spectrum, in.audits, textOptions(c)); werr != nil {
			return werr
		}
	}
	return err
}

// fileFacts are the facts of one spectrum file as JSON.
type fileFacts struct {
	File     string         `json:"file"`
	Layout   string         `json:"layout"`
	Object   string         `json:"object,omitempty"`
	Notes    []string       `json:"notes,omitempty"`
	Segments []segmentFacts `json:"segments"`
}

// segmentFacts are those of one segment. What is not known is left out.
type segmentFacts struct {
	Label      string          `json:"label"`
	Order      int             `json:"order"`
	Pixels     int             `json:"pixels"`
	Bad        int             `json:"bad"`
	Range      [2]float64      `json:"range"` // Å, in the file's medium and frame
	Medium     frame.Medium    `json:"medium,omitempty"`
	MediumBy   string          `json:"medium_by,omitempty"`
	Frame      frame.Kind      `json:"frame,omitempty"`
	FrameBy    string          `json:"frame_by,omitempty"`
	Shifts     []frame.Applied `json:"shifts,omitempty"`
	Resolution float64         `json:"resolution,omitempty"`
	FluxUnit   string          `json:"flux_unit,omitempty"`
	Normalised bool            `json:"normalised,omitempty"`
	HasErrors  bool            `json:"has_errors"`
	NoiseRatio float64         `json:"noise_ratio,omitempty"` // rms over tabulated error
	NoiseRho   []float64       `json:"noise_rho,omitempty"`   // correlation at lag 1, 2, …
	NoisePixel int             `json:"noise_pixels,omitempty"`
	NoAudit    string          `json:"no_audit,omitempty"` // why the noise was not measured
	Lines      []string        `json:"lines,omitempty"`
	Notes      []string        `json:"notes,omitempty"`
}

func factsOf(file string, s *spectrum.Spectrum, audits []report.Audit) fileFacts {
	out := fileFacts{File: file, Layout: s.Layout, Object: s.Object, Notes: s.Notes}
	for i, x := range s.Segments {
		f := segmentFacts{
			Label: x.Label, Order: x.Order, Pixels: len(x.Wave), Medium: x.Medium, MediumBy: x.MediumBy,
			Frame: x.Frame, FrameBy: x.FrameBy, Shifts: x.Shift, Resolution: x.Resolution, FluxUnit: x.Unit,
			Normalised: x.Normalised, HasErrors: x.Err != nil, Notes: x.Notes,
		}
		first := true
		for k, w := range x.Wave {
			if x.Mask[k].Bad() {
				f.Bad++
			}
			if math.IsNaN(w) {
				continue
			}
			if first {
				f.Range[0], first = w, false
			}
			f.Range[1] = w
		}
		a := audits[i]
		f.NoAudit, f.Lines = a.Why, a.Lines
		if a.Why == "" {
			f.NoiseRho, f.NoisePixel = a.Noise.Rho, a.Noise.Pixels
			if !a.Noise.FromData {
				f.NoiseRatio = a.Noise.Ratio
			}
		}
		out.Segments = append(out.Segments, f)
	}
	return out
}
