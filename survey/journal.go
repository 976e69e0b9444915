package survey

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"sort"
	"sync"
	"time"

	"lacuna/internal/oops"
)

// JournalName is the journal's file in a results folder.
const JournalName = "journal.jsonl"

// syncEvery is how long a record may wait for the disk: a kill of the process
// loses nothing that was written, a power cut may lose this much.
const syncEvery = time.Second

// A Journal is an append-only file of results, one line a record:
//
//	{"crc":"0a1b2c3d","key":"<64 hex>","schema":1,…,"result":{…}}
//
// crc is the CRC-32C of all bytes after its field. A sightline's last record
// counts. A last line without its end was torn by a crash and is cut off; a
// whole line whose sum is wrong is damage, which is named and computed again,
// and never removed.
type Journal struct {
	mu      sync.Mutex
	f       file
	lock    *os.File
	path    string
	size    int64
	idx     index
	pending bool // records wait for a sync
	timer   *time.Timer
	err     error // nothing more can be written
}

// file is what a journal needs of a file; tests put failing ones in its place.
type file interface {
	ReadAt(p []byte, off int64) (int, error)
	WriteAt(p []byte, off int64) (int, error)
	Truncate(size int64) error
	Sync() error
	Close() error
}

// OpenJournal opens the journal of a results folder for writing, or begins one,
// and holds the folder's lock until Close.
func OpenJournal(dir string) (*Journal, error) {
	lk, err := lock(dir, time.Now())
	if err != nil {
		return nil, err
	}
	path := filepath.Join(dir, JournalName)
	f, err := os.OpenFile(path, os.O_RDWR|os.O_CREATE, 0o644)
	if err != nil {
		return nil, firstOf(err, unlock(lk))
	}
	j := &Journal{f: f, lock: lk, path: path}
	if err := j.start(f); err != nil {
		f.Close()
		unlock(lk)
		return nil, err
	}
	return j, nil
}

// start indexes the journal and cuts off a torn last line.
func (j *Journal) start(f *os.File) error {
	idx, err := scan(f, j.path)
	if err != nil {
		return err
	}
	if idx.torn > 0 {
		if err := f.Truncate(idx.size); err != nil {
			return fmt.Errorf("cutting a torn line off %s: %w", j.path, err)
		}
	}
	j.idx, j.size = idx, idx.size
	return nil
}

// ReadJournal returns the last record of each sightline in a results folder, in
// the order of the survey, and what is wrong with the journal, for people.
func ReadJournal(dir string) ([]Record, []string, error) {
	path := filepath.Join(dir, JournalName)
	f, err := os.Open(path)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, nil, oops.Input(dir, "", "no "+JournalName+" here", "give the results folder of a run")
	}
	if err != nil {
		return nil, nil, err
	}
	defer f.Close()
	idx, err := scan(f, path)
	if err != nil {
		return nil, nil, err
	}
	var out []Record
	for _, e := range idx.latest() {
		r, err := e.read(f, path)
		if err != nil {
			return nil, nil, err
		}
		out = append(out, r)
	}
	return out, idx.damage, nil
}

// Damage says what was wrong with the journal when it was opened, and which
// sightlines gave two results from one input since.
func (j *Journal) Damage() []string {
	j.mu.Lock()
	defer j.mu.Unlock()
	return append([]string(nil), j.idx.damage...)
}

// Append writes one record, unless the same one is already the sightline's last.
// After an error the journal is as it was before.
func (j *Journal) Append(r Record) error {
	if r.Schema != Schema {
		panic(fmt.Sprintf("survey: Append: record of schema %d, this is %d", r.Schema, Schema))
	}
	line, err := encode(r)
	if err != nil {
		return err
	}
	j.mu.Lock()
	defer j.mu.Unlock()
	return j.append(line)
}

func (j *Journal) append(line []byte) error {
	if j.err != nil {
		return j.err
	}
	e, why := parseLine(line[:len(line)-1])
	if why != "" {
		panic("survey: Append: " + why)
	}
	if i, ok := j.idx.last[e.Name]; ok && j.idx.entries[i].same(e) {
		return nil
	}
	n, err := j.f.WriteAt(line, j.size)
	if err != nil || n < len(line) {
		if err == nil {
			err = errors.New("short write")
		}
		err = fmt.Errorf("writing to %s: %w", j.path, err)
		if terr := j.f.Truncate(j.size); terr != nil {
			j.err = fmt.Errorf("%w; and cutting back failed: %w", err, terr)
			return j.err
		}
		return err
	}
	e.off, e.len = j.size, len(line)
	j.size += int64(len(line))
	j.idx.add(e, j.idx.lines+1)
	j.idx.lines++
	if !j.pending {
		j.pending = true
		j.timer = time.AfterFunc(syncEvery, func() {
			j.mu.Lock()
			defer j.mu.Unlock()
			j.sync()
		})
	}
	return nil
}

