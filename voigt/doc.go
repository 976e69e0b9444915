// Package voigt computes the shape of one absorption line: the Faddeeva
// function w(z), the Voigt function H(a, u), and the optical depth of one cloud
// in one transition with its hyperfine and isotopic parts.
//
// Units in this package and every row above it:
//
//	wavelength  Å, vacuum        column density N  cm⁻² (LogN is log₁₀ N)
//	velocity    km/s, + recedes  Doppler b         km/s (b = √2 σ)
//	damping γ   s⁻¹              optical depth     dimensionless
//
// Functions of numbers return NaN outside their domain. A slice of the wrong
// length is the caller's bug and panics. Nothing here reads files or keeps
// state, and nothing allocates.
//
// Equations of the DLMF (https://dlmf.nist.gov) outside its section 7.19 are
// numbered from memory; the tests check each against long arithmetic.
package voigt

//go:generate go run ./internal/gentable -o nodes.go
