package main

import (
	"bytes"
	"context"
	"fmt"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"sync"
	"testing"
	"unicode/utf8"
)

// What the program did: exit code, standard output, standard error.
type result struct {
	code     int
	out, err string
}

// lacuna runs the program.
func lacuna(t testing.TB, args ...string) result {
	t.Helper()
	return lacunaIn(context.Background(), t, args...)
}

func lacunaIn(ctx context.Context, t testing.TB, args ...string) result {
	t.Helper()
	var out, err bytes.Buffer
	code := run(ctx, append([]string{"lacuna"}, args...), &out, &err)
	return result{code, out.String(), err.String()}
}

// works runs the program and expects success, and text that is fit to be read.
func works(t testing.TB, args ...string) string {
	t.Helper()
	r := lacuna(t, args...)
	if r.code != 0 {
		t.Fatalf("lacuna %s: exit code %d\n%s", strings.Join(args, " "), r.code, r.err)
	}
	if r.err != "" {
		t.Errorf("lacuna %s: success, yet on standard error:\n%s", strings.Join(args, " "), r.err)
	}
	readable(t, args, r.out)
	return r.out
}

// untidy are signs of a number or a word that went wrong on its way to the page.
var untidy = regexp.MustCompile(`NaN|[+-]?Inf\b|%!|(^|\s)0 ± 0(\s|$)|± 0\.0*(\s|$)|\b1 (lines|orders|pixels|sightlines|parts)\b|<nil>|\bUNKNOWN\b|--? km/s`)

// readable checks a text for escape codes, its width, and untidy numbers.
func readable(t testing.TB, args []string, text string) {
	t.Helper()
	asJSON := false
	for _, a := range args {
		asJSON = asJSON || a == "--json"
	}
	if strings.ContainsRune(text, '\x1b') {
		t.Errorf("lacuna %s: escape codes, though the output is no terminal", strings.Join(args, " "))
	}
	if asJSON {
		return
	}
	for line := range strings.Lines(text) {
		line = strings.TrimRight(line, "\n")
		if n := utf8.RuneCountInString(line); n > 100 && args[0] != "completion" && !strings.Contains(line, string(filepath.Separator)) {
			t.Errorf("lacuna %s: %d columns: %s", strings.Join(args, " "), n, line)
		}
		if strings.TrimRight(line, " ") != line {
			t.Errorf("lacuna %s: blanks at the end of %q", strings.Join(args, " "), line)
		}
		if bad := untidy.FindString(line); bad != "" {
			t.Errorf("lacuna %s: %q in %q", strings.Join(args, " "), bad, line)
		}
	}
}

// mistake runs the program and expects an exit code, and one line on standard
// error alone that holds every one of the words.
func mistake(t testing.TB, code int, words []string, args ...string) {
	t.Helper()
	r := lacuna(t, args...)
	what := "lacuna " + strings.Join(args, " ")
	if r.code != code {
		t.Errorf("%s: exit code %d, want %d", what, r.code, code)
	}
	if r.out != "" {
		t.Errorf("%s: a mistake, yet on standard output:\n%s", what, r.out)
	}
	if strings.Count(r.err, "\n") != 1 || !strings.HasPrefix(r.err, "lacuna: ") {
		t.Errorf("%s: want one line that begins with lacuna:, got\n%s", what, r.err)
	}
	for _, w := range words {
		if !strings.Contains(r.err, w) {
			t.Errorf("%s: no %q in\n%s", what, w, r.err)
		}
	}
}

var (
	demoOnce sync.Once
	demoDir  string // folder of the shared demo; tests read it only
	demoSaid result
)

const testLocale = "C.UTF-8"

// demo runs the demo once for all tests and returns its folder.
func demo(t testing.TB) string {
	t.Helper()
	demoOnce.Do(func() { // in the folder above, by its own default, as in the manual
		here, err := os.Getwd()
		if err != nil {
			t.Fatal(err)
		}
		if err := os.Chdir(filepath.Dir(demoDir)); err != nil {
			t.Fatal(err)
		}
		// Whichever test comes first, also one that sets another locale.
		locale := os.Getenv("LC_ALL")
		os.Setenv("LC_ALL", testLocale)
		demoSaid = lacuna(t, "demo")
		os.Setenv("LC_ALL", locale)
		if err := os.Chdir(here); err != nil {
			t.Fatal(err)
		}
	})
	if demoSaid.code != 0 {
		t.Fatalf("the demo failed:\n%s", demoSaid.err)
	}
	return demoDir
}

func TestMain(m *testing.M) {
	// What is printed must not depend on the terminal of whoever runs the tests.
	os.Setenv("LC_ALL", testLocale)
	dir, err := os.MkdirTemp("", "lacuna-test-")
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		os.Exit(1)
	}
	demoDir = filepath.Join(dir, "lantern")
	code := m.Run()
	os.RemoveAll(dir)
	os.Exit(code)
}

// write writes a file into a folder and returns its path.
func write(t testing.TB, dir, name, text string) string {
	t.Helper()
	path := filepath.Join(dir, name)
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

func read(t testing.TB, path string) string {
	t.Helper()
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return string(b)
}

// names lists the files below a folder, by their paths in it.
func names(t testing.TB, dir string) []string {
	t.Helper()
	var out []string
	err := filepath.WalkDir(dir, func(path string, d os.DirEntry, err error) error {
		if err == nil && !d.IsDir() {
			rel, _ := filepath.Rel(dir, path)
			out = append(out, filepath.ToSlash(rel))
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// spectra returns a new folder with links to the spectra of the demo.
func spectra(t testing.TB) string {
	t.Helper()
	dir := t.TempDir()
	for _, name := range []string{"lantern1_blue.fits", "lantern1_red.fits", "lantern2_blue.fits", "lantern2_red.fits", "lantern3_uv.fits"} {
		if err := os.Symlink(filepath.Join(demo(t), name), filepath.Join(dir, name)); err != nil {
			t.Fatal(err)
		}
	}
	return dir
}
