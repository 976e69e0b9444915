package survey

import (
	"errors"
	"fmt"
	"math"

	"lacuna/atomic"
	"lacuna/measure"
)

// Pieces are the neighbourhoods of lines, cut out of every segment that holds them,
// with continua and zero levels: what widths and fits are made from.
type Pieces struct {
	lights []Light
	tasks  []LineTask
	table  *atomic.Table
	jobs   []job
	failed []error // the first error of each task
	notes  []note
	widths []measure.Width // once measured
}

// A job is one line in one segment.
type job struct {
	task, light int
	piece       measure.Piece
	prior       measure.Zero // zero level before any black core
	core        bool         // the line has a black core, which gives the zero level
}

// A note is a sentence about a task.
type note struct {
	task int
	text string
}

// leave keeps the error of a line in an order that cannot be used.
func (p *Pieces) leave(j job, err error) {
	if p.failed[j.task] == nil {
		p.failed[j.task] = err
	}
	p.notes = append(p.notes, note{j.task, fmt.Sprintf("%s is left out: %v", p.lights[j.light].Seg.Label, err)})
}

// Cut cuts the pieces of all tasks. The zero level of a segment is measured on all
// black cores among the lines asked for in it; it replaces a prior, never the user's
// word.
func Cut(lights []Light, tasks []LineTask, table *atomic.Table) *Pieces {
	p := &Pieces{lights: lights, tasks: tasks, table: table, failed: make([]error, len(tasks))}
	for n, t := range tasks {
		found := false
		for k, l := range lights {
			if t.File != "" && l.Seg.Source.File != t.File || t.Order != nil && l.Seg.Order != *t.Order || !l.covers(t.Line, t.Window) {
				continue
			}
			found = true
			j := job{task: n, light: k}
			var err error
			if j.piece, err = l.piece(t, table); err != nil {
				p.leave(j, err)
				continue
			}
			j.prior = j.piece.Zero
			p.jobs = append(p.jobs, j)
		}
		if !found {
			if t.Optional {
				p.notes = append(p.notes, note{n, fmt.Sprintf("%s is not measured: no spectrum holds its window", t.Line.Name)})
				continue
			}
			p.failed[n] = notCovered(lights, t)
		}
	}
	p.zeros()
	return p
}

// zeros measures zero levels on black cores.
func (p *Pieces) zeros() {
	zeros := make([]measure.Zero, len(p.jobs)) // on the black core of each job's line; Pixels 0: none
	for i, j := range p.jobs {
		q := j.piece
		cont := make([]float64, len(q.Wave))
		q.Continuum.At(cont, q.Wave)
		if z, ok := measure.ZeroLevel(q.Wave, q.Flux, cont, q.Continuum.Sigma, q.Continuum.Noise, q.Mask); ok {
			zeros[i] = z
			p.jobs[i].core = z.Pixels > 0
		}
	}
	for i := range p.jobs {
		if p.jobs[i].piece.Zero.By == "user" {
			continue
		}
		var near []measure.Zero
		for k, z := range zeros {
			apart := math.Abs(p.jobs[k].piece.Line.Wave/p.jobs[i].piece.Line.Wave - 1)
			if z.Pixels > 0 && p.jobs[k].light == p.jobs[i].light && apart < zeroReach {
				near = append(near, z)
			}
		}
		if near != nil {
			p.jobs[i].piece.Zero = combineZeros(near)
		}
	}
}

// Measure measures each line in every segment that holds its window. A line that
// cannot be measured anywhere is an error; the errors of all such lines come back
// joined, beside the widths of the others. An order that cannot be used where
// another one holds the line too is a sentence in missing, and so is an optional
// line that no spectrum holds. Fits after it know what else absorbs in the windows.
func (p *Pieces) Measure() (widths []measure.Width, missing []string, err error) {
	done := make([]int, len(p.tasks)) // widths of each task
	for _, j := range p.jobs {
		w, err := measure.Measure(j.piece)
		if err != nil {
			p.leave(j, err)
			continue
		}
		done[j.task]++
		widths = append(widths, w)
	}
	for _, n := range p.notes {
		if done[n.task] > 0 || p.failed[n.task] == nil {
			missing = append(missing, n.text)
		}
	}
	var errs []error
	for n, err := range p.failed {
		if err != nil && done[n] == 0 { // no other order can stand in
			errs = append(errs, err)
		}
	}
	p.widths = widths
	return widths, missing, errors.Join(errs...)
}

// MeasureLines cuts and measures.
func MeasureLines(lights []Light, tasks []LineTask, table *atomic.Table) (widths []measure.Width, missing []string, err error) {
	return Cut(lights, tasks, table).Measure()
}

// zeroReach is how far, relative to its wavelength, a zero level holds: about one
// order, also in spectra whose orders were merged (common practice, no source).
const zeroReach = 0.01

// combineZeros is the weighted mean of zero levels measured on several cores of
// one order.
func combineZeros(zs []measure.Zero) measure.Zero {
	var sw, s float64
	out := measure.Zero{By: zs[0].By}
	for _, z := range zs {
		w := 1 / (z.Err * z.Err)
		sw += w
		s += w * z.Level
		out.Pixels += z.Pixels
	}
	out.Level, out.Err = s/sw, 1/math.Sqrt(sw)
	return out
}
