package config

import (
	"bytes"
	"fmt"
	"reflect"
	"sort"
	"strconv"
	"strings"

	"lacuna/spectrum/frame"
)

const resolvedHead = "# Everything resolved; a mark behind a key says where it came from, if not from its own place."

// Resolved is the survey as TOML with everything in it: no [defaults], no
// catalogue, each default written out and marked "# default" (or with where else
// it came from). Loading it gives the same survey.
func (s *Survey) Resolved() []byte {
	var b bytes.Buffer
	fmt.Fprintln(&b, resolvedHead)
	section(&b, "[survey]", "survey", s, s.by)
	for i := range s.Sightlines {
		b.WriteByte('\n')
		s.Sightlines[i].write(&b)
	}
	return b.Bytes()
}

func (x *Sightline) write(b *bytes.Buffer) {
	section(b, "[[sightline]]", "sightline", x, x.by)
	for i := range x.Spectra {
		section(b, "[[sightline.spectrum]]", "sightline.spectrum", &x.Spectra[i], x.Spectra[i].by)
	}
	for i := range x.Lines {
		section(b, "[[sightline.line]]", "sightline.line", &x.Lines[i], x.Lines[i].by)
	}
	for i := range x.Fits {
		f := &x.Fits[i]
		section(b, "[[sightline.fit]]", "sightline.fit", f, f.by)
		for j := range f.Clouds {
			section(b, "[[sightline.fit.cloud]]", "sightline.fit.cloud", &f.Clouds[j], f.Clouds[j].by)
		}
	}
	if x.Hydrogen != nil {
		section(b, "[sightline.hydrogen]", "sightline.hydrogen", x.Hydrogen, x.Hydrogen.by)
	}
	for i := range x.Columns {
		section(b, "[[sightline.column]]", "sightline.column", &x.Columns[i], x.Columns[i].by)
	}
	for i := range x.Adopt {
		section(b, "[[sightline.adopt]]", "sightline.adopt", &x.Adopt[i], x.Adopt[i].by)
	}
}

func section(b *bytes.Buffer, head, table string, src any, by origins) {
	fmt.Fprintln(b, head)
	for _, e := range settings(table, src, by) {
		fmt.Fprintf(b, "%s = %s", e.Key, e.Value)
		if e.By != "" {
			fmt.Fprintf(b, "  # %s", e.By)
		}
		b.WriteByte('\n')
	}
}

// A Setting is one key as resolved.
type Setting struct {
	Table string `json:"table"` // "survey", "sightline.line"
	Key   string `json:"key"`
	Value string `json:"value"` // as TOML
	By    string `json:"by"`    // "" the user, else "default", "defaults", "catalogue" or the key it was taken from
	Count int    `json:"count"` // in how many places
}

// Defaults lists what the user did not set: built-in defaults and what was taken
// from another key, each value once, in the order of the manual. Resolved marks
// them in their places.
func (s *Survey) Defaults() []Setting {
	var out []Setting
	seen := map[Setting]int{}
	add := func(table string, src any, by origins) {
		for _, e := range settings(table, src, by) {
			if e.By == "" || e.By == "defaults" || e.By == "catalogue" {
				continue
			}
			e.Table = table
			i, ok := seen[e]
			if !ok {
				i = len(out)
				seen[e] = i
				out = append(out, e)
			}
			out[i].Count++
		}
	}
	add("survey", s, s.by)
	for i := range s.Sightlines {
		x := &s.Sightlines[i]
		add("sightline", x, x.by)
		for j := range x.Spectra {
			add("sightline.spectrum", &x.Spectra[j], x.Spectra[j].by)
		}
		for j := range x.Lines {
			add("sightline.line", &x.Lines[j], x.Lines[j].by)
		}
		for j := range x.Fits {
			add("sightline.fit", &x.Fits[j], x.Fits[j].by)
			for k := range x.Fits[j].Clouds {
				add("sightline.fit.cloud", &x.Fits[j].Clouds[k], x.Fits[j].Clouds[k].by)
			}
		}
		for j := range x.Columns {
			add("sightline.column", &x.Columns[j], x.Columns[j].by)
		}
		for j := range x.Adopt {
			add("sightline.adopt", &x.Adopt[j], x.Adopt[j].by)
		}
	}
	order := map[string]int{}
	for i, k := range schema {
		order[k.Table+"\x00"+k.Name] = i
	}
	sort.SliceStable(out, func(a, b int) bool {
		return order[out[a].Table+"\x00"+out[a].Key] < order[out[b].Table+"\x00"+out[b].Key]
	})
	return out
}

