package config

import (
	"errors"
	"fmt"
	"strings"

	"lacuna/internal/oops"
)

func nth(what string, i int) string { return fmt.Sprintf("%s %d", what, i+1) }

func (l *loader) checkSpectrum(where string, s *Spectrum) {
	if s.ContinuumColumn != "" && s.ContinuumFile != "" {
		l.bad(where, "keep one of them", "continuum_column and continuum_file are both given")
	}
	own := s.ContinuumColumn != "" || s.ContinuumFile != ""
	norm := s.Normalised != nil && *s.Normalised
	if norm && own {
		l.bad(where, "set normalised = false, or leave the continuum out", "a normalised spectrum with a continuum of its own")
	}
	if (own || norm) && s.ContinuumErr == 0 {
		l.bad(at(where, "continuum_err"), "add continuum_err, the relative 1σ error of the continuum (a usual one is 0.01)", "missing: no continuum is free of error")
	}
	seen := map[int]bool{}
	for _, o := range s.Orders {
		if seen[o] {
			l.bad(at(where, "orders"), "keep one of them", "%d is there twice", o)
		}
		seen[o] = true
	}
}

func (l *loader) checkHydrogen(where string, h *Hydrogen) {
	n := 0
	for _, c := range []struct {
		key      string
		x, e, mx *float64
	}{{"logN_HI", h.HI, h.HIErr, h.HIMax}, {"logN_H2", h.H2, h.H2Err, h.H2Max}, {"logN_H", h.H, h.HErr, h.HMax}} {
		switch {
		case c.x != nil && c.mx != nil:
			l.bad(at(where, c.key), "keep the value or the limit", "%s and %s_max are both given", c.key, c.key)
		case c.x != nil && c.e == nil:
			l.bad(at(where, c.key+"_err"), "add its 1σ error in dex", "missing")
		case c.x == nil && c.e != nil:
			l.bad(at(where, c.key), "add "+c.key+", or leave the error out", "missing, but %s_err is given", c.key)
		}
		if c.x != nil || c.mx != nil {
			n++
		}
	}
	total := h.H != nil || h.HMax != nil
	switch {
	case n == 0:
		l.bad(where, "add logN_HI and logN_HI_err (and logN_H2 …), or logN_H and logN_H_err", "no column given")
	case total && n > 1:
		l.bad(where, "keep the total or its parts", "the total logN_H beside logN_HI or logN_H2: they could disagree")
	case !total && h.HI == nil && h.HIMax == nil:
		l.bad(at(where, "logN_HI"), "add it; N(H₂) alone does not give N(H)", "missing")
	}
}

func (l *loader) checkColumn(where string, c *Column, s *Sightline) {
	c.Species = l.species(at(where, "species"), c.Species)
	if c.Kind == "value" && c.LogNErr == 0 {
		l.bad(at(where, "logN_err"), `add its 1σ error in dex, or kind = "upper" or "lower"`, "missing")
	}
	if c.Kind != "value" && c.LogNErr != 0 {
		l.bad(at(where, "logN_err"), "leave it out", "a limit has no error")
	}
	switch {
	case c.Sigma != 0 && c.Kind != "upper":
		l.bad(at(where, "sigma"), "leave it out", "only an upper limit has a level")
	case c.Sigma == 0 && c.Kind == "upper":
		c.Sigma, c.by["sigma"] = s.LimitSigma, "limit_sigma"
	}
	for _, o := range s.Columns {
		if o.Species == c.Species && o.Source == c.Source {
			l.bad(where, "keep one of them", "%s by %s is there twice", c.Species, show(c.Source))
		}
	}
}

func (l *loader) checkAdopt(where string, a *Adopt, s *Sightline) {
	a.Species = l.species(at(where, "species"), a.Species)
	switch {
	case (a.Method == "") == (a.LogN == nil):
		l.bad(where, "give one of them", "needs either a method or logN")
	case a.Method != "" && (a.LogNErr != 0 || a.Kind != ""):
		l.bad(where, "leave logN_err and kind out", "they belong to logN, not to a method")
	case a.LogN != nil:
		if a.Kind == "" {
			a.Kind, a.by["kind"] = "value", "default"
		}
		if (a.Kind == "value") != (a.LogNErr != 0) {
			l.bad(at(where, "logN_err"), "a value has a 1σ error, a limit has none", "does not fit kind %q", a.Kind)
		}
	}
	for _, o := range s.Adopt {
		if o.Species == a.Species {
			l.bad(where, "keep one of them", "%s is adopted twice", a.Species)
		}
	}
}

