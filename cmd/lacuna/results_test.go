package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"lacuna/budget"
	"lacuna/internal/check"
	"lacuna/internal/table"
	"lacuna/report"
	"lacuna/spectrum/frame"
	"lacuna/survey"
)

// resultTables are the tables of a results folder, without rows.
func resultTables() map[string]*table.Table {
	rs := []survey.Record{{Status: "done", Result: survey.Result{Frame: frame.Heliocent}}}
	return map[string]*table.Table{
		"widths": report.Widths(rs), "columns": report.Columns(rs), "growth": report.Growth(rs), "clouds": report.Clouds(rs), "depletions": report.Depletions(rs),
	}
}

// flagMeaning and causeMeaning explain what the code has words for.
var flagMeaning = map[string]string{
	"upper":             "an upper limit",
	"lower":             "a lower limit",
	"saturated":         "rests on saturated lines, or on the weakest of lines that hide saturation",
	"blended":           "another transition or a diffuse band may absorb in the window",
	"in telluric":       "a line of the air falls into the window",
	"in stellar line":   "a line of the star may fall into the window; its velocity is not known",
	"trace":             "an ion that holds little of its element",
	"marginal":          "between 2σ and the threshold of detection",
	"at bound":          "the fit ended at a bound that was set for it",
	"filled":            "part of the line lies in masked pixels, which were filled in",
	"structure missing": "fine or hyperfine structure is known but not in the table; matters where b is below 2 km/s",
	"interval":          "between two ends, none of them likelier",
	"overridden":        "the user's choice in place of the rule's",
}

var causeMeaning = map[string]string{
	"photon":        "noise of the pixels, as measured, with its correlation; also the error of a column that was given",
	"continuum":     "coefficients of the fitted continuum, or the stated error of a given one",
	"placement":     "choice of the continuum: degree and windows",
	"zero level":    "where zero flux lies",
	"fill":          "masked pixels that were filled in",
	"profile":       "width of the instrument's profile; b where it is assumed",
	"structure":     "how the gas is spread within the line: what one cloud could hide",
	"telluric":      "correction for lines of the air",
	"f-value":       "oscillator strength",
	"disagreement":  "columns that lie more than 2σ apart",
	"excitation":    "levels that were not seen",
	"ionization":    "stages of ionization that were not seen",
	"hydrogen":      "N(H)",
	"solar":         "solar abundance",
	"velocity zero": "zero point of the wavelengths",
}

// docs/results.md lists every column of every table, every flag and every cause,
// as the code has them. go test ./cmd/lacuna -run ResultsPage -update writes them.
func TestResultsPage(t *testing.T) {
	page := filepath.Join(check.Root(t), "docs", "results.md")
	text := read(t, page)
	want := text
	put := func(mark string, rows []string) {
		t.Helper()
		head, rest, ok1 := strings.Cut(want, "<!-- "+mark+" -->\n")
		_, tail, ok2 := strings.Cut(rest, "<!-- end -->")
		if !ok1 || !ok2 {
			t.Fatalf("no <!-- %s --> … <!-- end --> in %s", mark, page)
		}
		want = head + "<!-- " + mark + " -->\n" + strings.Join(rows, "\n") + "\n<!-- end -->" + tail
	}
	tables := resultTables()
	for name, tab := range tables {
		rows := []string{"| column | unit | meaning |", "|---|---|---|"}
		for _, c := range tab.Cols {
			unit := c.Unit
			if unit == "" && c.Type != table.Real {
				unit = map[table.Type]string{table.Text: "text", table.Integer: "integer", table.Logical: "True or False"}[c.Type]
			}
			if c.Description == "" {
				t.Errorf("%s: column %s has no description", name, c.Name)
			}
			rows = append(rows, fmt.Sprintf("| `%s` | %s | %s |", c.Name, unit, c.Description))
		}
		put("columns: "+name, rows)
	}
	rows := []string{"| flag | meaning |", "|---|---|"}
	for i := range 32 {
		word := budget.Flag(1 << i).Words()[0]
		if strings.HasPrefix(word, "bit ") {
			break
		}
		if flagMeaning[word] == "" {
			t.Errorf("the flag %q is not explained", word)
		}
		rows = append(rows, fmt.Sprintf("| %s | %s |", word, flagMeaning[word]))
	}
	put("flags", rows)
	rows = []string{"| cause | meaning |", "|---|---|"}
	for _, c := range budget.Causes() {
		if causeMeaning[c.String()] == "" {
			t.Errorf("the cause %q is not explained", c)
		}
		rows = append(rows, fmt.Sprintf("| %s | %s |", c, causeMeaning[c.String()]))
	}
	put("causes", rows)
	if *update && want != text {
		if err := os.WriteFile(page, []byte(want), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	if want != text {
		t.Errorf("docs/results.md is not what the code says: go test ./cmd/lacuna -run ResultsPage -update")
	}
	// Every table of a run has a section, and so has every other file.
	for _, name := range names(t, filepath.Join(demo(t), "results")) {
		if strings.HasPrefix(name, "figures/") {
			name = "figures/*.svg"
		}
		if !strings.Contains(text, "`"+name+"`") {
			t.Errorf("the page does not mention %s", name)
		}
		if base, ok := strings.CutSuffix(name, ".ecsv"); ok && tables[base] == nil {
			t.Errorf("the page does not list the columns of %s", name)
		}
	}
}
