package atomic

// A Status says how a value in a table came to be there.
type Status string

// The statuses of table rows.
const (
	Verified Status = "verified" // read in a retrieved document
	Computed Status = "computed" // computed from verified constants
	Memory   Status = "memory"   // recalled, not seen
	User     Status = "user"     // from a user's own file
)

// A Line is one transition, or one unresolved blend that is always used as one.
// Its slices are shared with the table: read them only.
type Line struct {
	Name       string   `json:"name"`               // canonical: species and rest wavelength, air above 3000 Å, vacuum below ("Na I 5889.95", "Zn II 2026.14")
	Species    string   `json:"species"`            // "Na I", "CH", "CN"
	Level      string   `json:"level"`              // lower level when a species has several: "", "*", "**", "N=1", "e", "f", "J=2"
	Alias      []string `json:"alias,omitempty"`    // "D2", "K", "R(0)"
	Wave       float64  `json:"wave"`               // vacuum Å
	WaveAir    float64  `json:"wave_air,omitempty"` // Å; 0 below 2000 Å
	F          float64  `json:"f"`                  // oscillator strength
	FErr       float64  `json:"f_err"`              // its 1σ error: from the source, or the default of its grade
	Gamma      float64  `json:"gamma"`              // damping, s⁻¹; 0 where unknown
	GLow       float64  `json:"g_low"`              // statistical weight of the lower level; 0 where unknown
	GUp        float64  `json:"g_up"`               // of the upper level; 0 where unknown
	ELow       float64  `json:"e_low"`              // energy of the lower level, cm⁻¹
	Lower      string   `json:"lower"`              // term of the lower level, "3s 2S1/2"
	Upper      string   `json:"upper"`              // term of the upper level, or ""
	FSet       string   `json:"f_set"`              // "default", or the named set that the f comes from
	FSource    string   `json:"f_source"`           // key of Cite
	WaveSource string   `json:"wave_source"`        // key of Cite
	FStatus    Status   `json:"f_status"`
	WaveStatus Status   `json:"wave_status"`
	Note       string   `json:"note,omitempty"`
	Parts      []Part   `json:"parts,omitempty"`   // hyperfine and isotope structure; empty: one unsplit line
	Missing    string   `json:"missing,omitempty"` // known structure that the table lacks ("hyperfine structure of 55Mn"), or ""
	File       string   `json:"file,omitempty"`    // the user's file a row came from, or ""
}

// A Part is one hyperfine or isotopic member of a Line. Strengths sum to 1.
type Part struct {
	Strength float64 `json:"strength"`
	DV       float64 `json:"dv"` // km/s from the line's Wave, + redward
	Isotope  string  `json:"isotope,omitempty"`
	Status   Status  `json:"status"`
	Low      string  `json:"low,omitempty"` // quantum number F of the lower level, or "e" and "f"
	Up       string  `json:"up,omitempty"`  // of the upper level
	Source   string  `json:"source"`        // key of Cite
}
