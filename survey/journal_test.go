package survey

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"syscall"
	"testing"
	"time"

	"lacuna/internal/oops"
	"lacuna/measure"
)

// star makes a record; its numbers are invented.
func star(name string, index int, key string, warning string) Record {
	return Record{
		Schema: Schema, Key: strings.Repeat(key, 64)[:64], Name: name, Index: index, Status: "done",
		Result: Result{Scale: "asplund2021", Warnings: []string{warning}, Inputs: []Input{{Path: "a.fits", SHA256: "00", Size: 7}}},
	}
}

func open(t *testing.T, dir string) *Journal {
	t.Helper()
	j, err := OpenJournal(dir)
	if err != nil {
		t.Fatal(err)
	}
	return j
}

func fill(t *testing.T, dir string, records ...Record) []byte {
	t.Helper()
	j := open(t, dir)
	for _, r := range records {
		if err := j.Append(r); err != nil {
			t.Fatal(err)
		}
	}
	if err := j.Close(); err != nil {
		t.Fatal(err)
	}
	b, err := os.ReadFile(filepath.Join(dir, JournalName))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func names(records []Record) string {
	var out []string
	for _, r := range records {
		out = append(out, r.Name+"="+r.Result.Warnings[0])
	}
	return strings.Join(out, " ")
}

func TestJournalKeepsTheLastRecordInTheOrderOfTheSurvey(t *testing.T) {
	dir := t.TempDir()
	fill(t, dir, star("Lantern 3", 2, "c", "x"), star("Lantern 1", 0, "a", "old"), star("Lantern 2", 1, "b", "x"), star("Lantern 1", 0, "d", "new"))
	got, damage, err := ReadJournal(dir)
	if err != nil || damage != nil {
		t.Fatal(err, damage)
	}
	if want := "Lantern 1=new Lantern 2=x Lantern 3=x"; names(got) != want {
		t.Errorf("got %s, want %s", names(got), want)
	}
	if want := star("Lantern 3", 2, "c", "x"); !reflect.DeepEqual(got[2], want) {
		t.Errorf("got %+v, want %+v", got[2], want)
	}
}

func TestJournalHasFinishedRecordsOnly(t *testing.T) {
	dir := t.TempDir()
	failed := star("Lantern 2", 1, "b", "x")
	failed.Status, failed.Error = "failed", "no such file"
	fill(t, dir, star("Lantern 1", 0, "a", "x"), failed)
	j := open(t, dir)
	defer j.Close()
	if r, ok := j.Have(strings.Repeat("a", 64)); !ok || r.Name != "Lantern 1" {
		t.Errorf("the finished record: %v, %v", r, ok)
	}
	if _, ok := j.Have(strings.Repeat("b", 64)); ok {
		t.Error("a failed record counts as done")
	}
	before := j.size
	if err := j.Append(star("Lantern 1", 0, "a", "x")); err != nil || j.size != before {
		t.Errorf("the same record was written twice (%v)", err)
	}
	if err := j.Append(star("Lantern 1", 5, "a", "x")); err != nil || j.size == before {
		t.Errorf("a record at another place of the survey was not written (%v)", err)
	}
}

// The bytes of a line as engineering practice asks: the sum is CRC-32C (check
// value of the CRC catalogue: "123456789" gives e3069283) over what follows it.
func TestJournalLine(t *testing.T) {
	if got := sum([]byte("123456789")); got != "e3069283" {
		t.Fatalf("CRC-32C of the check string is %s", got)
	}
	b := fill(t, t.TempDir(), star("a <b> \"c\",\"result\":{} \u2028", 0, "a", "\ufffd"))
	if !bytes.HasPrefix(b, []byte(`{"crc":"`)) || !bytes.Contains(b[:30], []byte(`,"key":"aaaa`)) || bytes.Count(b, []byte("\n")) != 1 {
		t.Fatalf("line %s", b)
	}
	if !json.Valid(b) {
		t.Error("a line is not JSON")
	}
	e, why := parseLine(bytes.TrimSpace(b))
	if why != "" || e.Name != "a <b> \"c\",\"result\":{} \u2028" {
		t.Errorf("%+v %s", e, why)
	}
}

func TestJournalTornAtEveryByte(t *testing.T) {
	whole := fill(t, t.TempDir(), star("Lantern 1", 0, "a", "x"), star("Lantern 2", 1, "b", "y"))
	first := bytes.IndexByte(whole, '\n') + 1
	for n := 0; n <= len(whole); n++ {
		dir := t.TempDir()
		path := filepath.Join(dir, JournalName)
		if err := os.WriteFile(path, whole[:n], 0o644); err != nil {
			t.Fatal(err)
		}
		keep := 0
		switch {
		case n == len(whole):
			keep = n
		case n >= first:
			keep = first
		}
		j := open(t, dir)
		if j.size != int64(keep) || len(j.Damage()) != 0 {
			t.Fatalf("torn at %d: size %d, want %d; damage %v", n, j.size, keep, j.Damage())
		}
		for i, name := range []string{"Lantern 1", "Lantern 2"} {
			r := star(name, i, string("ab"[i]), string("xy"[i]))
			if _, ok := j.Have(r.Key); !ok {
				if err := j.Append(r); err != nil {
					t.Fatal(err)
				}
			}
		}
		if err := j.Close(); err != nil {
			t.Fatal(err)
		}
		if got, _ := os.ReadFile(path); !bytes.Equal(got, whole) {
			t.Fatalf("torn at %d and mended: the journal differs", n)
		}
	}
}

// Every flipped bit of whole lines is seen: the record is lost to damage or the
// schema is refused, and no other record changes. Only the very last line end
// turns a line into a torn one.
func TestJournalSeesEveryFlippedBit(t *testing.T) {
	r1, r2 := star("Lantern 1", 0, "a", "x"), star("Lantern 2", 1, "b", "y")
	whole := fill(t, t.TempDir(), r1, r2)
	for i := range whole {
		for bit := range 8 {
			b := bytes.Clone(whole)
			b[i] ^= 1 << bit
			x, err := scan(bytes.NewReader(b), "flip")
			if err != nil {
				t.Fatalf("byte %d bit %d: %v", i, bit, err)
			}
			if len(x.entries) > 1 {
				t.Fatalf("byte %d bit %d passed", i, bit)
			}
			if len(x.damage) == 0 && x.torn == 0 {
				t.Fatalf("byte %d bit %d: nothing said", i, bit)
			}
			for _, e := range x.entries {
				got, err := e.read(bytes.NewReader(b), "flip")
				want := map[string]Record{"Lantern 1": r1, "Lantern 2": r2}[e.Name]
				if err != nil || !reflect.DeepEqual(got, want) {
					t.Fatalf("byte %d bit %d: %v, %v", i, bit, got, err)
				}
			}
		}
	}
}

func TestJournalNeverCutsDamage(t *testing.T) {
	dir := t.TempDir()
	b := fill(t, dir, star("Lantern 1", 0, "a", "x"), star("Lantern 2", 1, "b", "y"))
	b[100] ^= 1
	path := filepath.Join(dir, JournalName)
	if err := os.WriteFile(path, b, 0o644); err != nil {
		t.Fatal(err)
	}
	j := open(t, dir)
	if d := j.Damage(); len(d) != 1 || !strings.HasPrefix(d[0], "line 1 is damaged (checksum") {
		t.Errorf("damage %v", d)
	}
	if _, ok := j.Have(star("", 0, "a", "").Key); ok {
		t.Error("a damaged record counts as done")
	}
	if err := j.Append(star("Lantern 1", 0, "a", "x")); err != nil {
		t.Fatal(err)
	}
	if err := j.Close(); err != nil {
		t.Fatal(err)
	}
	now, _ := os.ReadFile(path)
	if !bytes.HasPrefix(now, b) {
		t.Error("the damaged line is gone")
	}
	got, _, err := ReadJournal(dir)
	if err != nil || names(got) != "Lantern 1=x Lantern 2=y" {
		t.Errorf("%s, %v", names(got), err)
	}
}

func TestJournalOfAnotherSchema(t *testing.T) {
	dir := t.TempDir()
	fill(t, dir, star("Lantern 1", 0, "a", "x"))
	r := star("Lantern 2", 1, "b", "x")
	r.Schema = Schema + 1
	line, err := encode(r)
	if err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(dir, JournalName)
	b, _ := os.ReadFile(path)
	if err := os.WriteFile(path, append(b, line...), 0o644); err != nil {
		t.Fatal(err)
	}
	_, err = OpenJournal(dir)
	if !oops.IsInput(err) || !strings.Contains(err.Error(), "line 2") || !strings.Contains(err.Error(), "another folder") {
		t.Errorf("got %v", err)
	}
	if j, err2 := OpenJournal(dir); err2 == nil || err2.Error() != err.Error() {
		t.Errorf("the lock is not let go after an error: %v, %v", j, err2)
	}
}

func TestJournalRefusesWhatJSONWouldChange(t *testing.T) {
	j := open(t, t.TempDir())
	defer j.Close()
	bad := star("Lantern 1", 0, "a", "x")
	bad.Result.Widths = []measure.Width{{Line: "Na I 5889.95", F: math.NaN()}}
	if err := j.Append(bad); err == nil || !strings.Contains(err.Error(), "Lantern 1") {
		t.Errorf("NaN: %v", err)
	}
	for _, s := range []string{"\xff", `\` + "\xff", `\\` + "\xff"} {
		if err := j.Append(star("Lantern 1", 0, "a", s)); err == nil || !strings.Contains(err.Error(), "UTF-8") {
			t.Errorf("%q: %v", s, err)
		}
	}
	for _, s := range []string{`\ufffd`, "\ufffd", `\\ufffd`} {
		if err := j.Append(star("Lantern 1", 0, "a", s)); err != nil {
			t.Errorf("%q: %v", s, err)
		}
	}
}

func TestJournalNotesTwoResultsOfOneInput(t *testing.T) {
	dir := t.TempDir()
	fill(t, dir, star("Lantern 1", 0, "a", "x"), star("Lantern 1", 0, "a", "y"))
	_, damage, err := ReadJournal(dir)
	if err != nil || len(damage) != 1 || !strings.Contains(damage[0], "please report") {
		t.Errorf("%v, %v", damage, err)
	}
}

func TestJournalLock(t *testing.T) {
	dir := t.TempDir()
	j := open(t, dir)
	_, err := OpenJournal(dir)
	if !oops.IsInput(err) || !strings.Contains(err.Error(), fmt.Sprintf("process %d", os.Getpid())) {
		t.Errorf("a second run in the folder: %v", err)
	}
	if err := j.Close(); err != nil {
		t.Fatal(err)
	}
	k := open(t, dir)
	if err := j.Close(); err != nil { // must not touch the other's lock
		t.Error(err)
	}
	if _, err := OpenJournal(dir); err == nil {
		t.Error("closing twice broke the next lock")
	}
	if err := j.Append(star("Lantern 1", 0, "a", "x")); err == nil {
		t.Error("a closed journal takes records")
	}
	k.Close()
	if err := os.WriteFile(filepath.Join(dir, LockName), []byte("host elsewhere process 1 since 2026-01-01T00:00:00Z\n"), 0o644); err != nil {
		t.Fatal(err)
	}
	if _, err = OpenJournal(dir); !oops.IsInput(err) || !strings.Contains(err.Error(), "elsewhere") || !strings.Contains(err.Error(), "delete "+LockName) {
		t.Errorf("a lock of another host: %v", err)
	}
}

func TestJournalInAFolderThatIsNotThere(t *testing.T) {
	if _, err := OpenJournal(filepath.Join(t.TempDir(), "none")); err == nil || oops.IsInput(err) {
		t.Errorf("got %v, want an error of the file system", err)
	}
	if _, _, err := ReadJournal(t.TempDir()); !oops.IsInput(err) {
		t.Errorf("got %v, want the user's mistake", err)
	}
}

// badFile writes only so many bytes of its file, then fails as a full disk does.
type badFile struct {
	*os.File
	room  int64
	stuck bool // cutting back fails too
	syncs int
	fail  error // of Sync
}

func (b *badFile) WriteAt(p []byte, off int64) (int, error) {
	if off+int64(len(p)) <= b.room {
		return b.File.WriteAt(p, off)
	}
	n := max(b.room-off, 0)
	b.File.WriteAt(p[:n], off)
	return int(n), syscall.ENOSPC
}

func (b *badFile) Truncate(n int64) error {
	if b.stuck {
		return syscall.EIO
	}
	return b.File.Truncate(n)
}

func (b *badFile) Sync() error { b.syncs++; return b.fail }

func TestJournalOnAFullDisk(t *testing.T) {
	one, err := encode(star("Lantern 1", 0, "a", "x"))
	if err != nil {
		t.Fatal(err)
	}
	for room := len(one); room < 2*len(one); room += 7 {
		dir := t.TempDir()
		j := open(t, dir)
		j.f = &badFile{File: j.f.(*os.File), room: int64(room)}
		if err := j.Append(star("Lantern 1", 0, "a", "x")); err != nil {
			t.Fatal(err)
		}
		if err := j.Append(star("Lantern 2", 1, "b", "y")); !errors.Is(err, syscall.ENOSPC) {
			t.Fatalf("room %d: %v", room, err)
		}
		if err := j.Close(); err != nil {
			t.Fatal(err)
		}
		got, err := os.ReadFile(filepath.Join(dir, JournalName))
		if err != nil || !bytes.Equal(got, one) {
			t.Fatalf("room %d: %d bytes left, want %d (%v)", room, len(got), len(one), err)
		}
	}
	j := open(t, t.TempDir())
	j.f = &badFile{File: j.f.(*os.File), room: 10, stuck: true}
	first := j.Append(star("Lantern 1", 0, "a", "x"))
	if second := j.Append(star("Lantern 2", 1, "b", "y")); first == nil || second == nil || second.Error() != first.Error() {
		t.Errorf("a journal that cannot be cut back goes on: %v, %v", first, second)
	}
	if err := j.Close(); err == nil {
		t.Error("Close forgets the error")
	}
}

func TestJournalSync(t *testing.T) {
	j := open(t, t.TempDir())
	b := &badFile{File: j.f.(*os.File), room: 1 << 20}
	j.f = b
	for i := range 5 {
		if err := j.Append(star(fmt.Sprintf("Lantern %d", i), i, "a", "x")); err != nil {
			t.Fatal(err)
		}
	}
	if !j.timer.Stop() { // it must be waiting
		t.Error("no sync is due")
	}
	if err := j.Close(); err != nil || b.syncs != 1 {
		t.Errorf("%d syncs at the end, want 1 (%v)", b.syncs, err)
	}

	j = open(t, t.TempDir())
	b = &badFile{File: j.f.(*os.File), room: 1 << 20, fail: syscall.EIO}
	j.f = b
	if err := j.Append(star("Lantern 1", 0, "a", "x")); err != nil {
		t.Fatal(err)
	}
	j.timer.Reset(0)
	for j.mu.Lock(); j.pending; j.mu.Lock() {
		j.mu.Unlock()
		time.Sleep(time.Millisecond)
	}
	j.mu.Unlock()
	if err := j.Append(star("Lantern 2", 1, "b", "x")); !errors.Is(err, syscall.EIO) {
		t.Errorf("after a failed sync: %v", err)
	}
	if err := j.Close(); !errors.Is(err, syscall.EIO) {
		t.Errorf("Close: %v", err)
	}
}

func TestReadLineLong(t *testing.T) {
	// Longer than any buffer, as the line of a sightline with many profiles is.
	r := star("Lantern 1", 0, "a", strings.Repeat("long ", 1<<18))
	dir := t.TempDir()
	fill(t, dir, r)
	got, _, err := ReadJournal(dir)
	if err != nil || !reflect.DeepEqual(got[0], r) {
		t.Errorf("a line of 1.3 MB: %v", err)
	}
}

func FuzzScan(f *testing.F) {
	for _, r := range []Record{star("Lantern 1", 0, "a", "x"), star("Lantern 2", 1, "b", "y")} {
		line, err := encode(r)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(line)
		f.Add(line[:len(line)-1])
		f.Add(append(bytes.Repeat([]byte{0}, 50), line...))
	}
	tail := []byte(`"schema":1,"result":{}}`)
	f.Add([]byte(`{"crc":"` + sum(tail) + `",` + string(tail) + "\n"))
	f.Fuzz(func(t *testing.T, b []byte) {
		x, err := scan(bytes.NewReader(b), "fuzz")
		if err != nil {
			if !oops.IsInput(err) {
				t.Fatal(err)
			}
			return
		}
		if x.size+x.torn != int64(len(b)) || len(x.entries)+len(x.damage) < x.lines {
			t.Fatalf("bytes or lines unaccounted for: %+v", x)
		}
		for _, e := range x.latest() {
			if _, err := e.read(bytes.NewReader(b), "fuzz"); err != nil && !oops.IsInput(err) {
				t.Fatal(err)
			}
		}
	})
}

func BenchmarkScan(b *testing.B) {
	var all bytes.Buffer
	for i := range 1000 {
		line, err := encode(star(fmt.Sprintf("Lantern %d", i), i, "a", strings.Repeat("x", 3000)))
		if err != nil {
			b.Fatal(err)
		}
		all.Write(line)
	}
	b.SetBytes(int64(all.Len()))
	for b.Loop() {
		if _, err := scan(io.Reader(bytes.NewReader(all.Bytes())), "b"); err != nil {
			b.Fatal(err)
		}
	}
}
