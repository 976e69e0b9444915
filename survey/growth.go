package survey

import (
	"context"
	"fmt"
	"slices"

	"lacuna/atomic"
	"lacuna/cog"
	"lacuna/config"
)

// RunGrowth fits the curves of growth of a batch. Records come back in the order
// of the batch, with Result.Growth filled, whatever the number of workers.
func RunGrowth(ctx context.Context, cfg *config.Growth, workers int, progress func(done, of int, name string)) ([]Record, error) {
	own := cfg.LineTable
	if own != "" {
		own = cfg.Path(own)
	}
	table, err := Tables(cfg.FSet, own)
	if err != nil {
		return nil, err
	}
	n := len(cfg.Sightlines)
	records := make([]Record, n)
	errs := make([]error, n)
	count := 0
	err = each(ctx, n, workers, func(k int) {
		s := cfg.Sightlines[k]
		r := Record{Schema: Schema, Name: s.Name, Index: k, Status: statusDone}
		r.Result.FSet = cfg.FSet
		if r.Result.Growth, errs[k] = growthOf(table, s); errs[k] != nil {
			errs[k] = at(cfg.File, s.Name, errs[k])
			r.Status, r.Error = statusFailed, errs[k].Error()
		}
		records[k] = r
	}, func(k int) {
		count++
		progress(count, n, cfg.Sightlines[k].Name)
	})
	if err != nil {
		return nil, err
	}
	return records, together(errs)
}

// growthOf fits each species of one sightline, or each group that shares one b.
func growthOf(table *atomic.Table, s config.GrowthSightline) ([]cog.Result, error) {
	type group struct {
		name   string
		share  []string
		levels []cog.Level
	}
	var groups []group
	for _, w := range s.Widths {
		line, err := table.Find(w.Line)
		if err != nil {
			return nil, err
		}
		species := line.Carrier()
		k := slices.IndexFunc(groups, func(g group) bool { return g.name == species || slices.Contains(g.share, species) })
		if k < 0 {
			g := group{name: species}
			for _, share := range s.ShareB {
				if slices.Contains(share, species) {
					g.share = share
				}
			}
			k = len(groups)
			groups = append(groups, g)
		}
		g := &groups[k]
		l := slices.IndexFunc(g.levels, func(v cog.Level) bool { return v.Name == species })
		if l < 0 {
			l = len(g.levels)
			g.levels = append(g.levels, cog.Level{Name: species})
		}
		width, err1, limit, sigma := w.Angstrom()
		g.levels[l].Points = append(g.levels[l].Points, cog.Point{Line: line, W: width, Err: err1, Limit: limit, Sigma: sigma})
	}
	var out []cog.Result
	for _, g := range groups {
		r, err := cog.FitLevels(g.name, g.levels, cog.Options{Key: s.Name, BMin: s.BRange[0], BMax: s.BRange[1]})
		if err != nil {
			return nil, fmt.Errorf("%s: %w", g.name, err)
		}
		out = append(out, r)
	}
	return out, nil
}
