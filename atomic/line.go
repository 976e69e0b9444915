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
type Line struct {
	Name       string   // canonical: species and rest wavelength, air above 2000 Å ("Na I 5889.95")
	Species    string   // "Na I", "CH", "CN"
	Level      string   // lower level when a species has several: "", "*", "**", "N=1", "e", "f", "J=2"
	Alias      []string // "D2", "K", "R(0)"
	Wave       float64  // vacuum Å
	WaveAir    float64  // Å; 0 below 2000 Å
	F, FErr    float64  // oscillator strength and its 1σ error (from the source, or the default of its grade)
	Gamma      float64  // damping, s⁻¹; 0 where unknown
	GLow, GUp  float64  // statistical weights
	ELow       float64  // energy of the lower level, cm⁻¹
	FSet       string   // "default", or the named set that the f comes from
	FSource    string
	WaveSource string
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
	DV       float64 // km/s from the centre of gravity, + redward
	Isotope  string
	Status   Status
}
