package atomic

import (
	"embed"
	"fmt"
	"strings"
	"sync"
)

//go:embed *.csv
var tables embed.FS

// embedded reads one of our own tables, all of whose columns must be there. A
// fault in it is ours, so it panics; the package's tests read every table.
func embedded(name, columns string) *records {
	f, err := tables.Open(name)
	if err != nil {
		panic("atomic: " + err.Error())
	}
	defer f.Close()
	cols := strings.Fields(columns)
	t, err := readRecords("atomic/"+name, f, cols, cols)
	if err != nil {
		panic("atomic: " + err.Error())
	}
	return t
}

func must[T any](x T, err error) T {
	if err != nil {
		panic("atomic: " + err.Error())
	}
	return x
}

// A Source is what a key in a table stands for.
type Source struct {
	Key      string
	Citation string
	DOI      string
	Read     string // where its numbers were read, or "from memory"
}

var sources = sync.OnceValue(func() map[string]Source {
	out := map[string]Source{}
	for _, r := range embedded("sources.csv", "key citation doi read").rows {
		s := Source{r.get("key"), r.get("citation"), r.get("doi"), r.get("read")}
		if _, twice := out[s.Key]; twice || s.Key == "" || s.Citation == "" || s.Read == "" {
			panic(fmt.Sprintf("atomic: sources.csv: line %d: key %q twice or a cell empty", r.line, s.Key))
		}
		out[s.Key] = s
	}
	return out
})

// Cite returns the source of a key such as "Morton2003"; a word after the key is
// the place in it ("AuthorA2001 T2") and is kept with the citation.
func Cite(key string) (Source, bool) {
	word, place, _ := strings.Cut(key, " ")
	s, ok := sources()[word]
	if ok && place != "" {
		s.Citation += ", " + place
	}
	return s, ok
}

// mustSource holds a row of our own tables to a known source and status.
func mustSource(r record, src, status string) {
	if _, ok := Cite(r.get(src)); !ok {
		panic("atomic: " + r.bad(src, fmt.Sprintf("unknown source %q", r.get(src)), "add it to sources.csv").Error())
	}
	switch Status(r.get(status)) {
	case Verified, Computed, Memory:
	default:
		panic("atomic: " + r.bad(status, fmt.Sprintf("unknown status %q", r.get(status)), "verified, computed or memory").Error())
	}
}
