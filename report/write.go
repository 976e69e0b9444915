package report

import (
	"fmt"
	"io"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"sync"
	"sync/atomic"

	"lacuna/internal/disk"
	"lacuna/internal/oops"
	"lacuna/internal/table"
	"lacuna/survey"
)

// Figures of a results folder stand in this folder in it.
const figuresFolder = "figures"

// WriteResults writes into a results folder the tables widths, columns,
// depletions, growth and clouds (ECSV), and every figure of every sightline (SVG). Each
// file appears whole or not at all.
func WriteResults(dir string, rs []survey.Record) error {
	for _, t := range []struct {
		name string
		made *table.Table
	}{{"widths", Widths(rs)}, {"columns", Columns(rs)}, {"depletions", Depletions(rs)}, {"growth", Growth(rs)}, {"clouds", Clouds(rs)}} {
		if err := disk.AtomicWrite(filepath.Join(dir, t.name+".ecsv"), t.made.WriteECSV); err != nil {
			return err
		}
	}
	return writeFigures(dir, rs, Figures)
}

// WriteGrowth writes the table growth.ecsv into a results folder, and a figure
// for each curve of growth if figures is true.
func WriteGrowth(dir string, rs []survey.Record, figures bool) error {
	if err := disk.AtomicWrite(filepath.Join(dir, "growth.ecsv"), Growth(rs).WriteECSV); err != nil {
		return err
	}
	if !figures {
		return nil
	}
	return writeFigures(dir, rs, GrowthFigures)
}

// writeFigures writes the figures of each record, as many records at a time as
// there are processors. The error returned is that of the first record with one.
func writeFigures(dir string, rs []survey.Record, of func(survey.Record) []Figure) error {
	folder := filepath.Join(dir, figuresFolder)
	if err := os.MkdirAll(folder, 0o755); err != nil {
		return err
	}
	errs := make([]error, len(rs))
	var next atomic.Int64
	var wg sync.WaitGroup
	for range min(runtime.GOMAXPROCS(0), len(rs)) {
		wg.Go(func() {
			for i := next.Add(1) - 1; int(i) < len(rs); i = next.Add(1) - 1 {
				for _, f := range of(rs[i]) {
					if errs[i] == nil {
						errs[i] = disk.AtomicWrite(filepath.Join(folder, f.Name+".svg"), f.WriteSVG)
					}
				}
			}
		})
	}
	wg.Wait()
	for _, err := range errs {
		if err != nil {
			return err
		}
	}
	return nil
}

// WriteLineFigure writes the lines of one sightline to a file, SVG or PNG by its
// ending. More than one page goes to name-2.svg, name-3.svg, …
func WriteLineFigure(path string, r survey.Record) error { return writeTo(path, LineFigures(r)) }

// WriteCloudFigure does the same for fitted clouds.
func WriteCloudFigure(path string, r survey.Record) error { return writeTo(path, CloudFigures(r)) }

func writeTo(path string, figures []Figure) error {
	end := filepath.Ext(path)
	write := Figure.WriteSVG
	switch strings.ToLower(end) {
	case ".svg":
	case ".png":
		write = func(f Figure, w io.Writer) error { return f.WritePNG(w, 300) }
	default:
		return oops.Input(path, "", fmt.Sprintf("a figure ending in %q cannot be written", end), "end the name with .svg or .png")
	}
	for i, f := range figures {
		name := path
		if i > 0 {
			name = fmt.Sprintf("%s-%d%s", strings.TrimSuffix(path, end), i+1, end)
		}
		if err := disk.AtomicWrite(name, func(w io.Writer) error { return write(f, w) }); err != nil {
			return err
		}
	}
	return nil
}
