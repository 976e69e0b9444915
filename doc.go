// Package lacuna is the root of the module; the program is in cmd/lacuna and the
// libraries are in the packages below (README.md and DEVELOPERS.md say which).
package lacuna
