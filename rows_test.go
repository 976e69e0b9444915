package lacuna_test

import (
	"encoding/json"
	"os/exec"
	"strings"
	"testing"
)

// The rows of the house: a package imports only rows below its own. A package
// that is not listed fails the test, so that each new one finds its row.
var rows = map[string]int{
	"cmd/lacuna":     10,
	"report":         8,
	"bench/coverage": 5, // a study of its own: nothing imports it
	"survey":         7,
	"config":         6,
	"simulate":       5,
	"measure":        4, "cog": 4, "abundance": 4, "voigt/clouds": 4,
	"spectrum/continuum": 3, "spectrum/telluric": 3,
	"spectrum": 2,
	"voigt":    1, "voigt/lsf": 1, "internal/table": 1,
	"atomic": 0, "budget": 0, "spectrum/frame": 0, "spectrum/fits": 0, "internal/lsq": 0,
	// Below the house: no physics, imported by anything.
	"internal/oops": -1, "internal/disk": -1, "internal/check": -1,
}

// Who may import which outside library.
var owners = map[string]string{
	"github.com/astrogo/fitsio":    "spectrum/fits",
	"github.com/BurntSushi/toml":   "config",
	"github.com/urfave/cli/v2":     "cmd/lacuna",
	"gonum.org/v1/plot":            "report",
	"go.yaml.in/yaml/v3":           "internal/table",
	"codeberg.org/go-fonts":        "report",
	"golang.org/x/term":            "cmd/lacuna",
	"github.com/chromedp/chromedp": "report",
}

func TestRows(t *testing.T) {
	out, err := exec.Command("go", "list", "-json=ImportPath,Imports", "./...").Output()
	if err != nil {
		t.Fatalf("go list: %v", err)
	}
	dec := json.NewDecoder(strings.NewReader(string(out)))
	n := 0
	for dec.More() {
		var p struct {
			ImportPath string
			Imports    []string
		}
		if err := dec.Decode(&p); err != nil {
			t.Fatal(err)
		}
		name := strings.TrimPrefix(p.ImportPath, "lacuna/")
		if name == "lacuna" || strings.Contains(name, "/internal/") && !strings.HasPrefix(name, "internal/") {
			continue // the root's tests; generators inside a package
		}
		n++
		row, ok := rows[name]
		if !ok {
			t.Errorf("%s has no row in rows_test.go: give it one", name)
			continue
		}
		for _, imp := range p.Imports {
			if below, ok := strings.CutPrefix(imp, "lacuna/"); ok {
				r, known := rows[below]
				if known && r >= row {
					t.Errorf("%s (row %d) imports %s (row %d): only rows below", name, row, below, r)
				}
				continue
			}
			for lib, owner := range owners {
				if (imp == lib || strings.HasPrefix(imp, lib+"/")) && name != owner {
					t.Errorf("%s imports %s, which belongs to %s", name, imp, owner)
				}
			}
		}
	}
	if n < 15 {
		t.Fatalf("go list names only %d packages", n)
	}
}
