// Package lsf turns the instrument into one banded matrix: the line spread
// function and the pixel box together take the transmission on a fine sub-grid to
// the recorded flux of each pixel.
//
// Wavelengths and widths are vacuum Å, Doppler parameters km/s. Transmission
// means what falls on the instrument over the continuum, exp(−τ) times anything
// narrow of star or air; the optical depth itself is never convolved.
package lsf
