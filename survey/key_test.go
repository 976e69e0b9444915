package survey

import (
	"encoding/json"
	"os"
	"path/filepath"
	"reflect"
	"regexp"
	"strings"
	"testing"
	"time"

	"lacuna/atomic"
	"lacuna/config"
)

const keySurvey = `[survey]
name = "s"
scale = "asplund2021"
line_table = "own.csv"
[defaults]
velocity = [-50, 45]
lines = ["Na D2"]
[[sightline]]
name = "Lantern 1"
hydrogen = {logN_HI = 21, logN_HI_err = 0.1, source = "Author 2001"}
spectrum = [{file = "a.fits"}]
[[sightline]]
name = "Lantern 2"
spectrum = [{file = "b.fits"}]
`

// ownLine is an invented change of a tabulated line.
func ownLine(f string) string {
	return "species,lambda_air_A,f,f_err,f_src\nNa I,5889.951," + f + ",0.01,Author 2001\n"
}

func surveyOf(t *testing.T, dir, text, lines string) (*config.Survey, *atomic.Table) {
	t.Helper()
	for name, b := range map[string]string{"s.toml": text, "own.csv": lines} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(b), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	cfg, err := config.Load(filepath.Join(dir, "s.toml"))
	if err != nil {
		t.Fatal(err)
	}
	tab, err := Tables(cfg.FSet, filepath.Join(dir, "own.csv"))
	if err != nil {
		t.Fatal(err)
	}
	return cfg, tab
}

func TestKeyChangesWithWhatNumbersDependOn(t *testing.T) {
	in := []Input{{Path: "a.fits", SHA256: strings.Repeat("0", 64), Size: 10}}
	key := func(text, lines string, in []Input) string {
		cfg, tab := surveyOf(t, t.TempDir(), text, lines)
		k, err := Key(cfg, cfg.Sightlines[0], in, tab)
		if err != nil {
			t.Fatal(err)
		}
		return k
	}
	base := key(keySurvey, ownLine("0.65"), in)
	if !regexp.MustCompile(`^[0-9a-f]{64}$`).MatchString(base) {
		t.Errorf("key %q", base)
	}
	if again := key(keySurvey, ownLine("0.65"), in); again != base {
		t.Error("the same survey in another folder has another key")
	}
	seen := map[string]string{base: "base"}
	sub := func(old, new string) string {
		if !strings.Contains(keySurvey, old) {
			t.Fatalf("no %q in the survey", old)
		}
		return strings.Replace(keySurvey, old, new, 1)
	}
	for name, k := range map[string]string{
		"window":   key(sub("[-50, 45]", "[-50, 46]"), ownLine("0.65"), in),
		"name":     key(sub("Lantern 1", "Lantern 3"), ownLine("0.65"), in),
		"scale":    key(sub("asplund2021", "asplund2009"), ownLine("0.65"), in),
		"frame":    key(sub("[survey]", "[survey]\nframe = \"barycentric\""), ownLine("0.65"), in),
		"air":      key(sub("[survey]", "[survey]\nair_formula = \"edlen1953\""), ownLine("0.65"), in),
		"seed":     key(sub("[survey]", "[survey]\nseed = 2"), ownLine("0.65"), in),
		"hydrogen": key(sub("logN_HI_err = 0.1", "logN_HI_err = 0.2"), ownLine("0.65"), in),
		"line":     key(keySurvey, ownLine("0.66"), in),
		"content":  key(keySurvey, ownLine("0.65"), []Input{{Path: "a.fits", SHA256: strings.Repeat("1", 64), Size: 10}}),
		"no input": key(keySurvey, ownLine("0.65"), nil),
	} {
		if other, twice := seen[k]; twice {
			t.Errorf("%s has the key of %s", name, other)
		}
		seen[k] = name
	}
	for name, text := range map[string]string{ // what is said elsewhere or by default changes nothing
		"another star":      sub("Lantern 2", "Lantern 9"),
		"a default spelt":   sub("[defaults]", "[defaults]\ndetection = 3"),
		"a name for people": sub(`name = "s"`, `name = "the survey"`),
		"alias of a line":   sub("Na D2", "Na I 5889.95"),
	} {
		if key(text, ownLine("0.65"), in) != base {
			t.Errorf("%s changes the key", name)
		}
	}
}

