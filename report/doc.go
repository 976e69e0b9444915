// Package report shows results: terminal text, tables, JSON and figures, all
// made from the journal's records and nothing else, so that they can be made
// again at any time. It computes no physics but the theoretical curves of the
// growth figure, which come from package cog.
//
// Units are those of the trade where people read: widths in mÅ, velocities in
// km/s in the frame named beside them, column densities as log₁₀ of cm⁻².
//
// Figures are vector drawings 88 mm (one column) or 180 mm (two columns) wide,
// with no text below 7 pt but sub- and superscripts, and no colour that carries
// meaning alone: line styles and shapes tell the same. The same record gives the
// same bytes.
package report