// sync brings what was written to the disk. A failed sync ends the journal: what
// the system did with the data is not known.
func (j *Journal) sync() {
	if !j.pending {
		return
	}
	j.pending = false
	if err := j.f.Sync(); err != nil && j.err == nil {
		j.err = fmt.Errorf("syncing %s: %w", j.path, err)
	}
}

// Have returns the finished record with this key, if there is one: its sightline
// need not be computed again. Failed records are not returned, so that a run
// tries them once more.
func (j *Journal) Have(key string) (Record, bool) {
	j.mu.Lock()
	i, ok := j.idx.done[key]
	if !ok {
		j.mu.Unlock()
		return Record{}, false
	}
	e := j.idx.entries[i]
	j.mu.Unlock()
	r, err := e.read(j.f, j.path)
	if err != nil { // changed under our feet: compute it again
		return Record{}, false
	}
	return r, true
}

// Each calls f with the last record of each sightline, in the order of the
// survey, and stops at the first error.
func (j *Journal) Each(f func(Record) error) error {
	j.mu.Lock()
	list := j.idx.latest()
	j.mu.Unlock()
	for _, e := range list {
		r, err := e.read(j.f, j.path)
		if err != nil {
			return err
		}
		if err := f(r); err != nil {
			return err
		}
	}
	return nil
}

// Close syncs the journal and lets go of the folder. Closing it again does
// nothing and returns nil.
func (j *Journal) Close() error {
	j.mu.Lock()
	defer j.mu.Unlock()
	if j.lock == nil {
		return nil
	}
	lk := j.lock
	j.lock = nil
	if j.timer != nil {
		j.timer.Stop()
	}
	j.sync()
	err := firstOf(j.err, j.f.Close(), unlock(lk))
	if j.err == nil {
		j.err = fmt.Errorf("%s is closed", j.path)
	}
	return err
}

// onDisk is a Record in the order of a journal line: what an index needs first.
type onDisk struct {
	Key    string `json:"key"`
	Schema int    `json:"schema"`
	Name   string `json:"name"`
	Index  int    `json:"index"`
	Status string `json:"status"`
	Error  string `json:"error,omitempty"`
	Result Result `json:"result"`
}

// encode makes the journal line of a record, with its line end.
func encode(r Record) ([]byte, error) {
	body, err := json.Marshal(onDisk{r.Key, r.Schema, r.Name, r.Index, r.Status, r.Error, r.Result})
	if err != nil {
		return nil, fmt.Errorf("record of %q: %w", r.Name, err)
	}
	if replaced(body) {
		return nil, fmt.Errorf("record of %q: it holds text that is not UTF-8", r.Name)
	}
	rest := append(body[1:], '\n')
	return append([]byte(`{"crc":"`+sum(rest[:len(rest)-1])+`",`), rest...), nil
}

// replaced reports whether encoding/json put U+FFFD for bytes that are not
// UTF-8: it writes those as an escape, and a true U+FFFD as itself.
func replaced(body []byte) bool {
	for at := 0; ; {
		i := bytes.Index(body[at:], []byte(`\ufffd`))
		if i < 0 {
			return false
		}
		i += at
		slashes := 0
		for i-1-slashes >= 0 && body[i-1-slashes] == '\\' {
			slashes++
		}
		if slashes%2 == 0 {
			return true
		}
		at = i + 1
	}
}

// latest returns the last entry of each sightline by place in the survey, then name.
func (x *index) latest() []entry {
	out := make([]entry, 0, len(x.last))
	for i, e := range x.entries {
		if x.last[e.Name] == i {
			out = append(out, e)
		}
	}
	sort.Slice(out, func(a, b int) bool {
		if out[a].Index != out[b].Index {
			return out[a].Index < out[b].Index
		}
		return out[a].Name < out[b].Name
	})
	return out
}
