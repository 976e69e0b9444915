package atomic

import (
	"math"
	"slices"
	"sync"
)

// A Band is one diffuse interstellar band. Its rest wavelength is a convention:
// it was made by shifting a star's band to the velocity of its Na I or K I.
type Band struct {
	Name       string  // "DIB 5780"
	WaveAir    float64 // Å
	Wave       float64 // vacuum Å
	WaveErr    float64 // Å
	FWHM       float64 // Å; NaN where unknown
	WPerEBV    float64 // Å per mag of E(B−V); NaN where unknown
	WPerEBVErr float64 // scatter between sightlines, Å per mag; NaN where unknown
	Source     string  // of the wavelength, key of Cite
	Status     Status  // of the wavelength
	WSource    string  // of the strength, or ""
	WStatus    Status
	Note       string
}

var bands = sync.OnceValue(func() []Band {
	var out []Band
	for _, r := range embedded("bands.csv", "name lambda_air_A lambda_err_A fwhm_A W_per_EBV_mA W_per_EBV_err_mA wave_src wave_status W_src W_status note").rows {
		mustSource(r, "wave_src", "wave_status")
		b := Band{Name: r.get("name"), WaveAir: must(r.num("lambda_air_A", 3000, 20000)), WaveErr: must(r.num("lambda_err_A", 0, 10)),
			FWHM: must(r.num("fwhm_A", 0.1, 100)), WPerEBV: must(r.num("W_per_EBV_mA", 1, 1e4)) / 1000, WPerEBVErr: must(r.num("W_per_EBV_err_mA", 0, 1e4)) / 1000,
			Source: r.get("wave_src"), Status: Status(r.get("wave_status")), WSource: r.get("W_src"), WStatus: Status(r.get("W_status")), Note: r.get("note")}
		if !math.IsNaN(b.WPerEBV) {
			mustSource(r, "W_src", "W_status")
		}
		b.Wave = vacOf(b.WaveAir)
		out = append(out, b)
	}
	return out
})

// Bands returns the diffuse interstellar bands, ascending in wavelength. Widths
// and strengths are rounded: W per E(B−V) is good to 30 % at best.
func Bands() []Band { return slices.Clone(bands()) }

// A StellarLine is a line of hot stars that may lie under an interstellar one.
type StellarLine struct {
	Name    string // "He I", "H I Hε", "C IV"
	Wave    float64
	WaveAir float64 // Å; 0 below 2000 Å
	Note    string
	Source  string // key of Cite
	Status  Status
}

var stellar = sync.OnceValue(func() []StellarLine {
	var out []StellarLine
	for _, r := range embedded("stellar.csv", "name lambda_vac_A lambda_air_A src status note").rows {
		mustSource(r, "src", "status")
		l := StellarLine{Name: r.get("name"), Wave: must(r.num("lambda_vac_A", 900, 12000)), WaveAir: must(r.num("lambda_air_A", 2000, 12000)),
			Source: r.get("src"), Status: Status(r.get("status")), Note: r.get("note")}
		if math.IsNaN(l.WaveAir) {
			l.WaveAir = 0
		}
		out = append(out, l)
	}
	return out
})

// StellarLines returns strong lines of O, B and early A stars, ascending in
// wavelength (rest frame of the star). The list warns; it does not model a star.
func StellarLines() []StellarLine { return slices.Clone(stellar()) }
