package atomic

import (
	"fmt"
	"strings"
	"sync"
)

// A RuleKind says what a species tells of the depletion of its element in H I
// gas.
type RuleKind string

// The kinds of rule.
const (
	Direct RuleKind = "direct" // holds nearly all of its element
	Sum    RuleKind = "sum"    // one of several stages that must be added
	Partly RuleKind = "partly" // dominant only where n_e is high enough
	Trace  RuleKind = "trace"  // a trace: no depletion without an ionization correction
	Never  RuleKind = "never"  // never a depletion
	NoRule RuleKind = "none"   // the table has no rule for it
)

// A Rule is the answer of Dominance.
type Rule struct {
	Kind    RuleKind
	Reason  string
	Warning string // what to check ("also arises in H II gas …"), or ""
	Source  string // key of Cite
	Status  Status
}

var rules = sync.OnceValue(func() map[string]Rule {
	out := map[string]Rule{}
	for _, r := range embedded("dominance.csv", "species rule reason warning src status").rows {
		mustSource(r, "src", "status")
		k := RuleKind(r.get("rule"))
		switch k {
		case Direct, Sum, Partly, Trace, Never:
		default:
			panic("atomic: dominance.csv: unknown rule " + string(k))
		}
		if _, twice := out[r.get("species")]; twice {
			panic("atomic: dominance.csv: " + r.get("species") + " twice")
		}
		out[r.get("species")] = Rule{k, r.get("reason"), r.get("warning"), r.get("src"), Status(r.get("status"))}
	}
	return out
})

// Dominance returns the rule for a species ("Fe II"; a level such as "C I*" goes
// by its species): whether its column gives the depletion of the element in H I
// gas, and why. A species without a rule gets NoRule: nothing is guessed.
func Dominance(species string) Rule {
	s := strings.TrimRight(strings.Join(strings.Fields(species), " "), "*")
	if r, ok := rules()[s]; ok {
		return r
	}
	if f := strings.Fields(s); len(f) == 2 {
		if r, ok := rules()[f[0]]; ok { // "CH e", "CN N=1"
			return r
		}
	}
	if _, atoms, ok := formula(s); ok && atoms > 1 {
		return Rule{Kind: Never, Reason: "a molecule holds an unknown, small part of its elements: never a depletion", Source: "Savage-Sembach-rules", Status: Memory}
	}
	return Rule{Kind: NoRule, Reason: fmt.Sprintf("no rule says whether %s holds its element in H I gas", s)}
}
