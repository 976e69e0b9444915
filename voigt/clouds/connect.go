package clouds

import (
	"cmp"
	"fmt"
	"slices"

	"lacuna/atomic"
)

// arrange puts clouds, windows and lines into an order of its own, so that the
// results are the same to the last digit however they were given.
func (f *Fitter) arrange(p Problem) {
	type named struct {
		c  Cloud
		at int
	}
	var cs []named
	for i, c := range p.Clouds {
		c.Name = cloudName(c, i)
		c.Species = slices.Clone(c.Species)
		slices.SortStableFunc(c.Species, func(a, b Species) int { return cmp.Compare(a.Carrier, b.Carrier) })
		cs = append(cs, named{c, i})
	}
	slices.SortStableFunc(cs, func(a, b named) int {
		if d := cmp.Compare(a.c.V.Start, b.c.V.Start); d != 0 {
			return d
		}
		if d := cmp.Compare(a.c.B.Start, b.c.B.Start); d != 0 {
			return d
		}
		for i := range min(len(a.c.Species), len(b.c.Species)) {
			if d := cmp.Compare(a.c.Species[i].LogN.Start, b.c.Species[i].LogN.Start); d != 0 {
				return d
			}
		}
		return 0
	})
	f.in = Problem{Shared: slices.Clone(p.Shared)}
	slices.SortStableFunc(f.in.Shared, func(a, b Shared) int { return cmp.Compare(a.Name, b.Name) })
	f.clouds = make([]int, len(cs))
	for i, c := range cs {
		f.in.Clouds = append(f.in.Clouds, c.c)
		f.clouds[c.at] = i
	}
	order := make([]int, len(p.Windows))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int {
		x, y := &p.Windows[a], &p.Windows[b]
		if d := slices.Compare(x.Wave, y.Wave); d != 0 {
			return d
		}
		if d := slices.Compare(x.Flux, y.Flux); d != 0 {
			return d
		}
		return slices.Compare(x.Err, y.Err)
	})
	f.place = make([]int, len(order))
	for i, k := range order {
		f.place[k] = i
		w := p.Windows[k]
		if w.Name == "" {
			w.Name = fmt.Sprintf("window %d", k+1)
		}
		w.Lines = slices.Clone(w.Lines)
		slices.SortStableFunc(w.Lines, func(a, b atomic.Line) int {
			if d := cmp.Compare(a.Wave, b.Wave); d != 0 {
				return d
			}
			return cmp.Compare(a.Name, b.Name)
		})
		f.in.Windows = append(f.in.Windows, w)
	}
}

// nuisances adds the widths of the profiles and the velocity zero points.
func (f *Fitter) nuisances() error {
	type known struct {
		window string
		err    float64
	}
	seen := map[string]known{}
	for _, w := range f.wins {
		sigma := w.in.WidthErr
		if sigma == 0 {
			sigma = DefaultWidthErr
		}
		for _, n := range []struct {
			name string
			kind Kind
			err  float64
		}{{widthName(w.in), WidthFactor, sigma}, {zeroName(w.in), VelocityZero, w.in.VelocityErr}} {
			if was, ok := seen[n.name]; ok {
				if was.err != n.err {
					return w.bad("give one, or give them different names", "%s has error %g here and %g in %s", n.name, n.err, was.err, was.window)
				}
				continue
			}
			seen[n.name] = known{w.name, n.err}
			if !(n.err > 0) {
				continue
			}
			if err := f.params.add(n.name, n.kind, -1, Start(0).Prior(0, n.err)); err != nil {
				return err
			}
		}
	}
	return nil
}

func widthName(w *Window) string { return named("profile width", w.Instrument) }

func zeroName(w *Window) string { return named("velocity zero", w.Exposure) }

func named(what, key string) string {
	if key == "" {
		return what
	}
	return what + " " + key
}

// connect finds which lines of a window each comp absorbs in, and the columns of its
// Jacobian.
func (f *Fitter) connect() error {
	n, spare := len(f.start), 0
	for _, w := range f.wins {
		for i := range w.in.Lines {
			l := &w.in.Lines[i]
			if !(l.Wave > 0) || !(l.F > 0) || !(l.Gamma >= 0) {
				return w.bad("mend its row", "the line %q has no wavelength or no oscillator strength", l.Name)
			}
			found := len(f.in.Clouds) == 0
			for k := range f.comps {
				if f.comps[k].carrier == l.Carrier() {
					w.absorb = append(w.absorb, absorber{line: l, comp: k})
					found = true
				}
			}
			if !found {
				return w.bad(fmt.Sprintf("give a cloud the species %q, or take the line out of the window", l.Carrier()), "no cloud holds %s", l.Name)
			}
		}
		for _, a := range w.absorb {
			c := &f.comps[a.comp]
			c.set(f.start) // the derivatives name the parameters
			for _, ts := range [][]term{c.dv, c.db, c.dn} {
				for _, t := range ts {
					w.column(t.j)
				}
			}
		}
		if i, ok := f.params.byName[zeroName(w.in)]; ok && w.in.VelocityErr > 0 {
			w.zeroAt = f.params.all[i].value.terms
			w.column(w.zeroAt[0].j)
		}
		if i, ok := f.params.byName[widthName(w.in)]; ok && w.in.WidthErr >= 0 {
			w.width = w.column(f.params.all[i].value.terms[0].j)
		}
		w.linear()
		f.rows += w.rows()
		spare += w.rows() - w.k
	}
	f.rows += len(f.priors)
	if spare+len(f.priors) < n {
		pixels := 0
		linear := 0
		for _, w := range f.wins {
			pixels += len(w.pix)
			linear += w.k
		}
		return bad(f.wins[0].name, "widen the windows, or fix or tie parameters",
			"%d parameters (%d of them of the continuum) for %d pixels", n+linear, linear, pixels)
	}
	return nil
}
