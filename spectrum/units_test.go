package spectrum

import (
	"math"
	"testing"
)

// The spellings of formats/README §5 and what 5000 Å is in them; h, c and e by
// their exact SI values: 5000 Å = 599.584916 THz = 2.479683969 eV.
func TestWaveUnits(t *testing.T) {
	for unit, x := range map[string]float64{
		"Angstrom": 5000, "angstroms": 5000, "Ang": 5000, "AA": 5000, "A": 5000, "\u00c5": 5000, "\u212b": 5000, "0.1nm": 5000, "0.1 nm": 5000, "10**-10 m": 5000, "1e-10 m": 5000,
		"nm": 500, "Nanometers": 500, "nanometre": 500, "millimicrons": 500, "mum*1e-3": 500,
		"um": 0.5, "micron": 0.5, "micrometers": 0.5, "\u00b5m": 0.5, "\u03bcm": 0.5,
		"m": 5e-7, "cm": 5e-5, "mm": 5e-4, "Hz": 5.99584916e14, "GHz": 599584.916, "eV": 2.479683969, "keV": 2.479683969e-3, "cm-1": 20000,
	} {
		u, ok := parseWaveUnit(unit)
		if got := u.angstrom(x); !ok || !(math.Abs(got-5000) < 1e-5) {
			t.Errorf("%g %s = %.8g Å, %v; want 5000", x, unit, got, ok)
		}
	}
	for _, bad := range []string{"M", "MM", "furlong", "", "s", "km"} {
		if u, ok := parseWaveUnit(bad); ok {
			t.Errorf("%q was taken for %v", bad, u)
		}
	}
}

func TestColumnName(t *testing.T) {
	for in, want := range map[string][2]string{
		"wave_nm": {"WAVE", "nm"}, "Wavelength (nm)": {"WAVELENGTH", "nm"}, "lambda [A]": {"LAMBDA", "A"}, "flux_err": {"FLUXERR", ""}, "Normalised flux": {"NORMALISEDFLUX", ""},
		" WAVE ": {"WAVE", ""}, "e.flux": {"EFLUX", ""}, "wave-air": {"WAVEAIR", ""},
	} {
		if name, unit := columnName(in); name != want[0] || unit != want[1] {
			t.Errorf("%q: %q, %q; want %q", in, name, unit, want)
		}
	}
}

// The spellings of formats/README §5, as FITS Standard 4.0, 4.3 writes them.
func TestStandardUnit(t *testing.T) {
	const flam = "erg s-1 cm-2 Angstrom-1"
	for text, want := range map[string]string{
		"erg/s/cm**2/Angstrom": flam, "erg cm-2 s-1 Angstrom-1": "erg cm-2 s-1 Angstrom-1", "erg.cm**(-2).s**(-1).angstrom**(-1)": "erg cm-2 s-1 Angstrom-1",
		"erg /s /cm**2 /angstrom": flam, "ERG/CM2/S/A": "erg cm-2 s-1 Angstrom-1", "1E-17 erg/cm^2/s/Ang": "10**-17 erg cm-2 s-1 Angstrom-1",
		"10**(-16)erg/cm2/s/A": "10**-16 erg cm-2 s-1 Angstrom-1", "10**(-16)erg.cm**(-2).s**(-1).angstrom**(-1)": "10**-16 erg cm-2 s-1 Angstrom-1",
		"W/m2/um": "W m-2 um-1", "mW/m2/nm": "mW m-2 nm-1", "Jy": "Jy", "adu": "adu", "ADU": "adu", "DN": "adu", "Counts/s": "count s-1", "electron": "electron", "": "", "1": "",
		// What is not known stays.
		"FN": "FN", "e-": "e-", "M": "M", "furlong/s": "furlong/s", "cm**": "cm**", "cm**(2": "cm**(2", "3 erg": "3 erg", "erg s-99": "erg s-99", "10**x erg": "10**x erg",
	} {
		if got := standardUnit(text); got != want {
			t.Errorf("%q: %q, want %q", text, got, want)
		}
	}
}
