package main

import (
	"flag"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/internal/oops"
)

var update = flag.Bool("update", false, "rewrite the outputs shown in the manual")

// The manual is run, and the README after it: every line "$ lacuna …" of a
// ```console block, in order, in one folder for all pages. Output that a block shows is the output of the program,
// character by character; a line "…" stands for lines that are left out. Other
// forms in the pages:
//
//	$ cd DIR                     for the commands after it on the same page
//	$ lacuna …  # exit code 2    for a command that shows a mistake
//	<!-- file: NAME -->          the block that follows is written to NAME first
//
// go test ./cmd/lacuna -run Manual -update puts the true output in place of what is
// shown; where lines are left out it looks for those most like the ones shown.
func TestManual(t *testing.T) {
	root := check.Root(t)
	base := t.TempDir()
	demo(t)
	t.Chdir(base)
	ran := 0
	for _, page := range append(pages(t, filepath.Join(root, "docs")), filepath.Join(root, "README.md")) {
		t.Run(filepath.Base(page), func(t *testing.T) { ran += runPage(t, base, page) })
	}
	if ran < 20 {
		t.Errorf("only %d commands in the manual", ran)
	}
}

var link = regexp.MustCompile(`\]\(([a-z-]+\.md)\)`)

// pages are those of the manual: the index, what it links to in that order, and
// any that it forgot.
func pages(t *testing.T, dir string) []string {
	t.Helper()
	out := []string{filepath.Join(dir, "README.md")}
	for _, m := range link.FindAllStringSubmatch(read(t, out[0]), -1) {
		if p := filepath.Join(dir, m[1]); !slices.Contains(out, p) {
			out = append(out, p)
		}
	}
	all, err := filepath.Glob(filepath.Join(dir, "*.md"))
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range all {
		if !slices.Contains(out, p) {
			t.Errorf("the index does not link to %s", filepath.Base(p))
			out = append(out, p)
		}
	}
	return out
}

// A block is a fenced block of a page: lines[first:last] are inside the fences.
type block struct {
	kind, file  string
	first, last int
}

var fileMark = regexp.MustCompile(`^<!-- file: (\S+) -->$`)

func blocksOf(t *testing.T, lines []string) []block {
	t.Helper()
	var out []block
	file := ""
	for i := 0; i < len(lines); i++ {
		if m := fileMark.FindStringSubmatch(lines[i]); m != nil {
			file = m[1]
		}
		kind, ok := strings.CutPrefix(lines[i], "```")
		if !ok {
			continue
		}
		b := block{kind: kind, file: file, first: i + 1}
		for i++; i < len(lines) && lines[i] != "```"; i++ {
		}
		if i == len(lines) {
			t.Fatalf("the block of line %d has no end", b.first)
		}
		b.last, file = i, ""
		out = append(out, b)
	}
	return out
}

