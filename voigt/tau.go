package voigt

import (
	"math"

	"lacuna/atomic"
)

// Constants of the relation between absorption and column density. The
// integrated cross-section of a line is π rₑ c f; rₑ: CODATA 2022
// (arXiv:2409.03787). Factors 1e-8 turn Å into cm.
const (
	// ColumnPerTau is 1/(π rₑ c) in cm⁻² (km/s)⁻¹ Å: the apparent column density
	// per unit velocity is N_a(v) = ColumnPerTau τ_a(v) / (f λ), λ in Å, v in km/s
	// (Savage & Sembach 1991, ApJ 379, 245, where it is 3.768e14; from memory).
	ColumnPerTau = 1 / (math.Pi * atomic.ElectronRadius * atomic.C * 1e-8)

	// ColumnPerWidth is 1/(π rₑ) in cm⁻² Å: a thin line of equivalent width W has
	// N = ColumnPerWidth W / (f λ²), W and λ in Å (1.130e20; the limit of small τ of
	// W = ∫ (1 − exp(−τ)) dλ).
	ColumnPerWidth = 1 / (math.Pi * atomic.ElectronRadius * 1e-8)

	// √π rₑ c in cm² (km/s) Å⁻¹.
	tau0Unit = sqrtPi * atomic.ElectronRadius * atomic.C * 1e-8
)

// Tau0 returns the optical depth at the centre of an undamped line,
//
//	τ₀ = √π rₑ c f λ N / b,
//
// for column density n (cm⁻²), oscillator strength f, vacuum wavelength wave (Å)
// and Doppler parameter b (km/s). It returns NaN unless b > 0.
//
// Accuracy: rounding only, if undamped; damping multiplies τ₀ by
// H(a, 0) ≈ 1 − 2a/√π. Stimulated emission is neglected, so it is wrong for
// hν ≲ kT (radio lines).
//
// Source: Spitzer 1978, Physical Processes in the Interstellar Medium, ch. 3 (from
// memory); rₑ: CODATA 2022, arXiv:2409.03787.
func Tau0(n, f, wave, b float64) float64 {
	if !(b > 0) {
		return math.NaN()
	}
	return tau0Unit * f * wave * n / b
}

// Damping returns the damping parameter of the Voigt function,
//
//	a = γ λ / (4π b),
//
// for the total decay rate gamma (s⁻¹) of both levels, vacuum wavelength wave (Å)
// and Doppler parameter b (km/s). It returns NaN unless b > 0. Broadening by
// collisions, negligible in interstellar gas, is left out.
//
// Source: DLMF 7.19 for H(a, u); the Lorentz half width γ/4π in frequency, in
// units of the Doppler width b/λ.
func Damping(gamma, wave, b float64) float64 {
	if !(b > 0) {
		return math.NaN()
	}
	return 1e-13 * gamma * wave / (4 * math.Pi * b) // 1e-13: Å/(km/s) → s
}

// A Cloud is one velocity component of one species: gas with a Gaussian spread
// of velocities.
type Cloud struct {
	V    float64 // km/s, in the frame of the wavelengths
	B    float64 // Doppler parameter, km/s
	LogN float64 // log₁₀ of the column density in the line's lower level, cm⁻²
}

// N returns the column density of c in cm⁻².
func (c Cloud) N() float64 { return math.Pow(10, c.LogN) }