// told reports whether a mistake in this key, or in a key like it, was told.
func (l *loader) told(key string) bool {
	for _, err := range l.errs {
		var m *oops.Mistake
		if errors.As(err, &m) && (m.Where == key || strings.HasSuffix(m.Where, ": "+key) || m.Fix == "did you mean "+key+"?") {
			return true
		}
	}
	return false
}

func (l *loader) checkLine(where string, x *Sightline, ln *Line) {
	if ln.Window == [2]float64{} {
		if l.told("velocity") || l.told("window") {
			return // only follows from that mistake
		}
		l.bad(at(where, "window"), "add window = [low, high] in km/s, or velocity to the sightline or [defaults]", "%s has no velocity range to measure over", ln.Name)
		return
	}
	var low, high bool
	for i, c := range ln.Continuum {
		low, high = low || c[0] < ln.Window[0], high || c[1] > ln.Window[1]
		if !ln.AutoWindow && c[0] < ln.Window[1] && c[1] > ln.Window[0] {
			l.bad(nth(at(where, "continuum"), i), "end it at the window", "[%g, %g] reaches into the window [%g, %g] of %s", c[0], c[1], ln.Window[0], ln.Window[1], ln.Name)
		}
		for _, d := range ln.Continuum[:i] {
			if c[0] < d[1] && c[1] > d[0] {
				l.bad(nth(at(where, "continuum"), i), "join the two", "[%g, %g] overlaps [%g, %g]", c[0], c[1], d[0], d[1])
			}
		}
	}
	if len(ln.Continuum) > 0 && ln.Degree != 0 && !(low && high) && !ln.AutoWindow {
		l.bad(at(where, "continuum"), "give one on each side, or degree = 0", "lies on one side of the window only: a slope cannot be told from the line")
	}
	if ln.File != "" {
		var files []string
		for _, sp := range x.Spectra {
			if sp.File == ln.File {
				files = nil
				break
			}
			files = append(files, sp.File)
		}
		if files != nil || len(x.Spectra) == 0 {
			l.bad(at(where, "file"), "one of "+strings.Join(files, ", "), "%s is no spectrum of this sightline", show(ln.File))
		}
	}
	for _, o := range x.Lines {
		if o.Name == ln.Name && o.File == ln.File && (o.Order == nil) == (ln.Order == nil) && (o.Order == nil || *o.Order == *ln.Order) {
			l.bad(where, "keep one of them, or give each its order or file", "%s is there twice", ln.Name)
		}
	}
}

// checkSightline looks at a sightline as a whole. named: it names lines itself.
func (l *loader) checkSightline(s *Survey, x *Sightline, where string, named bool) {
	if len(x.Spectra) == 0 {
		if len(x.Columns) == 0 {
			l.bad(where, "add [[sightline.spectrum]] with a file, or [[sightline.column]]", "has neither a spectrum nor a column")
		} else if named {
			l.bad(where, "add [[sightline.spectrum]] with a file", "has lines but no spectrum")
		}
		x.Lines, x.Skipped = nil, nil
	} else if len(x.Lines) == 0 && len(x.raw) == 0 && len(x.Named) == 0 {
		l.bad(at(where, "lines"), `add lines = ["Na I 5889.95"] here or in [defaults]`, "has spectra but no line to measure")
	}
	if x.Hydrogen != nil && s.Scale == "" {
		l.bad("survey: scale", "add one of "+strings.Join(scaleKeys(), ", "), "missing: sightlines with hydrogen give depletions, and no solar scale is taken silently")
	}
	if (x.RA == nil) != (x.Dec == nil) {
		l.bad(where, "give both", "one of ra and dec is missing")
	}
	var files []string
	for i, sp := range x.Spectra {
		for j, f := range files {
			if f == sp.File && sameCut(x.Spectra[j], sp) {
				l.bad(nth(at(where, "spectrum"), i), "keep one of them, or read different hdu, row or orders", "%s is there twice", show(sp.File))
			}
		}
		files = append(files, sp.File)
	}
}

func sameCut(a, b Spectrum) bool {
	hdu := func(s Spectrum) int {
		if s.HDU == nil {
			return -1
		}
		return *s.HDU
	}
	return hdu(a) == hdu(b) && a.Row == b.Row && fmt.Sprint(a.Orders) == fmt.Sprint(b.Orders) && a.Columns == b.Columns
}

// checkNames refuses names that could not be told apart as files.
func (l *loader) checkNames(places, names []string) {
	by := map[string]int{}
	for i, n := range names {
		key := strings.ToLower(Slug(n))
		if j, ok := by[key]; ok {
			l.bad(places[i], "give each its own name", "the same name as %s (capitals do not count)", places[j])
			continue
		}
		by[key] = i
	}
}
