package survey

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"os"
	"slices"
	"strconv"

	"lacuna/config"
	"lacuna/internal/oops"
	"lacuna/spectrum"
	"lacuna/spectrum/frame"
)

// lights opens the spectra of a sightline and puts every segment on vacuum
// wavelengths in the survey's frame.
func (c *chain) lights(s config.Sightline) ([]Light, []SpectrumInfo, error) {
	var lights []Light
	var infos []SpectrumInfo
	for k, sp := range s.Spectra {
		where := fmt.Sprintf("%s: spectrum %d", s.Name, k+1)
		path := c.cfg.Path(sp.File)
		ls, info, err := Open(path, sp, coord(s), c.cfg.Frame, c.formula)
		if err != nil {
			return nil, nil, fmt.Errorf("%s: %w", where, err)
		}
		info.File = sp.File
		for i := range ls {
			ls[i].Seg.Source.File = sp.File
			if sp.ContinuumFile != "" {
				if err := c.continuumFile(&ls[i].Seg, sp, ls[i].Index); err != nil {
					return nil, nil, fmt.Errorf("%s: %w", where, err)
				}
			}
		}
		lights = append(lights, ls...)
		infos = append(infos, info)
	}
	return lights, infos, nil
}

// inputs hashes the files of a sightline, in the order of its spectra.
func (c *chain) inputs(s config.Sightline) ([]Input, error) {
	var out []Input
	for _, sp := range s.Spectra {
		for _, name := range []string{sp.File, sp.ContinuumFile, sp.LineSpread} {
			if name == "" {
				continue
			}
			in, err := input(c.cfg.Path(name), name)
			if err != nil {
				return nil, err
			}
			out = append(out, in)
		}
	}
	return out, nil
}

// Open reads one spectrum and brings its segments to vacuum and a frame. What the
// user says of it (sp, and the direction at) takes the place of what the file says.
func Open(path string, sp config.Spectrum, at *spectrum.Coord, to frame.Kind, formula frame.Formula) ([]Light, SpectrumInfo, error) {
	file, err := spectrum.Read(path, readOptions(sp, at, to))
	if err != nil {
		return nil, SpectrumInfo{}, err
	}
	info := SpectrumInfo{File: path, Layout: file.Layout, Object: file.Object, Orders: len(file.Segments), Notes: file.Notes}
	var lights []Light
	for i := range file.Segments {
		seg := file.Segments[i]
		if len(sp.Orders) > 0 && !slices.Contains(sp.Orders, seg.Order) {
			continue
		}
		if seg.UnitGuessed {
			return nil, SpectrumInfo{}, oops.Input(path, seg.Label, "its wavelengths come without a unit", `say it: unit = "Angstrom" (lacuna inspect shows what their size suggests)`)
		}
		maskRanges(&seg, sp.Mask)
		if sp.Normalised != nil {
			seg.Normalised = *sp.Normalised
		}
		info.Medium, info.MediumBy = string(seg.Medium), seg.MediumBy
		info.Frame, info.FrameBy = string(seg.Frame), seg.FrameBy
		info.SHA256 = seg.Source.SHA256
		found := slices.Clone(seg.Shift) // before any is applied
		if err := seg.ToVacuum(formula); err != nil {
			return nil, SpectrumInfo{}, err
		}
		if err := seg.ToFrame(to); err != nil {
			return nil, SpectrumInfo{}, err
		}
		l := Light{Seg: seg, R: seg.Resolution, RErr: sp.RErr, Index: i}
		if l.RErr == 0 {
			l.RErr = 0.05
		}
		l.Earth, l.Placed = seg.Motion()
		if len(lights) == 0 {
			info.Shifts = usedShift(found, seg.Shift, to)
			info.R = l.R
			switch {
			case sp.R > 0:
				info.RBy = "user"
			case l.R > 0:
				info.RBy = "header"
			}
		}
		lights = append(lights, l)
	}
	if len(lights) == 0 {
		return nil, info, oops.Input(path, "", "no order is left to use", "see lacuna inspect for the orders of the file")
	}
	return lights, info, nil
}

// coord is the direction of a sightline, where its survey gives it.
func coord(s config.Sightline) *spectrum.Coord {
	if s.RA == nil || s.Dec == nil {
		return nil
	}
	return &spectrum.Coord{RA: *s.RA, Dec: *s.Dec}
}

// readOptions is the user's word on a file.
func readOptions(sp config.Spectrum, at *spectrum.Coord, to frame.Kind) spectrum.Options {
	o := spectrum.Options{
		Row: sp.Row, WaveCol: sp.Columns.Wave, FluxCol: sp.Columns.Flux, ErrCol: sp.Columns.Err,
		ContinuumCol: sp.ContinuumColumn, WaveUnit: sp.Unit, Layout: sp.Layout, Medium: sp.Medium, Frame: sp.Frame,
		Correction: sp.Correction, CorrectionTo: to, Resolution: sp.R,
		Normalised: sp.Normalised != nil && *sp.Normalised, Coord: at,
	}
	if sp.HDU != nil {
		o.HDU = strconv.Itoa(*sp.HDU)
	}
	return o
}

// usedShift lists the corrections that brought a file's wavelengths to frame to,
// with Done where the file had applied it itself. Others that were found play no
// part and are left out.
func usedShift(found, after []frame.Applied, to frame.Kind) []frame.Applied {
	var out []frame.Applied
	direct := slices.ContainsFunc(found, func(a frame.Applied) bool { return a.To == to })
	own := func(a frame.Applied) bool { return a.Keyword == "user" && !a.Done } // takes the place of the header's
	for i, a := range found {
		if !a.Done && !own(a) && slices.ContainsFunc(found, own) {
			continue
		}
		if a.Done || i < len(after) && after[i].Done && (a.To == to || !direct) {
			out = append(out, a)
		}
	}
	return out
}

// maskRanges marks the user's ranges: Å in the file's own medium and frame.
func maskRanges(seg *spectrum.Segment, ranges [][2]float64) {
	for _, r := range ranges {
		for i, w := range seg.Wave {
			if w >= r[0] && w <= r[1] {
				seg.Mask[i] |= spectrum.BadUser
			}
		}
	}
}

// continuumFile reads the user's continuum from a second file with the same
// pixels.
func (c *chain) continuumFile(seg *spectrum.Segment, sp config.Spectrum, k int) error {
	path := c.cfg.Path(sp.ContinuumFile)
	file, err := spectrum.Read(path, spectrum.Options{Medium: sp.Medium, Frame: sp.Frame, WaveUnit: sp.Unit})
	if err != nil {
		return err
	}
	if k >= len(file.Segments) || len(file.Segments[k].Flux) != len(seg.Flux) {
		return oops.Input(path, seg.Label, "its pixels are not those of "+sp.File, "give a continuum on the same wavelengths, order by order")
	}
	seg.Continuum = file.Segments[k].Flux
	return nil
}

func input(path, name string) (Input, error) {
	f, err := os.Open(path)
	if err != nil {
		return Input{}, err
	}
	defer f.Close()
	h := sha256.New()
	n, err := io.Copy(h, f)
	if err != nil {
		return Input{}, err
	}
	return Input{Path: name, SHA256: hex.EncodeToString(h.Sum(nil)), Size: n}, nil
}