// settings prints the fields of src that say something.
func settings(table string, src any, by origins) []Setting {
	v := reflect.ValueOf(src).Elem()
	var out []Setting
	for _, k := range keysOf(table) {
		f, ok := fieldOf(v, k.Name)
		if !ok || once(table, k.Name) {
			continue
		}
		if _, set := by[k.Name]; !set && f.IsZero() && k.Default == "" && !k.Required {
			continue // absent
		}
		out = append(out, Setting{Key: k.Name, Value: value(f), By: by[k.Name]})
	}
	return out
}

// once names the keys that have done their work when a survey is loaded.
func once(table, key string) bool {
	switch table + "." + key {
	case "survey.catalogue", "survey.catalogue_ignore", "sightline.override", "sightline.lines":
		return true
	case "growth.table":
		return true
	}
	return false
}

// value prints a field as TOML.
func value(f reflect.Value) string {
	switch f.Kind() {
	case reflect.Pointer:
		return value(f.Elem())
	case reflect.String:
		if k, ok := f.Interface().(frame.Kind); ok {
			return quote(FrameWord(k))
		}
		return quote(f.String())
	case reflect.Bool:
		return strconv.FormatBool(f.Bool())
	case reflect.Int:
		return strconv.FormatInt(f.Int(), 10)
	case reflect.Float64:
		s := strconv.FormatFloat(f.Float(), 'g', -1, 64)
		if !strings.ContainsAny(s, ".e") {
			s += ".0"
		}
		return s
	case reflect.Slice, reflect.Array:
		parts := make([]string, f.Len())
		for i := range parts {
			parts[i] = value(f.Index(i))
		}
		return "[" + strings.Join(parts, ", ") + "]"
	case reflect.Map:
		ps := f.Interface().(Parameters)
		parts := make([]string, 0, len(ps))
		for _, name := range sortedSpecies(ps) {
			parts = append(parts, quote(name)+" = "+ps[name].text())
		}
		return "{" + strings.Join(parts, ", ") + "}"
	case reflect.Struct:
		if p, ok := f.Interface().(Parameter); ok {
			return p.text()
		}
		var parts []string
		for i := range f.NumField() {
			key := f.Type().Field(i).Tag.Get("toml")
			g := f.Field(i)
			if g.IsZero() && g.Kind() == reflect.String || g.IsZero() && key == "err" && f.Type() == reflect.TypeFor[Quantity]() {
				continue
			}
			parts = append(parts, key+" = "+value(g))
		}
		return "{" + strings.Join(parts, ", ") + "}"
	}
	panic("config: no TOML for " + f.Type().String())
}

// text is a parameter as TOML: a number where that says all.
func (p Parameter) text() string {
	if p.Start != nil && p == (Parameter{Start: p.Start}) {
		return value(reflect.ValueOf(*p.Start))
	}
	var parts []string
	v := reflect.ValueOf(p)
	for i := range v.NumField() {
		if f := v.Field(i); !f.IsZero() {
			parts = append(parts, v.Type().Field(i).Tag.Get("toml")+" = "+value(f))
		}
	}
	return "{" + strings.Join(parts, ", ") + "}"
}

// quote writes a text that badText accepts: no control characters to escape.
func quote(s string) string {
	return `"` + strings.NewReplacer(`\`, `\\`, `"`, `\"`).Replace(s) + `"`
}
