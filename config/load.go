package config

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"unicode/utf8"

	"github.com/BurntSushi/toml"

	"lacuna/internal/oops"
)

// maxFile is the largest TOML file read, bytes: a survey of 10⁵ sightlines
// belongs in a catalogue.
const maxFile = 64 << 20

// Load reads a survey file. Every mistake in it is reported; the files it names
// are not looked at (see CheckFiles), except the catalogue and the line table.
func Load(path string) (*Survey, error) {
	m, err := readTOML(path, "lacuna new")
	if err != nil {
		return nil, err
	}
	return parse(path, m)
}

// readTOML reads a TOML file as a tree of maps.
func readTOML(path, starter string) (map[string]any, error) {
	st, err := os.Stat(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return nil, oops.Input(path, "", "no such file", "check the name, or make a starter with '"+starter+"'")
	case err != nil:
		return nil, err
	case st.IsDir():
		return nil, oops.Input(path, "", "is a folder, not a TOML file", "name the file in it")
	case st.Size() > maxFile:
		return nil, oops.Inputf(path, "", "put many sightlines into a catalogue table", "%d bytes are too many for a TOML file", st.Size())
	}
	b, err := os.ReadFile(path)
	if err != nil {
		return nil, err
	}
	return parseTOML(path, b, starter)
}

func parseTOML(path string, b []byte, starter string) (map[string]any, error) {
	if !utf8.Valid(b) {
		return nil, oops.Input(path, "", "is not UTF-8 text", "save it as UTF-8; a spectrum goes into the file key of a survey")
	}
	m := map[string]any{}
	if _, err := toml.Decode(string(b), &m); err != nil {
		var p toml.ParseError
		if errors.As(err, &p) {
			where := fmt.Sprintf("line %d", p.Position.Line)
			if p.LastKey != "" {
				where += " (after key " + show(p.LastKey) + ")"
			}
			return nil, oops.Input(path, where, "not TOML: "+oneLine(p.Message), "mend this line")
		}
		return nil, oops.Input(path, "", "not TOML: "+oneLine(err.Error()), "mend the file")
	}
	if len(m) == 0 {
		return nil, oops.Input(path, "", "nothing in it", "'"+starter+"' writes a starter with every key explained")
	}
	return m, nil
}

func oneLine(s string) string { return strings.Join(strings.Fields(s), " ") }

// parse makes a survey of a tree.
func parse(path string, m map[string]any) (*Survey, error) {
	if m["growth"] != nil && m["survey"] == nil {
		return nil, oops.Input(path, "", "a batch for the curve of growth, not a survey", "lacuna growth takes it")
	}
	l := &loader{file: path}
	l.topKeys(m, "survey", "defaults", "sightline")
	s := &Survey{File: path, Dir: filepath.Dir(path), by: origins{}}
	l.defaults("survey", s, s.by)
	if sv := l.table("", "survey", m); sv != nil {
		l.required("survey", "survey", sv)
		l.fill("survey", "survey", sv, s, s.by, "")
	} else if m["survey"] == nil && !l.told("survey") {
		l.bad("survey", `add [survey] with name = "…"`, "missing")
	}
	l.checkScale(s.Scale)
	l.tab = l.lineTable("survey", s.Dir, &s.FSet, s.LineTable)
	def := l.common(l.table("", "defaults", m))
	own := l.tables("", "sightline", m)
	rows := l.catalogue(s)
	if len(own) == 0 && len(rows) == 0 && len(l.errs) == 0 {
		l.bad("sightline", "add [[sightline]] with a name and a spectrum, or a catalogue", "none")
	}
	places := l.sightlines(s, def, rows, own)
	if l.tab != nil {
		for i := range s.Sightlines {
			l.finish(s, &s.Sightlines[i], def, places[i])
		}
	}
	if err := l.err(); err != nil {
		return nil, err
	}
	return s, nil
}

func (l *loader) topKeys(m map[string]any, names ...string) {
	for _, k := range sortedKeys(m) {
		known := false
		for _, n := range names {
			known = known || n == k
		}
		if !known {
			l.bad(show(k), unknownFix("", k, names), "unknown table or key at the top")
		}
	}
}

// builtin holds the defaults of every table, parsed once.
var builtin = sync.OnceValue(func() map[string]map[string]any {
	all := map[string]map[string]any{}
	for _, k := range schema {
		if k.Default == "" {
			continue
		}
		if all[k.Table] == nil {
			all[k.Table] = map[string]any{}
		}
		m := all[k.Table]
		if _, err := toml.Decode(k.Name+" = "+k.Default, &m); err != nil {
			panic("config: default of " + k.Table + "." + k.Name + ": " + err.Error())
		}
	}
	return all
})

// defaults sets the built-in defaults of a table.
func (l *loader) defaults(table string, dst any, by origins) {
	l.fill(table, table, builtin()[table], dst, by, "default")
}

func place(i int, name string) string {
	if name == "" {
		return fmt.Sprintf("sightline %d", i+1)
	}
	return fmt.Sprintf("sightline %d (%s)", i+1, show(name)[1:len(show(name))-1])
}
