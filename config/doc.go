// Package config reads what a user wrote: a survey or a growth-curve batch in
// TOML, and the catalogue beside it. It refuses what it does not understand and
// writes out every default, so that the rest of the program never asks again.
//
// Velocities are km/s, wavelengths Å, column densities log₁₀ cm⁻², widths mÅ in
// files. Every mistake names the file, the key's path, what is wrong and how to
// mend it; all mistakes of a file are reported at once.
package config