// runPage runs the commands of a page and returns how many there were.
func runPage(t *testing.T, base, page string) int {
	lines := strings.Split(read(t, page), "\n")
	dir, ran := base, 0
	var out []string // the page with true outputs
	done := 0
	for _, b := range blocksOf(t, lines) {
		if b.file != "" {
			write(t, base, b.file, strings.Join(lines[b.first:b.last], "\n")+"\n")
		}
		if b.kind != "console" {
			continue
		}
		out, done = append(out, lines[done:b.first]...), b.first
		for done < b.last {
			command, ok := strings.CutPrefix(lines[done], "$ ")
			if !ok {
				t.Fatalf("%s:%d: a console block begins with a command", filepath.Base(page), done+1)
			}
			at := done + 1
			out = append(out, lines[done])
			end := at
			for end < b.last && !strings.HasPrefix(lines[end], "$ ") {
				end++
			}
			shown := lines[at:end]
			done = end
			if to, ok := strings.CutPrefix(command, "cd "); ok {
				dir = filepath.Join(base, to)
				out = append(out, shown...)
				continue
			}
			t.Chdir(dir)
			said := shell(t, fmt.Sprintf("%s:%d", filepath.Base(page), at), command)
			t.Chdir(base)
			ran++
			if len(shown) == 0 {
				continue
			}
			if bad := differs(shown, said); bad != "" && *update {
				shown = renewed(shown, said)
			} else if bad != "" {
				t.Errorf("%s:%d: $ %s\n%s\nthe program prints\n%s", filepath.Base(page), at, command, bad, strings.Join(said, "\n"))
			}
			out = append(out, shown...)
		}
	}
	if out = append(out, lines[done:]...); *update && !slices.Equal(out, lines) {
		if err := os.WriteFile(page, []byte(strings.Join(out, "\n")), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return ran
}

var exitCode = regexp.MustCompile(` +# exit code (\d)$`)

// shell runs one command of the manual and returns what it prints, line by line.
func shell(t *testing.T, where, command string) []string {
	t.Helper()
	want := 0
	if m := exitCode.FindStringSubmatch(command); m != nil {
		want, _ = strconv.Atoi(m[1])
		command = strings.TrimSuffix(command, m[0])
	}
	args := words(t, command)
	var r result
	switch {
	case command == "lacuna demo": // run once for all tests
		if err := os.CopyFS("lantern", os.DirFS(demo(t))); err != nil {
			t.Fatal(err)
		}
		r = demoSaid
	case args[0] == "lacuna":
		r = lacuna(t, args[1:]...)
	case args[0] == "cat" && len(args) == 2:
		r.out = read(t, args[1])
	case args[0] == "ls" && len(args) == 2:
		entries, err := os.ReadDir(args[1])
		if err != nil {
			t.Fatal(err)
		}
		for _, e := range entries {
			r.out += e.Name() + "\n"
		}
	default:
		t.Fatalf("%s: $ %s: the manual's test cannot run this", where, command)
	}
	if r.code != want {
		t.Errorf("%s: $ %s: exit code %d, want %d\n%s", where, command, r.code, want, r.err)
	}
	return strings.Split(strings.TrimRight(r.out+r.err, "\n"), "\n")
}

const leftOut = "…"

// chunks are the runs of lines between the marks of what is left out.
func chunks(shown []string) [][]string {
	out := [][]string{nil}
	for _, l := range shown {
		if strings.TrimSpace(l) == leftOut {
			out = append(out, nil)
			continue
		}
		out[len(out)-1] = append(out[len(out)-1], l)
	}
	return out
}

// differs says where what is shown is not what the program prints, or "".
func differs(shown, said []string) string {
	at := 0
	parts := chunks(shown)
	for k, part := range parts {
		first, last := k == 0, k == len(parts)-1
		switch {
		case last && first:
			if !slices.Equal(part, said) {
				return "shows something else"
			}
			return ""
		case first:
			if len(said) < len(part) || !slices.Equal(part, said[:len(part)]) {
				return "begins otherwise than\n" + strings.Join(part, "\n")
			}
			at = len(part)
			continue
		case last:
			if len(said)-at < len(part) || !slices.Equal(part, said[len(said)-len(part):]) {
				return "ends otherwise than\n" + strings.Join(part, "\n")
			}
			return ""
		}
		found := -1
		for i := at; i+len(part) <= len(said); i++ {
			if slices.Equal(part, said[i:i+len(part)]) {
				found = i
				break
			}
		}
		if found < 0 {
			return "does not have, in this place,\n" + strings.Join(part, "\n")
		}
		at = found + len(part)
	}
	return ""
}

// renewed is what is shown with the true lines in place of those most like them.
func renewed(shown, said []string) []string {
	parts := chunks(shown)
	if len(parts) == 1 {
		return said
	}
	var out []string
	at := 0
	for k, part := range parts {
		if k > 0 {
			out = append(out, leftOut)
		}
		n := min(len(part), len(said)-at)
		best := at
		switch k {
		case 0:
		case len(parts) - 1:
			best = len(said) - n
		default:
			least := 1 << 30
			for i := at; i+n <= len(said); i++ {
				d := 0
				for j := range n {
					d += unlike(part[j], said[i+j])
				}
				if d < least {
					least, best = d, i
				}
			}
		}
		out = append(out, said[best:best+n]...)
		at = best + n
	}
	return out
}

// unlike counts the words of a line that another does not have, numbers less than
// others.
func unlike(a, b string) int {
	have := strings.Fields(b)
	d := 0
	for _, w := range strings.Fields(a) {
		switch {
		case slices.Contains(have, w):
		case strings.ContainsAny(w, "0123456789"):
			d++
		default:
			d += 5
		}
	}
	return d
}

// Links between the pages, and from the README, lead somewhere, headings included.
func TestManualLinks(t *testing.T) {
	root := check.Root(t)
	any := regexp.MustCompile(`\]\(([^)#:\s]*)(#[^)\s]*)?\)`)
	files, err := filepath.Glob(filepath.Join(root, "docs", "*.md"))
	if err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"README.md", "DEVELOPERS.md", "CHANGELOG.md"} {
		if _, err := os.Stat(filepath.Join(root, name)); err == nil {
			files = append(files, filepath.Join(root, name))
		}
	}
	for _, f := range files {
		for _, m := range any.FindAllStringSubmatch(read(t, f), -1) {
			to := f
			if m[1] != "" {
				to = filepath.Join(filepath.Dir(f), filepath.FromSlash(m[1]))
			}
			if _, err := fs.Stat(os.DirFS(filepath.Dir(to)), filepath.Base(to)); err != nil {
				t.Errorf("%s links to %s, which is not there", filepath.Base(f), m[1])
				continue
			}
			if m[2] != "" && !slices.Contains(anchors(read(t, to)), m[2][1:]) {
				near := oops.Nearest(m[2][1:], anchors(read(t, to)), 1)
				t.Errorf("%s links to %s%s: no such heading (%v)", filepath.Base(f), m[1], m[2], near)
			}
		}
	}
}

// anchors are the names that headings get where Markdown is shown.
func anchors(text string) []string {
	var out []string
	for line := range strings.Lines(text) {
		if title, ok := strings.CutPrefix(strings.TrimLeft(line, "#"), " "); ok && strings.HasPrefix(line, "#") {
			title = strings.ToLower(strings.TrimSpace(title))
			out = append(out, strings.ReplaceAll(regexp.MustCompile(`[^\p{L}\p{N} _-]`).ReplaceAllString(title, ""), " ", "-"))
		}
	}
	return out
}
