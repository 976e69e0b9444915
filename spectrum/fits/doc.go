// Package fits is the one door for FITS files, in and out.
//
// The library that decodes the numbers (fitsio) trusts headers: it panics on
// some, runs out of memory on others, and reads a few wrongly. So it never sees
// a card of a file. A scanner of our own lists the header and data units,
// checks every size against the bytes that are there, and hands over only a
// header written here and the bytes of the one image line or table cell that is
// wanted. Scaling, null values, unsigned integers and logical values are applied
// here, because the library does not.
//
// Tile-compressed images are images here like any other: only the tiles of the
// line that is wanted are unpacked.
//
// Every error names the file, the HDU (counted from 0, with its EXTNAME) and the
// keyword, and says what was found and what to do. Numbers come out as float64:
// 64-bit integers beyond 2⁵³ lose their last digits.
//
// Source of the rules: FITS Standard 4.0 (IAU FITS Working Group 2018) and the
// registered conventions HIERARCH and CONTINUE.
package fits
