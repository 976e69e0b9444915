package atomic

import (
	"fmt"
	"slices"
	"strings"
	"sync"

	"lacuna/internal/oops"
)

// A set is a named choice of f-values: one or more lists of alternatives.
type set struct {
	name    string
	members []string
	text    string
}

var sets = sync.OnceValue(func() []set {
	var out []set
	for _, r := range embedded("sets.csv", "set members description").rows {
		out = append(out, set{r.get("set"), strings.Fields(r.get("members")), r.get("description")})
	}
	return out
})

// An alternative is a second f-value of a line.
type alternative struct {
	set     string
	line    int // of Default
	f, fErr float64
	source  string
	status  Status
	note    string
}

var alternatives = sync.OnceValue(func() []alternative {
	t := Default()
	var out []alternative
	for _, r := range embedded("alternatives.csv", "set species level lambda_vac_A f f_err f_grade f_src f_status note").rows {
		mustSource(r, "f_src", "f_status")
		w, f := must(r.num("lambda_vac_A", 1, 1e7)), must(r.num("f", 1e-12, 10))
		a := alternative{set: r.get("set"), f: f, fErr: must(fErr(r, f)), source: r.get("f_src"), status: Status(r.get("f_status")), note: r.get("note"), line: -1}
		for i, l := range t.lines {
			if l.Species == r.get("species") && l.Level == r.get("level") && l.Wave == w {
				a.line = i
			}
		}
		if a.line < 0 {
			panic("atomic: " + r.bad("lambda_vac_A", "no such line in lines.csv", "").Error())
		}
		out = append(out, a)
	}
	return out
})

// Sets returns the names of the sets of f-values, "default" first; Describe says
// what each holds.
func (t *Table) Sets() []string {
	out := []string{"default"}
	for _, s := range sets() {
		out = append(out, s.name)
	}
	return out
}

// Describe says in a line what a set of f-values holds.
func (t *Table) Describe(name string) (string, error) {
	s, err := findSet(name)
	return s.text, err
}

func findSet(name string) (set, error) {
	if strings.EqualFold(name, "default") || name == "" {
		return set{name: "default", text: "Morton 2003 for atoms, the customary interstellar values for molecules; NIST where they agree within 0.8 %"}, nil
	}
	var names []string
	for _, s := range sets() {
		if strings.EqualFold(s.name, strings.TrimSpace(name)) {
			return s, nil
		}
		names = append(names, s.name)
	}
	return set{}, oops.Inputf("", "", "the sets are default, "+strings.Join(names, ", ")+nearestHint(name, names), "no set of f-values %q", name)
}

// WithSet returns the table with the f of every line that the set holds in place
// of the default; the others keep theirs, and Line.FSet tells which is which. A
// set is taken whole, so that f-values of one paper are not mixed by hand. Lines
// from a user's own file keep their f.
func (t *Table) WithSet(name string) (*Table, error) {
	s, err := findSet(name)
	if err != nil {
		return nil, err
	}
	pick := map[string]alternative{} // by the default line's name
	for _, m := range s.members {
		for _, a := range alternatives() {
			n := Default().lines[a.line].Name
			if _, have := pick[n]; a.set == m && !have {
				pick[n] = a
			}
		}
	}
	lines := slices.Clone(t.lines)
	for i := range lines {
		l := &lines[i]
		if l.File != "" {
			continue
		}
		d, ok := Default().keys[l.Name]
		if !ok {
			panic(fmt.Sprintf("atomic: WithSet: %s is not a line of the default table", l.Name))
		}
		*l = Default().lines[d]
		if a, ok := pick[l.Name]; ok {
			l.F, l.FErr, l.FSet, l.FSource, l.FStatus = a.f, a.fErr, a.set, a.source, a.status
			l.Note = strings.Trim(a.note+"; default f "+fmt.Sprintf("%.4g", Default().lines[d].F), "; ")
		}
	}
	return newTable(lines, s.name), nil
}

// Set returns the name of the table's set of f-values.
func (t *Table) Set() string { return t.set }
