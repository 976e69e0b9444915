// Package simulate makes spectra from a known truth: clouds in front of a star,
// seen through the air and an instrument. It is the forward model of the
// demonstration and of the tests that ask whether errors hold.
//
// The light of the star (continuum and stellar lines) times the interstellar
// transmission times the air's is convolved with the instrument's line spread
// function and integrated over each pixel; then come the blaze, photon and
// read-out noise, correlated as after rebinning, and cosmic rays.
package simulate
