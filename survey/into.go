package survey

import (
	"context"
	"fmt"
	"slices"
	"time"

	"lacuna/config"
)

// RunOptions are the options of a run into a results folder.
type RunOptions struct {
	Only     []string
	Workers  int
	Fresh    bool     // measure again what the journal has
	Command  []string // for the manifest
	Progress func(done, of int, name string)
	Warn     func(string)
}

// RunInto runs a survey and keeps its records in the journal of a results
// folder, with the manifest beside it. Sightlines whose key stands in the journal
// are taken from there. Returned are the records of this run.
func RunInto(ctx context.Context, cfg *config.Survey, out string, o RunOptions) ([]Record, error) {
	j, err := OpenJournal(out)
	if err != nil {
		return nil, err
	}
	defer j.Close()
	start := time.Now()
	damage := j.Damage()
	for _, d := range damage {
		o.Warn(d)
	}
	of := len(cfg.Sightlines)
	if o.Only != nil {
		of = len(o.Only)
	}
	done := 0
	var journalErr error
	ro := Options{Only: o.Only, Workers: o.Workers, Have: j.Have, Done: func(r Record) {
		done++
		o.Progress(done, of, r.Name)
		if err := j.Append(r); err != nil && journalErr == nil {
			journalErr = err
		}
	}}
	if o.Fresh {
		ro.Have = nil
	}
	records, runErr := Run(ctx, cfg, ro)
	if journalErr != nil {
		return nil, fmt.Errorf("journal: %w", journalErr)
	}
	if err := j.Close(); err != nil {
		return nil, fmt.Errorf("journal: %w", err)
	}
	if records == nil {
		return nil, runErr
	}
	all, err := Current(out, cfg)
	if err != nil {
		return nil, err
	}
	info := RunInfo{Command: o.Command, Started: start, Ended: time.Now(), Notes: damage}
	m, err := NewManifest(cfg, all, info)
	if err != nil {
		return nil, err
	}
	if err := m.Write(out); err != nil {
		return nil, err
	}
	return records, runErr
}

// Current returns the last record of each sightline that the survey has, in its
// order: what tables, figures and pages are made from.
func Current(out string, cfg *config.Survey) ([]Record, error) {
	records, _, err := ReadJournal(out)
	if err != nil {
		return nil, err
	}
	place := map[string]int{}
	for i, s := range cfg.Sightlines {
		place[s.Name] = i
	}
	var keep []Record
	for _, r := range records {
		if i, ok := place[r.Name]; ok {
			r.Index = i
			keep = append(keep, r)
		}
	}
	slices.SortStableFunc(keep, func(a, b Record) int { return a.Index - b.Index })
	return keep, nil
}
