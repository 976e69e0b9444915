package survey

import (
	"errors"
	"fmt"

	"lacuna/abundance"
	"lacuna/config"
	"lacuna/internal/oops"
	"lacuna/measure"
)

// record runs one sightline; a panic in the chain is a bug and is not caught.
func (c *chain) record(s config.Sightline, index int, have func(string) (Record, bool)) (Record, error) {
	rec := Record{Schema: Schema, Name: s.Name, Index: index, Status: statusDone}
	inputs, err := c.inputs(s)
	if err == nil {
		rec.Key, err = Key(c.cfg, s, inputs, c.table)
	}
	if err != nil {
		rec.Status, rec.Error = statusFailed, err.Error()
		return rec, err
	}
	if have != nil {
		if old, ok := have(rec.Key); ok && old.Status == statusDone {
			old.Index = index
			return old, c.failures(old)
		}
	}
	rec.Result, err = c.sightline(s)
	rec.Result.Inputs = inputs
	if err != nil {
		rec.Status, rec.Error = statusFailed, err.Error()
		return rec, err
	}
	return rec, c.failures(rec)
}

// failures is the error of a record whose sightline came through without some of
// its lines.
func (c *chain) failures(r Record) error {
	var errs []error
	for _, f := range r.Result.Failures {
		errs = append(errs, oops.Input(c.cfg.File, r.Name, f, ""))
	}
	return errors.Join(errs...)
}

// sightline is the chain itself: spectra → widths → clouds → columns → abundances.
func (c *chain) sightline(s config.Sightline) (Result, error) {
	res := Result{Scale: c.cfg.Scale, FSet: c.cfg.FSet, Frame: c.cfg.Frame}
	lights, infos, err := c.lights(s)
	if err != nil {
		return res, err
	}
	res.Spectra = infos
	if len(s.Spectra) > 0 {
		tasks, err := c.tasks(s)
		if err != nil {
			return res, err
		}
		pieces := Cut(lights, tasks, c.table)
		var missing []string
		res.Widths, missing, err = pieces.Measure()
		for _, e := range split(err) {
			if !oops.IsInput(e) {
				return res, at(c.cfg.File, s.Name, e)
			}
			res.Failures = append(res.Failures, e.Error())
		}
		if res.Widths == nil && err != nil {
			return res, at(c.cfg.File, s.Name, split(err)[0])
		}
		res.Warnings = append(res.Warnings, missing...)
		c.defaults(res.Widths)
		if err := c.fits(&res, pieces, s); err != nil {
			return res, at(c.cfg.File, s.Name, err)
		}
	}
	if err := c.columns(&res, s); err != nil {
		return res, at(c.cfg.File, s.Name, err)
	}
	if s.Hydrogen != nil {
		h, err := hydrogen(s)
		if err != nil {
			return res, at(c.cfg.File, s.Name, err)
		}
		res.Hydrogen = &h
		res.Depletions, err = abundance.Deplete(res.Adopted, h, c.cfg.Scale)
		if err != nil {
			return res, at(c.cfg.File, s.Name, err)
		}
	}
	res.Rows = c.rows(res)
	return res, nil
}

// defaults gives each width the f of the default set, where the survey chose
// another set and its value differs: columns go as 1/f.
func (c *chain) defaults(ws []measure.Width) {
	for i := range ws {
		if l, err := c.base.Find(ws[i].Line); err == nil && l.F != ws[i].F {
			ws[i].FDefault = l.F
		}
	}
}

// at puts the file and the sightline before an error, and keeps its kind.
func at(file, name string, err error) error {
	if oops.IsInput(err) {
		return fmt.Errorf("%s: %s: %w", file, name, err)
	}
	return fmt.Errorf("%s: %w", name, err)
}

// tasks turns the lines of a sightline into what is to be measured.
func (c *chain) tasks(s config.Sightline) ([]LineTask, error) {
	var out []LineTask
	for _, l := range s.Lines {
		line, err := c.table.Find(l.Name)
		if err != nil {
			return nil, at(c.cfg.File, s.Name, err)
		}
		t := LineTask{
			Line: line, Window: l.Window, AutoWindow: l.AutoWindow, Continuum: l.Continuum,
			Degree: l.Degree, MaxDegree: s.MaxDegree, B: l.B, Detection: s.Detection,
			LimitSigma: s.LimitSigma, LimitWidth: l.LimitWidth, Velocity: s.Velocity,
			File: l.File, Order: l.Order, Optional: l.Inherited(),
			Zero: func(file string) measure.Zero { return priorZero(s, file) },
			ContErr: func(file string) float64 {
				for _, sp := range s.Spectra {
					if sp.File == file {
						return sp.ContinuumErr
					}
				}
				return 0
			},
		}
		if t.Velocity == ([2]float64{}) {
			t.Velocity = l.Window
		}
		out = append(out, t)
	}
	for i := range out {
		for _, l := range s.Lines {
			out[i].Also = append(out[i].Also, l.Name)
		}
	}
	return out, nil
}

// priorZero is the zero level of a spectrum before any black core measures it.
func priorZero(s config.Sightline, file string) measure.Zero {
	z := s.ZeroLevel
	by := "prior"
	for _, sp := range s.Spectra {
		if sp.File == file && sp.ZeroLevel != nil {
			z, by = *sp.ZeroLevel, "user"
		}
	}
	return measure.Zero{Level: z.Level, Err: z.Err, By: by}
}
