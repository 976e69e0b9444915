package frame

import (
	"fmt"
	"strings"

	"lacuna/internal/oops"
)

// kindWords are the spellings that ParseKind takes, the standard one first.
var kindWords = []struct {
	kind  Kind
	words []string
}{
	{Topocentric, []string{"TOPOCENT", "topocentric", "topocenter", "observer", "observed"}},
	{Geocentric, []string{"GEOCENTR", "geocentric", "geocenter"}},
	{Heliocent, []string{"HELIOCEN", "heliocentric", "heliocenter", "helio"}},
	{Barycentric, []string{"BARYCENT", "barycentric", "barycenter", "bary"}},
	{LSRK, []string{"LSRK", "LSR"}},
	{LSRD, []string{"LSRD"}},
	{Source, []string{"SOURCE", "star", "rest"}},
}

// ParseKind reads a velocity frame from the codes of FITS (SPECSYS) or a plain
// word ("heliocentric"), in any case. The error is the user's to mend and names
// the nearest words.
func ParseKind(s string) (Kind, error) {
	word := strings.TrimSpace(s)
	var all []string
	for _, k := range kindWords {
		for _, w := range k.words {
			if strings.EqualFold(w, word) {
				return k.kind, nil
			}
			all = append(all, w)
		}
	}
	return Unknown, oops.Input("", "", fmt.Sprintf("%q is not a velocity frame", s),
		hint(word, all, "write TOPOCENT, GEOCENTR, HELIOCEN, BARYCENT, LSRK, LSRD or SOURCE"))
}

// ParseMedium reads "air" or "vacuum" ("vac"), in any case.
func ParseMedium(s string) (Medium, error) {
	switch word := strings.ToLower(strings.TrimSpace(s)); word {
	case "air":
		return Air, nil
	case "vacuum", "vac":
		return Vacuum, nil
	default:
		return UnknownMedium, oops.Input("", "", fmt.Sprintf("%q is not a medium of wavelengths", s),
			hint(word, []string{"air", "vacuum"}, "write air or vacuum"))
	}
}

// ParseFormula reads a formula by author and year: "Ciddor 1996",
// "edlen1953", "morton-2000".
func ParseFormula(s string) (Formula, error) {
	word := plain(s)
	var all []string
	for i, name := range formulaNames {
		if plain(name) == word || plain(name)[:len(plain(name))-4] == word && i != int(Edlen1966) && i != int(Edlen1953) {
			return Formula(i), nil
		}
		all = append(all, name)
	}
	return Ciddor1996, oops.Input("", "", fmt.Sprintf("%q is not an air formula", s),
		hint(s, all, "write "+strings.Join(all, ", ")))
}

// plain drops case, accents and separators.
func plain(s string) string {
	return strings.NewReplacer(" ", "", "-", "", "_", "", "é", "e").Replace(strings.ToLower(strings.TrimSpace(s)))
}

func hint(word string, all []string, otherwise string) string {
	if near := oops.Nearest(word, all, 2); word != "" && len(near) > 0 {
		return "did you mean " + strings.Join(near, " or ") + "? (" + otherwise + ")"
	}
	return otherwise
}
