// Package cog is the curve of growth: exact equivalent widths of Voigt profiles
// and what measured widths say about N and b.
//
// Units: wavelengths vacuum Å, widths Å, N cm⁻² (LogN is log₁₀ N), b km/s (√2 σ).
// Profiles are symmetric in velocity v = c(λ/λ₀ − 1), as everywhere in lacuna.
//
// # Forwards
//
// Width, WidthGrad and WidthOf integrate the profile of one cloud or several, with
// hyperfine and isotopic parts inside the exponent and damping wings to infinity,
// to 1e-11. Curve draws the theoretical curve of growth.
//
// # Backwards
//
// Linear is the weak-line relation, Correction what it misses, Invert the column
// for a given b, DoubletRatio N and b from two exact widths. Fit and FitLevels weigh
// any number of widths, non-detections and limits with their errors.
//
// # What a fit may answer
//
// Each Number of a Result is one of these (see package budget):
//
//	value      closed at 1σ: errors where χ² has risen by 1
//	upper      not detected, N ± σ behind it; or b bounded from above only
//	lower      N that hangs on a bound of b or on the assumed b; b of nearly thin lines
//	interval   two solutions are equally good: from the one to the other
//	none       b that the widths do not constrain
//
// A value is right if one cloud is enough. Many narrow clouds that together mimic a
// wide one hide saturation, and no width shows it (Jenkins 1986, ApJ 304, 739: safe
// while the strongest line has τ₀ below about 2; from memory). N of lines that are all
// saturated carries the flag Saturated for that reason.
package cog
