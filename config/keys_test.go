package config

import (
	"bytes"
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"reflect"
	"regexp"
	"strings"
	"testing"

	"github.com/BurntSushi/toml"

	"lacuna/internal/check"
	"lacuna/spectrum/frame"
)

var update = flag.Bool("update", false, "write docs/config.md")

// structs are the types that hold each table.
var structs = map[string]any{
	"survey": &Survey{}, "sightline": &Sightline{}, "sightline.spectrum": &Spectrum{}, "sightline.line": &Line{},
	"sightline.hydrogen": &Hydrogen{}, "sightline.column": &Column{}, "sightline.adopt": &Adopt{},
	"sightline.fit": &Fit{}, "sightline.fit.cloud": &FitCloud{}, "parameter": &Parameter{},
	"zero_level": &ZeroLevel{}, "E_BV": &Quantity{}, "columns": &Names{},
	"growth": &Growth{}, "growth.sightline": &GrowthSightline{}, "growth.sightline.width": &GrowthWidth{},
	"growth.sightline.share_b": &struct {
		Species []string `toml:"species"`
	}{},
}

func TestKeysAndFieldsAgree(t *testing.T) {
	seen := map[string]bool{}
	for _, k := range Keys() {
		id := k.Table + "." + k.Name
		if seen[id] {
			t.Errorf("%s is there twice", id)
		}
		seen[id] = true
		if k.Meaning == "" || !strings.HasSuffix(k.Meaning, ".") {
			t.Errorf("%s: the meaning is no sentence: %q", id, k.Meaning)
		}
		if k.Required && k.Default != "" {
			t.Errorf("%s is required and has a default", id)
		}
		parseRange(k.Range) // panics on a wrong one
		s := structs[k.Table]
		if s == nil {
			t.Fatalf("no type for table %s", k.Table)
		}
		_, field := fieldOf(reflect.ValueOf(s).Elem(), k.Name)
		if _, inline := structs[k.Name]; !field && !(k.Type == Tables || k.Type == Table && !inline) {
			t.Errorf("%s has no field", id)
		}
	}
	for table, s := range structs {
		typ := reflect.TypeOf(s).Elem()
		for i := range typ.NumField() {
			if tag := typ.Field(i).Tag.Get("toml"); tag != "" && !seen[table+"."+tag] {
				t.Errorf("%s.%s: field %s has no key", table, tag, typ.Field(i).Name)
			}
		}
	}
	for _, w := range append(fileFrames, frameWords...) {
		if k := frameOf(w); k == frame.Unknown || FrameWord(k) != w {
			t.Errorf("frame %q does not come back", w)
		}
	}
	for _, w := range formulaWords {
		if _, err := frame.ParseFormula(w); err != nil {
			t.Error(err)
		}
	}
}

// Every line that is switched off in a starter must be right when switched on,
// and no key may be missing.
func TestStarters(t *testing.T) {
	if _, err := load(t, string(Starter())); err != nil {
		t.Error(err)
	}
	if _, err := loadGrowth(t, string(StarterGrowth())); err != nil {
		t.Error(err)
	}
	head := regexp.MustCompile(`^#? ?\[+([a-zA-Z_.]+)\]+`)
	key := regexp.MustCompile(`^(?:# )?([A-Za-z_0-9]+) = (.*)$`)
	seen := map[string]bool{}
	for prefix, text := range map[string][]byte{"": Starter(), "growth.": StarterGrowth()} {
		table := ""
		for n, ln := range strings.Split(string(text), "\n") {
			if len([]rune(ln)) > 100 {
				t.Errorf("line %d is longer than 100 columns", n+1)
			}
			if m := head.FindStringSubmatch(ln); m != nil {
				table = prefix + strings.Replace(m[1], "defaults", "sightline", 1)
				if m[1] == "growth" {
					table = "growth"
				}
				seen[table] = true
				continue
			}
			m := key.FindStringSubmatch(ln)
			if m == nil {
				continue
			}
			tree := map[string]any{}
			if _, err := toml.Decode(m[1]+" = "+m[2], &tree); err != nil {
				t.Fatalf("line %d: %v", n+1, err)
			}
			l := &loader{file: "starter"}
			dst := reflect.New(reflect.TypeOf(structs[table]).Elem())
			l.fill(table, table, tree, dst.Interface(), nil, "")
			if err := l.err(); err != nil {
				t.Errorf("line %d: %v", n+1, err)
			}
			seen[table+"."+m[1]] = true
		}
	}
	for _, k := range Keys() {
		if structs[k.Table] != nil && !seen[k.Table+"."+k.Name] && !inline(k.Table) {
			t.Errorf("no starter shows %s.%s", k.Table, k.Name)
		}
	}
}

