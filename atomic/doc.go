// Package atomic is the data of physics: transitions, their structure, solar
// abundances, elements and constants, each row with its source.
//
// # Names
//
// A line is called by its species and rest wavelength: in air above 3000 Å ("Na I
// 5889.95"), in vacuum below, as spectra from space are ("Zn II 2026.14"). Line
// has both wavelengths. An excited fine-structure level is marked by stars ("C I*
// 1656.27"); a molecule's level stands in Level, and Carrier names the population
// that a line counts ("CN N=1", "CH e"). The common isotope carries no number: "Li
// I" is ⁷Li beside "6Li I", "CN" beside "13CN".
//
// The f-values of CH B-X and C-X and of OH are per Λ-doublet level: N(CH) = N(CH
// e) + N(CH f). CH 4300.31 blends both levels and gives the total. CN rows from
// N ≥ 1 sum the fine structure and count all of level N.
//
// # Errors of f
//
// The 1σ error that the source prints; else that of its grade (NIST letters AAA
// 0.3 %, AA 1 %, A+ 2 %, A 3 %, B+ 7 %, B 10 %, C+ 18 %, C 25 %, D+ 40 %, D 50 %,
// or a percentage); else 10 %. Hydrogen and deuterium are exact.
//
// # Status
//
// Verified: the number was read in a retrieved document. Computed: from verified
// constants. Memory: recalled by the compiler, not seen; check it before a result
// rests on it. User: from the user's own file. Line keeps the status of f and of
// the wavelength apart.
//
// # How to add a line
//
// To the project's table, add a row to lines.csv (any order; Columns names the
// columns):
//
//	species       "Na I", "6Li I", "CH+", "13CN"
//	level         empty, *, **, e, f, N=1, J=2
//	lambda_vac_A  vacuum Å; lambda_air_A is empty at 2000 Å and below
//	f             absorption oscillator strength with the digits printed
//	f_err         1σ as printed, or f_grade: a NIST letter, 10%, exact
//	gamma_s-1     sum of A-values out of the upper level; empty if unknown
//	g_low, g_up   statistical weights
//	e_low_cm-1    energy of the lower level
//	lower, upper  terms; lines of one upper level must obey Ritz's rule
//	alias         other names, parted by ";": "D2", "B-X (0,0) R(0)"
//	structure     a group of structure.csv; or 0.375@-0.62 0.625@+0.37, strength
//	              and offset in km/s
//	missing       structure that is known but not tabulated
//	f_src, wave_src, f_status, wave_status, note
//
// The source keys go into sources.csv; a second f-value of a line goes into
// alternatives.csv under the name of its set, and sets.csv says what a set is.
// The tests refuse a row without source, twice, out of range, with an air
// wavelength that is not the vacuum one, or with strengths that do not sum to 1.
//
// Without touching the project, the same columns make a user's own table:
// Table.WithFile.
package atomic
