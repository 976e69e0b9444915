// Package atomic is the data of physics: transitions, their structure, solar
// abundances, elements and constants, each row with its source.
package atomic
