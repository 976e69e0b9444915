package abundance

import (
	"fmt"
	"slices"
	"strings"

	"lacuna/budget"
	"lacuna/internal/oops"
)

// An Override is the user's own choice of a column: of a method (and, where it
// gives several, a line), or of a number. The reason is required and shown.
type Override struct {
	Method, Line string
	LogN         *budget.Number // takes the place of Method and Line
	Reason       string
}

// override replaces what the rule gave by what the user wants.
func override(rule Column, cols []Column, o Override) (Column, error) {
	where := "adopt " + rule.Species
	if strings.TrimSpace(o.Reason) == "" {
		return Column{}, oops.Input("", where, "a column chosen by hand without a reason", "add the reason: tables show it")
	}
	was := fmt.Sprintf("; the rule gives %s: %s", show(rule.LogN), rule.Rule)
	out := Column{Species: rule.Species, Element: rule.Element}
	if o.LogN != nil {
		out.Method, out.LogN = MethodGiven, o.LogN.With(budget.Overridden)
		out.Rule = fmt.Sprintf("user's number, %s (%s)", show(out.LogN), o.Reason) + was
		return out, nil
	}
	var of []Column
	var have []string
	for _, c := range cols {
		if c.Method == o.Method && (o.Line == "" || c.Line == o.Line) {
			of = append(of, c)
		}
		if !slices.Contains(have, c.Method) {
			have = append(have, c.Method)
		}
	}
	if len(of) == 0 {
		fix := "the methods that have one: " + strings.Join(have, ", ")
		if len(have) == 0 {
			fix = "no method has one; give logN with logN_err"
		}
		return Column{}, oops.Inputf("", where, fix, "no column of %s by %s", rule.Species, named(Column{Method: o.Method, Line: o.Line}))
	}
	choice := byRule(of) // several lines by one method: as the rule would
	out.Method, out.Line, out.LogN = choice.Method, choice.Line, choice.LogN.With(budget.Overridden)
	out.Rule = fmt.Sprintf("user's choice, %s, %s (%s)", o.Method, show(out.LogN), o.Reason) + was
	return out, nil
}
