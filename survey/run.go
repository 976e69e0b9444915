package survey

import (
	"context"
	"errors"
	"fmt"
	"runtime/debug"

	"lacuna/atomic"
	"lacuna/config"
	"lacuna/internal/oops"
	"lacuna/spectrum/frame"
)

// Release is the program's version; Numerics changes whenever a number may.
const (
	Release  = "0.1.0"
	Numerics = 3
)

// Version is the release with the revision it was built from, where known.
func Version() string {
	v := Release
	if info, ok := debug.ReadBuildInfo(); ok {
		rev, dirty := "", ""
		for _, s := range info.Settings {
			switch {
			case s.Key == "vcs.revision" && len(s.Value) >= 12:
				rev = " (" + s.Value[:12]
			case s.Key == "vcs.modified" && s.Value == "true":
				dirty = ", modified"
			}
		}
		if rev != "" {
			v += rev + dirty + ")"
		}
	}
	return v
}

// Failed says what could not be done: sightlines, or single lines of them. The
// rest was.
type Failed struct {
	Of   int // sightlines
	Errs []error
}

func (f *Failed) Error() string {
	return fmt.Sprintf("%d failures in %d sightlines: %v", len(f.Errs), f.Of, errors.Join(f.Errs...))
}

// Mistakes reports whether every failure is the user's to mend.
func (f *Failed) Mistakes() bool {
	for _, e := range f.Errs {
		if !oops.IsInput(e) {
			return false
		}
	}
	return true
}

// Options of a run.
type Options struct {
	Only    []string                    // names of the sightlines to run; nil: all
	Workers int                         // 0: one a core
	Done    func(Record)                // called for each record, in the order of finishing, never concurrently
	Have    func(string) (Record, bool) // an earlier record by key, to be kept as it is
}

// A chain is what all sightlines of one run share.
type chain struct {
	cfg     *config.Survey
	table   *atomic.Table
	base    *atomic.Table // the same with the default set of f
	formula frame.Formula
}

// Tables returns the transitions a survey uses: the default table, its set of
// oscillator strengths, and the user's own rows.
func Tables(fSet, own string) (*atomic.Table, error) {
	t := atomic.Default()
	var err error
	if fSet != "" && fSet != "default" {
		if t, err = t.WithSet(fSet); err != nil {
			return nil, err
		}
	}
	if own != "" {
		if t, err = t.WithFile(own); err != nil {
			return nil, err
		}
	}
	return t, nil
}

// Run takes every sightline of a survey through the chain. Records come back in
// the order of the survey, whatever the number of workers; the bytes of their
// results do not depend on it. Sightlines that cannot be done have Status
// "failed" in their records, and Run returns a *Failed beside the records.
func Run(ctx context.Context, cfg *config.Survey, o Options) ([]Record, error) {
	own := cfg.LineTable
	c := &chain{cfg: cfg, formula: cfg.Formula()}
	if own != "" {
		own = cfg.Path(own)
	}
	var err error
	if c.table, err = Tables(cfg.FSet, own); err != nil {
		return nil, err
	}
	if c.base, err = Tables("default", own); err != nil {
		return nil, err
	}
	todo, err := choose(cfg, o.Only)
	if err != nil {
		return nil, err
	}
	records := make([]Record, len(todo))
	errs := make([]error, len(todo))
	err = each(ctx, len(todo), o.Workers, func(k int) {
		records[k], errs[k] = c.record(cfg.Sightlines[todo[k]], todo[k], o.Have)
	}, func(k int) {
		if o.Done != nil {
			o.Done(records[k])
		}
	})
	if err != nil {
		return nil, fmt.Errorf("%w; the journal keeps what was done", err)
	}
	return records, together(errs)
}

// choose returns the indices of the sightlines to run.
func choose(cfg *config.Survey, only []string) ([]int, error) {
	var out []int
	if len(only) == 0 {
		for i := range cfg.Sightlines {
			out = append(out, i)
		}
		return out, nil
	}
	var names []string
	for _, s := range cfg.Sightlines {
		names = append(names, s.Name)
	}
	want := map[string]bool{}
	for _, n := range only {
		want[n] = true
	}
	for i, n := range names {
		if want[n] {
			out = append(out, i)
			delete(want, n)
		}
	}
	for _, n := range only {
		if want[n] {
			fix := "the names are those of [[sightline]] and the catalogue"
			if near := oops.Nearest(n, names, 3); len(near) > 0 {
				fix = fmt.Sprintf("did you mean %q?", near[0])
			}
			return nil, oops.Inputf(cfg.File, "", fix, "there is no sightline %q", n)
		}
	}
	return out, nil
}
