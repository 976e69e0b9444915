package survey

import (
	"encoding/json"
	"fmt"
	"io"
	"path/filepath"
	"runtime"
	"slices"
	"sort"
	"time"

	"lacuna/config"
	"lacuna/internal/disk"
)

// ManifestName is the manifest's file in a results folder.
const ManifestName = "manifest.json"

// A Manifest is enough to repeat a run to the digit: program, inputs, every
// setting with its default, and every row of the data tables that was used.
type Manifest struct {
	Schema     int              `json:"manifest_schema"`
	Program    string           `json:"program"`
	Version    string           `json:"version"`
	Numerics   int              `json:"numerics"`
	Go         string           `json:"go"`
	Platform   string           `json:"platform"` // late digits may differ between processors
	Command    []string         `json:"command"`
	Started    string           `json:"started"` // UTC, RFC 3339
	Ended      string           `json:"ended"`
	Journal    string           `json:"journal"`
	JSchema    int              `json:"journal_schema"`
	Sightlines int              `json:"sightlines"`
	Failed     []string         `json:"failed"`        // names
	Config     Input            `json:"configuration"` // the survey file itself
	Inputs     []Input          `json:"inputs"`        // catalogue, line table, spectra
	Defaults   []config.Setting `json:"defaults"`      // used, and not set by the user
	Resolved   string           `json:"resolved"`      // the whole configuration as TOML, defaults marked
	Rows       []Row            `json:"rows"`          // transitions, structure and solar values used
	MemoryRows int              `json:"memory_rows"`   // of them, rows whose value nobody has yet seen in its source
	Notes      []string         `json:"notes"`
}

// A RunInfo says how a run was called.
type RunInfo struct {
	Command        []string
	Started, Ended time.Time
	Notes          []string // damage of the journal, notes of the configuration
}

// NewManifest describes a run by its configuration and records.
func NewManifest(cfg *config.Survey, records []Record, run RunInfo) (Manifest, error) {
	m := Manifest{
		Schema: 1, Program: "lacuna", Version: Version(), Numerics: Numerics,
		Go: runtime.Version(), Platform: runtime.GOOS + "/" + runtime.GOARCH,
		Command: some(run.Command), Started: run.Started.UTC().Format(time.RFC3339), Ended: run.Ended.UTC().Format(time.RFC3339),
		Journal: JournalName, JSchema: Schema, Sightlines: len(records), Failed: []string{},
		Defaults: cfg.Defaults(), Resolved: string(cfg.Resolved()), Notes: some(append(slices.Clone(cfg.Notes), run.Notes...)),
	}
	var err error
	if m.Config, err = input(cfg.File, filepath.Base(cfg.File)); err != nil {
		return m, err
	}
	for _, name := range []string{cfg.Catalogue, cfg.LineTable} {
		if name == "" {
			continue
		}
		in, err := input(cfg.Path(name), name)
		if err != nil {
			return m, err
		}
		m.Inputs = append(m.Inputs, in)
	}
	inputs, rows := map[Input]bool{}, map[Row]bool{}
	for _, r := range records {
		if r.Status != statusDone {
			m.Failed = append(m.Failed, r.Name)
		}
		for _, in := range r.Result.Inputs {
			if !inputs[in] {
				inputs[in] = true
				m.Inputs = append(m.Inputs, in)
			}
		}
		for _, row := range r.Result.Rows {
			if !rows[row] {
				rows[row] = true
				m.Rows = append(m.Rows, row)
				if row.Status == "memory" {
					m.MemoryRows++
				}
			}
		}
	}
	m.Inputs, m.Rows = some(m.Inputs), some(m.Rows)
	sort.SliceStable(m.Rows, func(i, j int) bool {
		if m.Rows[i].Table != m.Rows[j].Table {
			return m.Rows[i].Table < m.Rows[j].Table
		}
		return m.Rows[i].Key < m.Rows[j].Key
	})
	return m, nil
}

// some makes an absent list an empty one, which JSON writes as [].
func some[T any](s []T) []T {
	if s == nil {
		return []T{}
	}
	return s
}

// Write puts the manifest into a results folder, whole or not at all.
func (m Manifest) Write(dir string) error {
	b, err := json.MarshalIndent(m, "", "  ")
	if err != nil {
		return fmt.Errorf("manifest: %w", err)
	}
	if replaced(b) {
		return fmt.Errorf("manifest: it holds text that is not UTF-8")
	}
	return disk.AtomicWrite(filepath.Join(dir, ManifestName), func(w io.Writer) error {
		_, err := w.Write(append(b, '\n'))
		return err
	})
}
