package atomic

import (
	"sync"
)

// An Elem is one chemical element, or an isotope that has lines of its own.
type Elem struct {
	Symbol string
	Name   string
	Z      int
	Mass   float64 // standard atomic mass, u
}

var elements = sync.OnceValue(func() map[string]Elem {
	t := embedded("elements.csv", "symbol name Z mass_u src status")
	out := map[string]Elem{}
	for _, r := range t.rows {
		z, m := must(r.num("Z", 1, 120)), must(r.num("mass_u", 1, 300))
		if _, twice := out[r.get("symbol")]; twice {
			panic("atomic: elements.csv: " + r.get("symbol") + " twice")
		}
		mustSource(r, "src", "status")
		out[r.get("symbol")] = Elem{r.get("symbol"), r.get("name"), int(z), m}
	}
	return out
})

// Element returns the element of a symbol ("Ca", "D"). Masses: IUPAC 2021
// standard atomic weights, from memory.
func Element(symbol string) (Elem, bool) {
	if symbol == "" || symbol[0] < 'A' || symbol[0] > 'Z' {
		return Elem{}, false // isotopes are no elements
	}
	return lookElement(symbol)
}

// lookElement knows isotopes too ("6Li", "13C"); a mass number that has no row
// of its own is refused.
func lookElement(symbol string) (Elem, bool) {
	e, ok := elements()[symbol]
	return e, ok
}
