package frame

import "math"

// A Formula is a dispersion formula of standard air: dry, 15 °C, 101325 Pa,
// 0.045 % CO₂ (Edlén: 0.03 %). They differ by less than 10 m/s above 2300 Å.
type Formula int

// The formulas, with n − 1 for σ² in µm⁻² (σ = 10⁴/λ_vac).
const (
	// Ciddor1996 is 0.05792105/(238.0185−σ²) + 0.00167917/(57.362−σ²):
	// Ciddor 1996, Appl. Opt. 35, 1566. The default.
	Ciddor1996 Formula = iota
	// Edlen1966 is 1e-8 [8342.13 + 2406030/(130−σ²) + 15997/(38.9−σ²)]:
	// Edlén 1966, Metrologia 2, 71.
	Edlen1966
	// Edlen1953 is 6.4328e-5 + 2.94981e-2/(146−σ²) + 2.5540e-4/(41−σ²):
	// Edlén 1953, JOSA 43, 339; the IAU formula that Morton 1991 uses.
	Edlen1953
	// Morton2000 is 8.34254e-5 + 2.406147e-2/(130−σ²) + 1.5998e-4/(38.9−σ²):
	// Morton 2000, ApJS 130, 403, after Birch & Downs 1994.
	Morton2000
)

var formulaNames = [...]string{"Ciddor 1996", "Edlén 1966", "Edlén 1953", "Morton 2000"}

// String returns author and year.
func (f Formula) String() string {
	if f < 0 || int(f) >= len(formulaNames) {
		return "unknown formula"
	}
	return formulaNames[f]
}

// MinAir is the shortest air wavelength (Å) that is converted: below it, that
// is below 2000 Å in vacuum, wavelengths are given in vacuum by convention.
const MinAir = 1999.35

// index returns n − 1 at a vacuum wavelength in Å.
func (f Formula) index(vac float64) float64 {
	s := 1e4 / vac
	s *= s
	switch f {
	case Ciddor1996:
		return 0.05792105/(238.0185-s) + 0.00167917/(57.362-s)
	case Edlen1966:
		return 1e-8 * (8342.13 + 2406030/(130-s) + 15997/(38.9-s))
	case Edlen1953:
		return 6.4328e-5 + 2.94981e-2/(146-s) + 2.5540e-4/(41-s)
	case Morton2000:
		return 8.34254e-5 + 2.406147e-2/(130-s) + 1.5998e-4/(38.9-s)
	}
	return math.NaN()
}

// ToAir returns the wavelength in standard air, λ_vac/n(λ_vac), of a vacuum
// wavelength, both in Å. It returns NaN where the result would lie below
// MinAir, and beyond 2.4 µm the formula is an extrapolation.
func ToAir(vac float64, f Formula) float64 {
	if !(vac >= MinAir) || math.IsInf(vac, 1) {
		return math.NaN()
	}
	air := vac / (1 + f.index(vac))
	// A vacuum wavelength that ToVacuum made of MinAir itself must come back.
	if !(air >= MinAir*(1-1e-15)) {
		return math.NaN()
	}
	return air
}

// ToVacuum returns the vacuum wavelength of a wavelength in standard air, both
// in Å: the solution of λ_vac = λ_air n(λ_vac), found by iteration. It returns
// NaN below MinAir. ToAir(ToVacuum(λ)) repeats λ to better than 1e-9 Å.
func ToVacuum(air float64, f Formula) float64 {
	if !(air >= MinAir) || math.IsInf(air, 1) {
		return math.NaN()
	}
	vac := air * 1.00028
	for range 20 {
		next := air * (1 + f.index(vac))
		step := math.Abs(next - vac)
		vac = next
		if step < 1e-10 {
			break
		}
	}
	return vac
}
