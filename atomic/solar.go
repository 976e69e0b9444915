package atomic

import (
	"fmt"
	"math"
	"strings"
	"sync"

	"lacuna/internal/oops"
)

// A Scale is one set of solar reference abundances.
type Scale struct {
	Key      string // "asplund2021"
	Name     string // "Asplund et al. 2021"
	Citation string
}

// A SolarRow is the abundance of one element on one scale.
type SolarRow struct {
	Scale   string
	Element string
	LogEps  float64 // 12 + log₁₀ N(X)/N(H)
	Err     float64 // 1σ, dex; NaN where the source gives none
	Kind    string  // photosphere, CI, mean, indirect, recommended
	Source  string  // key of Cite
	Status  Status
	Note    string
}

var scales = sync.OnceValue(func() []Scale {
	var out []Scale
	for _, r := range embedded("scales.csv", "scale name").rows {
		s, ok := Cite(r.get("scale"))
		if !ok {
			panic("atomic: scales.csv: no source " + r.get("scale"))
		}
		out = append(out, Scale{r.get("scale"), r.get("name"), s.Citation})
	}
	return out
})

var solar = sync.OnceValue(func() map[string][]SolarRow {
	out := map[string][]SolarRow{}
	for _, r := range embedded("solar.csv", "scale element log_eps err kind src status note").rows {
		mustSource(r, "src", "status")
		if _, ok := Element(r.get("element")); !ok {
			panic("atomic: solar.csv: unknown element " + r.get("element"))
		}
		key := r.get("scale") + " " + r.get("element")
		out[key] = append(out[key], SolarRow{r.get("scale"), r.get("element"), must(r.num("log_eps", -3, 12)), must(r.num("err", 0, 1)),
			r.get("kind"), r.get("src"), Status(r.get("status")), r.get("note")})
	}
	return out
})

// SolarScales returns the scales in the order of scales.csv.
func SolarScales() []Scale { return append([]Scale(nil), scales()...) }

// SolarRows returns every row of an element on a scale (photosphere and CI
// meteorites where a scale has both).
func SolarRows(scale, element string) ([]SolarRow, error) {
	var keys []string
	known := false
	for _, s := range scales() {
		keys = append(keys, s.Key)
		known = known || s.Key == scale
	}
	if !known {
		return nil, oops.Inputf("", "", "the scales are "+strings.Join(keys, ", ")+nearestHint(scale, keys), "no solar scale %q", scale)
	}
	rows := solar()[scale+" "+element]
	if len(rows) == 0 {
		if _, ok := Element(element); !ok {
			return nil, oops.Inputf("", "", `write the symbol of an element, such as "Fe"`, "no element %q", element)
		}
		return nil, oops.Inputf("", "", "choose another scale", "the scale %s has no %s", scale, element)
	}
	return append([]SolarRow(nil), rows...), nil
}

// Solar returns the reference abundance of an element on a scale. Where the scale
// has a photospheric and a meteoritic (CI) value, the photosphere is taken if its
// error is below that of CI + 0.02 dex, else CI; never CI for H, C, N, O and the
// noble gases, which meteorites have lost; never the photosphere for Li, which
// the Sun has burnt. Kind says which it is.
func Solar(scale, element string) (SolarRow, error) {
	rows, err := SolarRows(scale, element)
	if err != nil {
		return SolarRow{}, err
	}
	var phot, ci *SolarRow
	for i := range rows {
		switch rows[i].Kind {
		case "photosphere":
			phot = &rows[i]
		case "CI":
			ci = &rows[i]
		default:
			return rows[i], nil
		}
	}
	volatile := strings.Contains(" H C N O He Ne Ar Kr Xe ", " "+element+" ")
	switch {
	case ci == nil && phot != nil && element == "Li":
		return SolarRow{}, oops.Input("", "", fmt.Sprintf("the scale %s has only photospheric Li, which the Sun has burnt", scale), "choose another scale")
	case ci == nil:
		return *phot, nil
	case phot == nil:
		return *ci, nil
	case volatile:
		return *phot, nil
	case element == "Li":
		return *ci, nil
	}
	// errors are printed to 0.01 dex or finer; 1e-9 keeps equal sums equal
	if phot.Err < ci.Err+0.02-1e-9 || math.IsNaN(ci.Err) {
		return *phot, nil
	}
	return *ci, nil
}
