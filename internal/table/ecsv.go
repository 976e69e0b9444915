package table

import (
	"bufio"
	"fmt"
	"io"
	"math"
	"regexp"
	"strconv"
	"strings"
)

// WriteECSV writes the table as ECSV 1.0 with commas: a YAML header in comment
// lines (types, units, descriptions, metadata), then CSV.
//
// Source: Taylor et al. 2012, Astropy Proposal for Enhancement 6.
func (t *Table) WriteECSV(w io.Writer) error {
	if err := t.Check(); err != nil {
		return err
	}
	b := bufio.NewWriter(w)
	b.WriteString("# %ECSV 1.0\n# ---\n# datatype:\n")
	for i := range t.Cols {
		c := &t.Cols[i]
		b.WriteString("# - {name: " + yamlString(c.Name))
		if c.Unit != "" {
			b.WriteString(", unit: " + yamlString(c.Unit))
		}
		b.WriteString(", datatype: " + string(c.Type))
		if c.Format != "" {
			b.WriteString(", format: " + yamlQuoted(c.Format))
		}
		if c.Description != "" {
			b.WriteString(", description: " + yamlString(c.Description))
		}
		if c.UCD != "" {
			b.WriteString(", meta: {ucd: " + yamlString(c.UCD) + "}")
		}
		b.WriteString("}\n")
	}
	b.WriteString("# delimiter: ','\n")
	if len(t.Meta) > 0 {
		b.WriteString("# meta: !!omap\n")
		for _, kv := range t.Meta {
			b.WriteString("# - {" + yamlString(kv.Key) + ": " + yamlValue(kv.Value) + "}\n")
		}
	}
	b.WriteString("# schema: astropy-2.0\n")
	t.writeRows(b, func(c Cell, ty Type) string {
		if ty == Logical && c.Set {
			return strings.ToUpper(c.Text[:1]) + c.Text[1:]
		}
		return quote(c)
	})
	return b.Flush()
}

// checkMeta refuses values that yamlValue cannot write, and doubled keys.
func checkMeta(kvs []KV, where string) error {
	seen := make(map[string]bool, len(kvs))
	for _, kv := range kvs {
		if kv.Key == "" || seen[kv.Key] {
			return fmt.Errorf("table: %s: the key %q is empty or doubled", where, kv.Key)
		}
		seen[kv.Key] = true
		if why := badText(kv.Key, false); why != "" {
			return fmt.Errorf("table: %s: %s", where, why)
		}
		if err := checkValue(kv.Value, where+"."+kv.Key); err != nil {
			return err
		}
	}
	return nil
}

func checkValue(v any, where string) error {
	switch v := v.(type) {
	case nil, bool, int, int64, float64, []float64:
	case string:
		if why := badText(v, true); why != "" {
			return fmt.Errorf("table: %s: %s", where, why)
		}
	case []string:
		for _, s := range v {
			if why := badText(s, true); why != "" {
				return fmt.Errorf("table: %s: %s", where, why)
			}
		}
	case []any:
		for _, e := range v {
			if err := checkValue(e, where); err != nil {
				return err
			}
		}
	case []KV:
		return checkMeta(v, where)
	default:
		return fmt.Errorf("table: %s: a value of type %T cannot be written", where, v)
	}
	return nil
}

// yamlValue prints a value in YAML's one-line style.
func yamlValue(v any) string {
	switch v := v.(type) {
	case nil:
		return "null"
	case bool:
		return strconv.FormatBool(v)
	case int:
		return strconv.Itoa(v)
	case int64:
		return strconv.FormatInt(v, 10)
	case float64:
		return yamlFloat(v)
	case string:
		return yamlString(v)
	case []string:
		return yamlList(len(v), func(i int) string { return yamlString(v[i]) })
	case []float64:
		return yamlList(len(v), func(i int) string { return yamlFloat(v[i]) })
	case []any:
		return yamlList(len(v), func(i int) string { return yamlValue(v[i]) })
	case []KV:
		parts := make([]string, len(v))
		for i, kv := range v {
			parts[i] = yamlString(kv.Key) + ": " + yamlValue(kv.Value)
		}
		return "{" + strings.Join(parts, ", ") + "}"
	}
	panic(fmt.Sprintf("table: yamlValue: %T passed Check", v))
}

func yamlList(n int, item func(int) string) string {
	parts := make([]string, n)
	for i := range parts {
		parts[i] = item(i)
	}
	return "[" + strings.Join(parts, ", ") + "]"
}

// yamlFloat prints a number that YAML 1.1 readers take for a real: with a point.
func yamlFloat(x float64) string {
	switch {
	case math.IsNaN(x):
		return ".nan"
	case math.IsInf(x, 1):
		return ".inf"
	case math.IsInf(x, -1):
		return "-.inf"
	}
	mant, exp, has := strings.Cut(strconv.FormatFloat(x, 'g', -1, 64), "e")
	if !strings.Contains(mant, ".") {
		mant += ".0"
	}
	if has {
		mant += "e" + exp
	}
	return mant
}

// plainYAML is text that needs no quotes in any place of a one-line mapping.
var plainYAML = regexp.MustCompile(`^[A-Za-z][A-Za-z0-9_]*( ?[A-Za-z0-9_./()=;^*+-]+)*$`)

// yamlWords are read as something else than text by YAML 1.1 or 1.2.
var yamlWords = map[string]bool{"true": true, "false": true, "yes": true, "no": true, "on": true, "off": true, "null": true, "y": true, "n": true, "nan": true, "inf": true}

func yamlString(s string) string {
	if plainYAML.MatchString(s) && !yamlWords[strings.ToLower(s)] {
		return s
	}
	return yamlQuoted(s)
}

func yamlQuoted(s string) string {
	if strings.ContainsAny(s, "\n\t") {
		return `"` + strings.NewReplacer(`\`, `\\`, `"`, `\"`, "\n", `\n`, "\t", `\t`).Replace(s) + `"`
	}
	return "'" + strings.ReplaceAll(s, "'", "''") + "'"
}
