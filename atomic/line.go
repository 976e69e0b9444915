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
	Name       string   // canonical: species and rest wavelength, air above 3000 Å, vacuum below ("Na I 5889.95", "Zn II 2026.14")
	Species    string   // "Na I", "CH", "CN"
	Level      string   // lower level when a species has several: "", "*", "**", "N=1", "e", "f", "J=2"
	Alias      []string // "D2", "K", "R(0)"
	Wave       float64  // vacuum Å
	WaveAir    float64  // Å; 0 below 2000 Å
	F, FErr    float64  // oscillator strength and its 1σ error (from the source, or the default of its grade)
	Gamma      float64  // damping, s⁻¹; 0 where unknown
	GLow, GUp  float64  // statistical weights; 0 where unknown
	ELow       float64  // energy of the lower level, cm⁻¹
	Lower      string   // term of the lower level, "3s 2S1/2"
	Upper      string   // term of the upper level, or ""
	FSet       string   // "default", or the named set that the f comes from
	FSource    string   // key of Cite
	WaveSource string   // key of Cite
	FStatus    Status
	WaveStatus Status
	Note       string
	Parts      []Part // hyperfine and isotope structure; empty: one unsplit line
	Missing    string // known structure that the table lacks ("hyperfine structure of 55Mn"), or ""
	File       string // the user's file a row came from, or ""
}

// A Part is one hyperfine or isotopic member of a Line. Strengths sum to 1.
type Part struct {
	Strength float64
	DV       float64 // km/s from the line's Wave, + redward
	Isotope  string
	Status   Status
	Low, Up  string // quantum numbers F of the two levels, or "e" and "f"
	Source   string // key of Cite
}
