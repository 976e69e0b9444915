package survey

import (
	"lacuna/abundance"
	"lacuna/cog"
	"lacuna/measure"
	"lacuna/spectrum/frame"
)

// Schema is the version of the journal's records.
const Schema = 2

// A Record is one journal line: everything found on one sightline.
type Record struct {
	Schema int    `json:"schema"`
	Key    string `json:"key"` // SHA-256 of what the numbers depend on
	Name   string `json:"name"`
	Index  int    `json:"index"`  // place in the survey
	Status string `json:"status"` // done, failed
	Error  string `json:"error,omitempty"`
	Result Result `json:"result"`
}

// A Result is one sightline.
type Result struct {
	Scale      string                `json:"scale"`
	FSet       string                `json:"f_set"`
	Frame      frame.Kind            `json:"frame"`
	Spectra    []SpectrumInfo        `json:"spectra"`
	Widths     []measure.Width       `json:"widths"`
	Doublets   []measure.Doublet     `json:"doublets,omitempty"`
	Growth     []cog.Result          `json:"growth,omitempty"`
	Fits       []Fit                 `json:"fits,omitempty"`
	Columns    []abundance.Column    `json:"columns"`            // every method
	Verdicts   []abundance.Verdict   `json:"verdicts,omitempty"` // whether the methods agree, one a species
	Adopted    []abundance.Column    `json:"adopted"`            // one a species, and sums over levels
	Hydrogen   *abundance.Hydrogen   `json:"hydrogen,omitempty"`
	Depletions []abundance.Depletion `json:"depletions,omitempty"`
	Inputs     []Input               `json:"inputs"`
	Rows       []Row                 `json:"rows"` // transition and solar rows used
	Warnings   []string              `json:"warnings,omitempty"`
	Failures   []string              `json:"failures,omitempty"` // lines asked for that could not be measured
}

// SpectrumInfo is what was read.
type SpectrumInfo struct {
	File     string          `json:"file"`
	SHA256   string          `json:"sha256"`
	Layout   string          `json:"layout"`
	Object   string          `json:"object,omitempty"`
	Orders   int             `json:"orders"`
	Medium   string          `json:"medium"`
	MediumBy string          `json:"medium_by"`
	Frame    string          `json:"frame"`
	FrameBy  string          `json:"frame_by"`
	Shifts   []frame.Applied `json:"shifts,omitempty"` // as applied to reach the survey's frame
	R        float64         `json:"resolution,omitempty"`
	RBy      string          `json:"resolution_by,omitempty"`
	Notes    []string        `json:"notes,omitempty"`
}

// An Input is one file that the numbers depend on.
type Input struct {
	Path   string `json:"path"` // relative to the survey file
	SHA256 string `json:"sha256"`
	Size   int64  `json:"size"`
}

// A Row is one row of a data table that was used.
type Row struct {
	Table  string `json:"table"` // lines, hyperfine, solar
	Key    string `json:"key"`
	Value  string `json:"value"`
	Source string `json:"source"`
	Status string `json:"status"`
}
