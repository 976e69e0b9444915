package survey

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"hash"
	"sync"

	"lacuna/atomic"
	"lacuna/config"
	"lacuna/spectrum/frame"
)

// Key is the SHA-256, in hex, of everything that the numbers of a sightline
// depend on: the journal's schema, Numerics, the survey's own settings, the
// resolved sightline, the content of its inputs, the table of transitions and the
// solar scale. Equal keys mean equal results, so that a finished sightline is not
// computed again.
//
// The table counts as a whole, not by the lines asked for: any other row may turn
// up as a blend. Paths do not count, and neither does the place in the survey.
func Key(cfg *config.Survey, s config.Sightline, inputs []Input, table *atomic.Table) (string, error) {
	type content struct {
		SHA256 string `json:"sha256"`
		Size   int64  `json:"size"`
	}
	contents := make([]content, len(inputs)) // in the order of the spectra
	for i, in := range inputs {
		contents[i] = content{in.SHA256, in.Size}
	}
	h := sha256.New()
	err := put(h, struct {
		Schema    int              `json:"schema"`
		Numerics  int              `json:"numerics"`
		Frame     frame.Kind       `json:"frame"`
		Scale     string           `json:"scale"`
		FSet      string           `json:"f_set"`
		Air       string           `json:"air_formula"`
		Seed      int              `json:"seed"`
		Sightline config.Sightline `json:"sightline"`
		Inputs    []content        `json:"inputs"`
		Lines     string           `json:"lines"`
		Solar     string           `json:"solar"`
	}{Schema, Numerics, cfg.Frame, cfg.Scale, cfg.FSet, cfg.AirFormula, cfg.Seed, s, contents, tableDigest(table), solarDigest(cfg.Scale, table, s.Columns)})
	if err != nil {
		return "", fmt.Errorf("key of %q: %w", s.Name, err)
	}
	return hex.EncodeToString(h.Sum(nil)), nil
}

// put writes the canonical JSON of v: fields in their order, maps sorted, floats
// with every digit that counts.
func put(h hash.Hash, v any) error {
	b, err := json.Marshal(v)
	if err != nil {
		return err
	}
	if replaced(b) {
		return fmt.Errorf("it holds text that is not UTF-8")
	}
	h.Write(b)
	return nil
}

var digests sync.Map // of tables, which do not change

// tableDigest is the SHA-256 of all rows of a table of transitions.
func tableDigest(t *atomic.Table) string {
	if d, ok := digests.Load(t); ok {
		return d.(string)
	}
	h := sha256.New()
	for _, l := range t.Lines() {
		l.File = "" // where a user's row lies does not change what it says
		fmt.Fprintf(h, "%#v\n", l)
	}
	d := hex.EncodeToString(h.Sum(nil))
	digests.Store(t, d)
	return d
}

// solarDigest is the SHA-256 of what a scale says of the elements of a sightline's
// possible columns: those of the table and those given; "" without a scale.
func solarDigest(scale string, t *atomic.Table, given []config.Column) string {
	if scale == "" {
		return ""
	}
	species := t.Species()
	for _, c := range given {
		species = append(species, c.Species)
	}
	h := sha256.New()
	for _, sp := range species {
		if element, _, ok := atomic.SplitSpecies(sp); ok {
			rows, err := atomic.SolarRows(scale, element)
			fmt.Fprintf(h, "%s %#v %v\n", element, rows, err)
		}
	}
	return hex.EncodeToString(h.Sum(nil))
}