func TestManifest(t *testing.T) {
	dir := t.TempDir()
	cfg, _ := surveyOf(t, dir, keySurvey, ownLine("0.65"))
	one, two := star("Lantern 1", 0, "a", "x"), star("Lantern 2", 1, "b", "x")
	lineRow := Row{"lines", "Na I 5889.95 f", "0.65", "Author 2001", "user"}
	solarRow := Row{"solar", "asplund2021 Na", "6.22", "asplund2021", "memory"}
	one.Result.Rows = []Row{solarRow, lineRow}
	two.Result.Rows = []Row{lineRow}
	two.Result.Inputs = []Input{{Path: "b.fits", SHA256: "01", Size: 8}, one.Result.Inputs[0]}
	two.Status, two.Error = "failed", "no such order"
	at := time.Date(2001, 2, 3, 4, 5, 6, 0, time.FixedZone("", 3600))
	m, err := NewManifest(cfg, []Record{one, two}, RunInfo{Command: []string{"run", "s.toml"}, Started: at, Ended: at.Add(time.Minute), Notes: []string{"line 3 is damaged"}})
	if err != nil {
		t.Fatal(err)
	}
	if err := m.Write(dir); err != nil {
		t.Fatal(err)
	}
	b, err := os.ReadFile(filepath.Join(dir, ManifestName))
	if err != nil {
		t.Fatal(err)
	}
	var got Manifest
	if err := json.Unmarshal(b, &got); err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(got, m) {
		t.Errorf("read back %+v, wrote %+v", got, m)
	}
	if got.Started != "2001-02-03T03:05:06Z" || got.Ended != "2001-02-03T03:06:06Z" || got.Go == "" || got.Version == "" || got.JSchema != Schema || got.Sightlines != 2 {
		t.Errorf("%+v", got)
	}
	var paths []string
	for _, in := range got.Inputs {
		paths = append(paths, in.Path)
	}
	if want := []string{"own.csv", "a.fits", "b.fits"}; !reflect.DeepEqual(paths, want) {
		t.Errorf("inputs %v, want %v", paths, want)
	}
	if got.Config.Path != "s.toml" || got.Config.Size != int64(len(keySurvey)) || len(got.Config.SHA256) != 64 {
		t.Errorf("configuration %+v", got.Config)
	}
	if !reflect.DeepEqual(got.Rows, []Row{lineRow, solarRow}) || got.MemoryRows != 1 {
		t.Errorf("rows %v, %d from memory", got.Rows, got.MemoryRows)
	}
	if !reflect.DeepEqual(got.Failed, []string{"Lantern 2"}) || !reflect.DeepEqual(got.Notes, []string{"line 3 is damaged"}) {
		t.Errorf("failed %v, notes %v", got.Failed, got.Notes)
	}
	if !strings.Contains(got.Resolved, "detection = 3.0  # default") {
		t.Errorf("resolved:\n%s", got.Resolved)
	}
	var detection bool
	for _, d := range got.Defaults {
		detection = detection || d == config.Setting{Table: "sightline", Key: "detection", Value: "3.0", By: "default", Count: 2}
	}
	if !detection {
		t.Errorf("defaults %v", got.Defaults)
	}
}

// SHA-256 of "abc": FIPS 180-4, the first example of NIST's test vectors.
func TestInput(t *testing.T) {
	p := filepath.Join(t.TempDir(), "abc")
	if err := os.WriteFile(p, []byte("abc"), 0o644); err != nil {
		t.Fatal(err)
	}
	in, err := input(p, "abc")
	if want := (Input{"abc", "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad", 3}); err != nil || in != want {
		t.Errorf("got %+v, %v; want %+v", in, err, want)
	}
}

func TestManifestNothingHalfWritten(t *testing.T) {
	dir := t.TempDir()
	m := Manifest{Notes: []string{"\xff"}}
	if err := m.Write(dir); err == nil {
		t.Error("text that is not UTF-8 was written")
	}
	if err := (Manifest{}).Write(filepath.Join(dir, "none")); err == nil {
		t.Error("a folder that is not there")
	}
	if left, _ := os.ReadDir(dir); len(left) != 0 {
		t.Errorf("left behind: %v", left)
	}
}
