package spectrum

import (
	"math"
	"strings"

	"lacuna/spectrum/frame"
)

// An axis is what the numbers of a spectral axis are.
type axis int

const (
	wavelength axis = iota
	frequency
	energy
	wavenumber
)

// A waveUnit turns numbers into wavelengths in Å.
type waveUnit struct {
	axis  axis
	scale float64 // to Å, Hz, eV or cm⁻¹
}

// hc in eV Å: CODATA 2018, exact by definition of h, c and e.
const hcEV = 12398.419843320026

// angstrom converts one number.
func (u waveUnit) angstrom(x float64) float64 {
	switch u.axis {
	case frequency:
		return frame.C * 1e13 / (x * u.scale) // c in Å/s over Hz
	case energy:
		return hcEV / (x * u.scale)
	case wavenumber:
		return 1e8 / (x * u.scale)
	}
	return x * u.scale
}

// Spellings without regard to case. Metres are apart: M is not a metre.
var waveUnits = map[string]waveUnit{
	"angstrom": {wavelength, 1}, "angstroms": {wavelength, 1}, "ang": {wavelength, 1}, "aa": {wavelength, 1}, "a": {wavelength, 1},
	"å": {wavelength, 1}, "\u212b": {wavelength, 1}, "0.1nm": {wavelength, 1}, "10**-10m": {wavelength, 1}, "10**(-10)m": {wavelength, 1}, "1e-10m": {wavelength, 1},
	"nm": {wavelength, 10}, "nanometer": {wavelength, 10}, "nanometers": {wavelength, 10}, "nanometre": {wavelength, 10}, "nanometres": {wavelength, 10},
	"millimicron": {wavelength, 10}, "millimicrons": {wavelength, 10}, "mum*1e-3": {wavelength, 10},
	"um": {wavelength, 1e4}, "micron": {wavelength, 1e4}, "microns": {wavelength, 1e4}, "micrometer": {wavelength, 1e4}, "micrometers": {wavelength, 1e4},
	"micrometre": {wavelength, 1e4}, "micrometres": {wavelength, 1e4}, "\u00b5m": {wavelength, 1e4}, "\u03bcm": {wavelength, 1e4},
	"hz": {frequency, 1}, "khz": {frequency, 1e3}, "mhz": {frequency, 1e6}, "ghz": {frequency, 1e9}, "thz": {frequency, 1e12},
	"ev": {energy, 1}, "kev": {energy, 1e3},
	"cm-1": {wavenumber, 1}, "cm**-1": {wavenumber, 1}, "cm**(-1)": {wavenumber, 1}, "1/cm": {wavenumber, 1}, "cm^-1": {wavenumber, 1},
}

var metres = map[string]float64{"m": 1e10, "cm": 1e8, "mm": 1e7, "meter": 1e10, "meters": 1e10, "metre": 1e10, "metres": 1e10}

// parseWaveUnit reads the unit of a spectral axis.
func parseWaveUnit(s string) (waveUnit, bool) {
	word := strings.ReplaceAll(strings.TrimSpace(s), " ", "")
	if f, ok := metres[word]; ok {
		return waveUnit{wavelength, f}, true
	}
	u, ok := waveUnits[strings.ToLower(word)]
	return u, ok
}

// unitBySize guesses the unit of wavelengths that come without one. ok is false
// where the size leaves more than one.
func unitBySize(first, last float64) (u waveUnit, name string, ok bool) {
	lo, hi := math.Min(first, last), math.Max(first, last)
	if lo >= 900 && hi <= 30000 {
		return waveUnit{wavelength, 1}, "Angstrom", true
	}
	return waveUnit{}, "", false
}
