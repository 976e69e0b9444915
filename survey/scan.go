package survey

import (
	"bufio"
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"hash/crc32"
	"io"

	"lacuna/internal/oops"
)

// maxLine bounds a journal line, bytes; a longer one is damage.
const maxLine = 1 << 28

// The Status of a record: its sightline came through, or did not.
const (
	statusDone   = "done"
	statusFailed = "failed"
)

const crcHead, crcTail = `{"crc":"`, `",`

var castagnoli = crc32.MakeTable(crc32.Castagnoli)

func sum(b []byte) string { return fmt.Sprintf("%08x", crc32.Checksum(b, castagnoli)) }

// An entry is what is known of one line without reading its result.
type entry struct {
	Key    string `json:"key"`
	Schema int    `json:"schema"`
	Name   string `json:"name"`
	Index  int    `json:"index"`
	Status string `json:"status"`

	off  int64
	len  int
	body uint32 // CRC-32C of the result
}

// An index is what a journal holds.
type index struct {
	entries []entry
	last    map[string]int // by name
	done    map[string]int // by key, finished ones
	lines   int
	size    int64 // of whole lines
	torn    int64 // bytes after them
	damage  []string
}

func (x *index) add(e entry, line int) {
	if x.last == nil {
		x.last, x.done = map[string]int{}, map[string]int{}
	}
	if i, ok := x.done[e.Key]; ok && e.Status == statusDone && x.entries[i].Name == e.Name && x.entries[i].body != e.body {
		x.damage = append(x.damage, fmt.Sprintf("line %d: %s was computed twice from the same input with different results: please report this", line, e.Name))
	}
	x.entries = append(x.entries, e)
	x.last[e.Name] = len(x.entries) - 1
	if e.Status == statusDone {
		x.done[e.Key] = len(x.entries) - 1
	}
}

// same reports whether two entries are one record, bytes and all.
func (e entry) same(o entry) bool {
	return e.Key == o.Key && e.Name == o.Name && e.Index == o.Index && e.Status == o.Status && e.body == o.body
}

// scan reads a journal through and indexes it. Only a record of another schema,
// or a failing disk, is an error.
func scan(r io.Reader, path string) (index, error) {
	var x index
	in := bufio.NewReaderSize(r, 1<<16)
	for {
		line, n, long, err := readLine(in)
		if errors.Is(err, io.EOF) {
			x.torn = n
			return x, nil
		}
		if err != nil {
			return x, fmt.Errorf("reading %s: %w", path, err)
		}
		x.lines++
		off := x.size
		x.size += n
		if long {
			x.damage = append(x.damage, fmt.Sprintf("line %d is too long for a record; it is left where it is", x.lines))
			continue
		}
		e, why := parseLine(line)
		if why != "" {
			x.damage = append(x.damage, fmt.Sprintf("line %d is damaged (%s); it is left where it is, and its sightline is computed again", x.lines, why))
			continue
		}
		if e.Schema != Schema {
			return x, oops.Inputf(path, fmt.Sprintf("line %d", x.lines), "use the version that wrote it, or another folder with --out",
				"a record of schema %d, this program writes %d", e.Schema, Schema)
		}
		e.off, e.len = off, int(n)
		x.add(e, x.lines)
	}
}

// readLine returns a line without its end, and how many bytes it took with it.
// At the end of the file it returns io.EOF and how many bytes had no end.
func readLine(in *bufio.Reader) (line []byte, n int64, long bool, err error) {
	for {
		part, err := in.ReadSlice('\n')
		n += int64(len(part))
		if !long {
			line = append(line, part...)
		}
		if len(line) > maxLine {
			line, long = nil, true
		}
		switch {
		case err == nil:
			return bytes.TrimSuffix(line, []byte("\n")), n, long, nil
		case !errors.Is(err, bufio.ErrBufferFull):
			return nil, n, long, err
		}
	}
}

// parseLine checks a line (without its end) and reads its head. why says what is
// wrong, or is "".
func parseLine(line []byte) (e entry, why string) {
	head := len(crcHead) + 8 + len(crcTail)
	if len(line) < head || string(line[:len(crcHead)]) != crcHead || string(line[head-len(crcTail):head]) != crcTail {
		return e, "no checksum"
	}
	// As text: in hex a flipped bit could change a letter's case and pass.
	if want := sum(line[head:]); string(line[len(crcHead):len(crcHead)+8]) != want {
		return e, "checksum " + fmt.Sprintf("%.8q", line[len(crcHead):len(crcHead)+8]) + " is not " + want
	}
	// Inside a JSON text a quote is escaped, so this is the first member "result".
	i := bytes.Index(line, []byte(`,"result":`))
	if i < 0 {
		return e, "no result"
	}
	if err := json.Unmarshal(append(line[:i:i], '}'), &e); err != nil {
		return e, "not JSON"
	}
	e.body = crc32.Checksum(line[i:], castagnoli)
	return e, ""
}

// read returns the record of an entry, checked once more.
func (e entry) read(f io.ReaderAt, path string) (Record, error) {
	line := make([]byte, e.len)
	if _, err := f.ReadAt(line, e.off); err != nil {
		return Record{}, fmt.Errorf("reading %s: %w", path, err)
	}
	if _, why := parseLine(line[:len(line)-1]); why != "" {
		return Record{}, fmt.Errorf("reading %s: the record of %s changed on disk: %s", path, e.Name, why)
	}
	var d onDisk
	if err := json.Unmarshal(line, &d); err != nil {
		return Record{}, oops.Inputf(path, e.Name, "use the version that wrote it, or another folder with --out", "a record that cannot be read: %v", err)
	}
	return Record{d.Schema, d.Key, d.Name, d.Index, d.Status, d.Error, d.Result}, nil
}
