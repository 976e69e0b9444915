package spectrum

import "lacuna/spectrum/frame"

// Options are the user's word on a file: what is set here wins over what the
// file says, and is recorded as the user's. The zero value leaves all to the file.
type Options struct {
	HDU    string // index from 0 or EXTNAME of the HDU to read; "" the first that is a spectrum
	Row    int    // 1-based row of a table or line of an image; 0 all
	Layout string // law of an image axis: "linear", "log10" or "ln"; "orders" for a table that lists orders one after another; "" by the file

	// Columns of a table by name or 1-based number; of a two-row image and of
	// text without names by number. "none" drops the column.
	WaveCol, FluxCol, ErrCol, MaskCol, ContinuumCol string
	WaveUnit                                        string // "Angstrom", "nm", …

	Medium     frame.Medium
	Frame      frame.Kind
	Correction *float64 // km/s from the observer to the Sun or barycentre, λ_new = λ (1 + V/c)
	// CorrectionTo is the frame that Correction leads to: HELIOCEN, unless said.
	CorrectionTo frame.Kind

	Resolution float64 // λ/FWHM; 0 by the header
	Normalised bool    // the continuum of the spectrum is 1
	Coord      *Coord  // direction of the star

	// NoSum leaves Source.SHA256 empty: the checksum is the one thing that needs
	// every byte of a file, of which otherwise only what is asked for is read.
	NoSum bool
}
