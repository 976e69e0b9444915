package config

import (
	"errors"
	"reflect"
	"slices"
	"sort"
	"strings"
	"sync"

	"lacuna/atomic"
	"lacuna/internal/oops"
)

// maxMistakes bounds how many mistakes are reported at once.
const maxMistakes = 20

// A loader collects the mistakes of one file.
type loader struct {
	file string
	tab  *atomic.Table // of transitions; nil when it could not be had
	look map[string]found
	errs []error
	said map[string]bool // a mistake in [defaults] shows once, not once a sightline
}

func (l *loader) bad(where, fix, format string, a ...any) {
	l.add(oops.Inputf(l.file, where, fix, format, a...))
}

func (l *loader) add(err error) {
	if text := err.Error(); !l.said[text] {
		if l.said == nil {
			l.said = map[string]bool{}
		}
		l.said[text] = true
		l.errs = append(l.errs, err)
	}
}

// err returns all mistakes as one error, each on its own line.
func (l *loader) err() error {
	if len(l.errs) > maxMistakes {
		more := len(l.errs) - maxMistakes
		l.errs = append(l.errs[:maxMistakes:maxMistakes], oops.Inputf(l.file, "", "", "and %d more mistakes", more))
	}
	if len(l.errs) == 1 {
		return l.errs[0]
	}
	return errors.Join(l.errs...)
}

// fill sets the fields of dst (a pointer to a struct with toml tags) from the
// keys of m that are present, as the schema of table allows, and notes in by
// where each came from. Keys of Type Table or Tables without a field of their
// name are the caller's. where is the place of m in the file, for messages.
func (l *loader) fill(where, table string, m map[string]any, dst any, by origins, origin string) {
	sec := sections()[table]
	v := reflect.ValueOf(dst).Elem()
	for _, name := range sortedKeys(m) {
		i := slices.Index(sec.names, name)
		if i < 0 {
			l.bad(at(where, name), unknownFix(table, name, sec.names), "unknown key")
			continue
		}
		k, x := sec.keys[i], m[name]
		if f, ok := fieldOf(v, k.Name); ok && l.set(at(where, k.Name), k, x, f) && by != nil {
			by[k.Name] = origin
		}
	}
}

func unknownFix(table, name string, names []string) string {
	if n := oops.Nearest(name, names, 2); len(n) > 0 {
		return "did you mean " + strings.Join(n, " or ") + "?"
	}
	for _, k := range schema { // a key that belongs elsewhere
		if k.Name == name && k.Table != table {
			return "this key belongs to [" + k.Table + "]"
		}
	}
	return "known here: " + strings.Join(names, ", ")
}

// read fills a table of the user's and reports whether it holds no mistake, so
// that its keys can be compared with each other.
func (l *loader) read(where, table string, m map[string]any, dst any, by origins, origin string) bool {
	n := len(l.errs)
	l.required(where, table, m)
	l.fill(where, table, m, dst, by, origin)
	return len(l.errs) == n
}

// required reports the required keys of a table that are missing from m.
func (l *loader) required(where, table string, m map[string]any) {
	for _, k := range keysOf(table) {
		if _, ok := m[k.Name]; k.Required && !ok {
			l.bad(at(where, k.Name), "add "+k.Name+" = "+example(k), "missing")
		}
	}
}

func example(k KeyDoc) string {
	switch k.Type {
	case Number:
		return "a number"
	case Texts:
		return `["…"]`
	default:
		return `"…"`
	}
}

// tables returns a list of tables, however it was written.
func (l *loader) tables(where, name string, m map[string]any) []map[string]any {
	switch v := m[name].(type) {
	case nil:
		return nil
	case []map[string]any:
		return v
	case []any:
		out := make([]map[string]any, 0, len(v))
		for _, e := range v {
			t, ok := e.(map[string]any)
			if !ok {
				break
			}
			out = append(out, t)
		}
		if len(out) == len(v) {
			return out
		}
	}
	l.bad(at(where, name), "write [["+name+"]] with two brackets, once for each", "%s is not a list of tables", show(m[name]))
	return nil
}

// table returns one table, or nil.
func (l *loader) table(where, name string, m map[string]any) map[string]any {
	switch v := m[name].(type) {
	case nil:
		return nil
	case map[string]any:
		return v
	default:
		l.bad(at(where, name), "write ["+name+"] with one bracket, once", "it is not one table")
		return nil
	}
}

// at joins the parts of a place.
func at(where, name string) string {
	if where == "" {
		return name
	}
	return where + ": " + name
}

func sortedKeys(m map[string]any) []string {
	out := make([]string, 0, len(m))
	for k := range m {
		out = append(out, k)
	}
	sort.Strings(out)
	return out
}

var fields sync.Map // of reflect.Type: key → index of the field

// fieldOf finds the field of a key.
func fieldOf(v reflect.Value, key string) (reflect.Value, bool) {
	known, ok := fields.Load(v.Type())
	if !ok {
		m := map[string]int{}
		for i := range v.NumField() {
			if tag := v.Type().Field(i).Tag.Get("toml"); tag != "" {
				m[tag] = i
			}
		}
		known, _ = fields.LoadOrStore(v.Type(), m)
	}
	i, ok := known.(map[string]int)[key]
	if !ok {
		return reflect.Value{}, false
	}
	return v.Field(i), true
}