func inline(table string) bool {
	return table == "parameter" || table == "zero_level" || table == "E_BV" || table == "columns"
}

// A default that a starter shows as one must be the default.
func TestStarterDefaults(t *testing.T) {
	for _, k := range Keys() {
		if k.Default == "" || k.Table == "growth" || k.Name == "override" || k.Name == "degree" || k.Name == "use" {
			continue // shown with another value on purpose
		}
		line := regexp.MustCompile(`(?m)^(# )?` + k.Name + ` = ([^#]*?) *(#.*)?$`)
		m := line.FindSubmatch(Starter())
		if m == nil {
			t.Errorf("%s is not shown", k.Name)
			continue
		}
		if got := string(m[2]); got != k.Default {
			t.Errorf("%s.%s: shown %s, is %s", k.Table, k.Name, got, k.Default)
		}
	}
}

func TestManualIsCurrent(t *testing.T) {
	path := filepath.Join(check.Root(t), "docs", "config.md")
	want := manual()
	if *update {
		if err := os.WriteFile(path, want, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	got, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(got, want) {
		t.Error("docs/config.md is not what the keys say: go test ./config -run Manual -update")
	}
}

var tableTitles = []struct{ table, title, text string }{
	{"survey", "[survey]", "Once, at the top."},
	{"sightline", "[[sightline]]", "Once for each star. Keys marked ◆ may also stand in `[defaults]`."},
	{"sightline.spectrum", "[[sightline.spectrum]]", "Once for each file. All but `file` and `continuum_file` may also stand in `[defaults.spectrum]`."},
	{"sightline.line", "[[sightline.line]]", "For a transition with settings of its own. `[[defaults.line]]` holds settings of one transition for all sightlines."},
	{"sightline.fit", "[[sightline.fit]]", "Clouds fitted to lines; [clouds.md](clouds.md) shows how. The species of a cloud share v and b unless you say otherwise."},
	{"sightline.fit.cloud", "[[sightline.fit.cloud]]", "Once for each cloud of the fit above it. Each parameter is a number, where it starts, or `{…}` (see parameter)."},
	{"sightline.hydrogen", "[sightline.hydrogen]", "Each column is a value with its error, or an upper limit. Without N(H₂) or a limit on it, N(H) has no upper end."},
	{"sightline.column", "[[sightline.column]]", "Column densities that were not measured here."},
	{"sightline.adopt", "[[sightline.adopt]]", "Give either `method` or `logN`."},
	{"zero_level", "zero_level = {…}", ""},
	{"E_BV", "E_BV = {…}", ""},
	{"parameter", "{…} of a parameter", "`b = {start = 1.3, range = [0.5, 3]}`, `v = {start = -14, fixed = true}`, `b = {prior = 1.2, prior_err = 0.2}`, `columns = {\"CH+\" = 12.5, \"13CH+\" = {to = \"CH+\", ratio = 0.0143}}`. Values are in the unit of the parameter."},
	{"columns", "columns = {…}", ""},
	{"growth", "[growth]", "A growth-curve batch is a file of its own."},
	{"growth.sightline", "[[sightline]] of a batch", ""},
	{"growth.sightline.width", "[[sightline.width]] of a batch", ""},
	{"growth.sightline.share_b", "[[sightline.share_b]] of a batch", ""},
}

// manual writes docs/config.md.
func manual() []byte {
	var b bytes.Buffer
	b.WriteString(manualHead)
	for _, tt := range tableTitles {
		fmt.Fprintf(&b, "\n## %s\n\n", tt.title)
		if tt.text != "" {
			fmt.Fprintf(&b, "%s\n\n", tt.text)
		}
		b.WriteString("| key | takes | default | meaning |\n|---|---|---|---|\n")
		for _, k := range keysOf(tt.table) {
			name := "`" + k.Name + "`"
			if k.Common {
				name += " ◆"
			}
			takes := string(k.Type)
			switch {
			case len(k.Words) > 0:
				var w []string
				for _, s := range k.Words {
					w = append(w, "`\""+s+"\"`")
				}
				takes = strings.Join(w, ", ")
			case k.Range != "" && k.Type != Pairs && k.Type != Pair && k.Type != Integers:
				takes += " in " + k.Range
			case k.Range != "":
				takes += ", each in " + k.Range
			}
			if k.Unit != "" {
				takes += ", " + k.Unit
			}
			def := ""
			switch {
			case k.Required:
				def = "required"
			case k.Default != "":
				def = "`" + k.Default + "`"
			}
			fmt.Fprintf(&b, "| %s | %s | %s | %s |\n", name, takes, def, strings.ReplaceAll(k.Meaning, "|", `\|`))
		}
	}
	b.WriteString(manualTail)
	for _, c := range catalogueColumns() {
		fmt.Fprintf(&b, "`%s` ", c.name)
	}
	b.WriteString("\n")
	return b.Bytes()
}

const manualHead = `# Survey files and growth-curve batches

<!-- Written from config.Keys by: go test ./config -run Manual -update -->

Both are [TOML](https://toml.io). ` + "`lacuna new DIR`" + ` writes one of each with every key explained.
Velocities are km/s, wavelengths Å, column densities log₁₀ of cm⁻², widths mÅ, errors 1σ.
Paths start at the folder of the file that names them.

The loader is strict. An unknown key, a value of the wrong type, NaN or infinity, a value outside its
range, a line that the table of transitions lacks: each is an error with the file, the place, what is wrong
and how to mend it, and all mistakes of a file are shown at once. ` + "`lacuna run --dry-run`" + ` prints the survey with
everything resolved: each default stands there, marked with where it came from.

A sightline's keys come from four places; the later takes the place of the earlier: the built-in default,
` + "`[defaults]`" + `, the catalogue's row, the ` + "`[[sightline]]`" + ` itself. A list or table is replaced whole, except lines:
` + "`lines`" + ` names transitions, ` + "`[[defaults.line]]`" + ` and ` + "`[[sightline.line]]`" + ` add to them or change their settings key by key.
`

const manualTail = `
## Catalogue

A CSV or ECSV table that makes one sightline a row. Empty cells are keys that are not given. ` + "`file`" + ` holds one
file or several with ; between them, and the row's spectrum keys are for all of them; a file name that itself
holds a ; needs a ` + "`[[sightline]]`" + `. Paths start at the folder of the survey file. A column that is not in the list
below is an error, unless ` + "`catalogue_ignore`" + ` names it. To change one star by hand, write a ` + "`[[sightline]]`" + ` with its name
and ` + "`override = true`" + `.

Columns: `

func TestSlug(t *testing.T) {
	for name, want := range map[string]string{
		"Lantern 1": "Lantern_1", "BD+28 4211": "BD+28_4211", "HD 1-2.5": "HD_1-2.5",
	} {
		if got := Slug(name); got != want {
			t.Errorf("Slug(%q) = %s, want %s", name, got, want)
		}
	}
	safe := regexp.MustCompile(`^[A-Za-z0-9+_~-][A-Za-z0-9+._~-]*$`)
	hard := []string{"a/b", "a-b", "a\\b", "a_b", "a b", "../x", "..", ".", ".x", "x.", "<b>a</b>", "CON", "nul.txt", "COM1", "α Cen", "β Cen", "a?b", "a*b", "a\"b", "",
		strings.Repeat("x", 300), strings.Repeat("x", 301), strings.Repeat("é", 300), "Lantern_1", "-x", "~"}
	seen := map[string]string{}
	for _, n := range hard {
		s := Slug(n)
		if !safe.MatchString(s) || len(s) > 100 || strings.HasSuffix(s, ".") || reserved(s) || s == "." || s == ".." {
			t.Errorf("Slug(%.20q) = %s is no safe file name", n, s)
		}
		if other, twice := seen[strings.ToLower(s)]; twice {
			t.Errorf("%q and %q share %s", n, other, s)
		}
		seen[strings.ToLower(s)] = n
	}
}
