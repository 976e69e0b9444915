// Package telluric lists absorption lines of the Earth's atmosphere, in the frame
// of the observatory: molecular oxygen (A, B and γ bands), water near Na I D, Hα
// and in the near infrared, and ranges of broad absorption.
//
// Wavelengths are Å, vacuum (Wave) and air (WaveAir, which is what was measured).
// The lists warn where a spectrum is not clean; depth is a class only, since it
// goes with airmass, humidity and resolution. Nothing here corrects a spectrum.
//
// To add a water line, add a row to water.csv with its error, source and status;
// the tests refuse a row without them, and measure rows of status computed again
// on the spectra that their note names.
package telluric
