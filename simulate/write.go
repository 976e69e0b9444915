package simulate

import (
	_ "embed"
	"fmt"
	"io"
	"path/filepath"

	"lacuna/atomic"
	"lacuna/internal/disk"
	"lacuna/internal/table"
	"lacuna/spectrum"
	"lacuna/spectrum/frame"
)

// TruthName is the file of the demonstration that holds what the spectra were
// made from.
const TruthName = "truth.ecsv"

//go:embed lantern.toml
var lanternSurvey []byte

// WriteLantern writes the invented survey into a folder: spectra, survey.toml and
// the truth. The bytes are the same every time.
func WriteLantern(dir string) error {
	lines := atomic.Default()
	for k, e := range Lantern() {
		obs, err := Observe(e.Star, e.Instrument, lines, e.Earth, 20, uint64(k))
		if err != nil {
			return err
		}
		for i := range obs.Segments {
			seg := &obs.Segments[i]
			seg.Frame = e.Frame
			if e.Frame == frame.Topocentric {
				seg.Shift = []frame.Applied{{Keyword: "VHELIO", To: frame.Heliocent, V: e.Earth}}
			}
		}
		path := filepath.Join(dir, e.File)
		if err := spectrum.Write(path, &spectrum.Spectrum{Object: e.Star.Name, Segments: obs.Segments}); err != nil {
			return fmt.Errorf("writing %s: %w", path, err)
		}
	}
	truth := truthTable()
	if err := disk.AtomicWrite(filepath.Join(dir, TruthName), truth.WriteECSV); err != nil {
		return err
	}
	return disk.AtomicWrite(filepath.Join(dir, "survey.toml"), func(w io.Writer) error { _, err := w.Write(lanternSurvey); return err })
}

// truthTable lists every cloud and the totals of each sightline (cloud 0).
func truthTable() *table.Table {
	t := table.New(
		table.Column{Name: "sightline", Type: table.Text},
		table.Column{Name: "species", Type: table.Text},
		table.Column{Name: "cloud", Type: table.Integer, Description: "0: the total"},
		table.Column{Name: "v_helio", Unit: "km / s", Type: table.Real},
		table.Column{Name: "b", Unit: "km / s", Type: table.Real},
		table.Column{Name: "logN", Unit: "dex(1 / cm2)", Type: table.Real},
	)
	seen := map[string]bool{}
	for _, e := range Lantern() {
		name := e.Star.Name
		if seen[name] {
			continue
		}
		seen[name] = true
		for i, c := range e.Star.Clouds {
			for _, col := range c.Cols {
				t.AddRow(table.Str(name), table.Str(col.Species), table.Int(i+1), table.Exact(c.V), table.Exact(c.B), table.Exact(col.LogN))
			}
		}
		for _, col := range e.Star.Columns() {
			t.AddRow(table.Str(name), table.Str(col.Species), table.Int(0), table.Missing, table.Missing, table.Fixed(col.LogN, 4))
		}
	}
	return t
}
