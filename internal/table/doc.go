// Package table is one table of results or of a user's inputs, in any format.
//
// A cell is the text that stands in the file: numbers are rounded once, by the
// rules of Round, when a table is made, and every format then shows the same
// digits. A cell may be missing (not measured), which is neither zero, nor NaN,
// nor the empty string.
//
// Readers are strict: fields that do not fit the header, duplicated names and
// cells that are not of their column's type are errors that name file, line and
// column. Writers give the same bytes for the same table.
package table
