package main

import (
	"io"
	"os"
	"os/exec"
	"regexp"
	"slices"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/survey"
)

func commands() []string {
	var out []string
	for _, c := range newApp(io.Discard, io.Discard).Commands {
		out = append(out, c.Name)
	}
	return out
}

var option = regexp.MustCompile(`--[a-z][a-z-]*`)

// The help of every command has an example whose command and options exist, and
// explains each option.
func TestHelpOfEveryCommand(t *testing.T) {
	for _, name := range commands() {
		text := works(t, "help", name)
		if name != "help" { // help --help explains the program
			for _, o := range []string{"--help", "-h"} {
				if got := works(t, name, o); got != text {
					t.Errorf("lacuna %s %s differs from lacuna help %s", name, o, name)
				}
			}
		}
		_, options, ok := strings.Cut(text, "\nOptions:\n")
		if !ok {
			t.Errorf("%s: no options in its help", name)
		}
		_, example, ok := strings.Cut(text, "Example: lacuna "+name)
		if !ok {
			t.Errorf("%s: no example in its help", name)
			continue
		}
		example, _, _ = strings.Cut(strings.ReplaceAll(example, " \\\n", " "), "\n")
		for _, o := range option.FindAllString(example, -1) {
			if !regexp.MustCompile(`(?m)^  (-h, )?` + o + `\b`).MatchString(options) {
				t.Errorf("%s: its example uses %s, which is not among its options", name, o)
			}
		}
	}
}

func TestHelpOfTheProgram(t *testing.T) {
	text := works(t, "--help")
	for _, other := range [][]string{{}, {"-h"}, {"help"}} {
		r := lacuna(t, other...)
		if r.code != 0 || r.out != text {
			t.Errorf("lacuna %v does not print the help", other)
		}
	}
	for _, name := range commands() {
		if !strings.Contains(text, "\n  "+name+" ") {
			t.Errorf("the help does not list %s", name)
		}
	}
}

func TestVersion(t *testing.T) {
	for _, o := range []string{"--version", "-v"} {
		if got := works(t, o); got != "lacuna "+survey.Version()+"\n" || !strings.Contains(got, survey.Release) {
			t.Errorf("lacuna %s prints %q", o, got)
		}
	}
}

func TestWrongWords(t *testing.T) {
	for _, tc := range []struct {
		args  string
		words []string
	}{
		{"rnu survey.toml", []string{`no command "rnu"`, "did you mean lacuna run?"}},
		{"help rnu", []string{`no command "rnu"`, "did you mean lacuna run?"}},
		{"xyzzyx", []string{`no command "xyzzyx"`, "lacuna --help"}},
		{"run s.toml --onyl x", []string{"no option --onyl", "did you mean --only?", "lacuna run --help"}},
		{"--workers 2 run s.toml", []string{"no option --workers", "stand after the command"}},
		{"run", []string{"no survey file given", "lacuna run --help"}},
		{"run a.toml b.toml", []string{"one survey file wanted, 2 given (a.toml b.toml)"}},
		{"run s.toml --out", []string{"--out needs a value"}},
		{"run --out --dry-run s.toml", []string{"--out needs a value"}},
		{"run --out a --out b s.toml", []string{"--out is given twice"}},
		{"run --workers two s.toml", []string{`--workers "two" is not a whole number`}},
		{"run --workers 99999999999999999999 s.toml", []string{"--workers", "is not a whole number"}},
		{"growth", []string{"no batch file given"}},
		{"deplete", []string{"no table given"}},
		{"inspect", []string{"no spectrum file given"}},
		{"measure", []string{"no spectrum file given"}},
		{"new", []string{"no folder given"}},
		{"demo x", []string{"demo takes options only", "--out names the folder"}},
		{"lines x", []string{"lines takes options only"}},
		{"lines --from x", []string{`--from "x" is not a number`}},
		{"lines --from nan", []string{`--from "nan" is not a number`}},
		{"lines --from -5", []string{"--from -5 is not above 0"}},
		{"lines --from 4000 --to 3000", []string{"--from 4000 is above --to 3000"}},
		{"lines --species Ca", []string{`no line of "Ca"`, "did you mean Ca I, Ca II?"}},
		{"lines --f-set nosuch", []string{`no set of f-values "nosuch"`, "the sets are default"}},
		{"lines --line-table nosuch.csv", []string{"nosuch.csv", "cannot be opened"}},
		{"completion", []string{"no shell given"}},
		{"completion tcsh", []string{`no completion for "tcsh"`, "bash, zsh or fish"}},
		{"deplete nosuch.csv --scale asplund2021", []string{"nosuch.csv", "check the path"}},
		{"run nosuch.toml", []string{"nosuch.toml: no such file", "lacuna new"}},
		{"growth nosuch.toml", []string{"nosuch.toml: no such file"}},
		{"inspect nosuch.fits", []string{"nosuch.fits: there is no such file"}},
	} {
		mistake(t, 2, tc.words, strings.Fields(tc.args)...)
	}
}

// A name that begins with a dash is reached by "--" before it.
func TestAfterDoubleDash(t *testing.T) {
	mistake(t, 2, []string{"-odd.toml: no such file"}, "run", "--", "-odd.toml")
	mistake(t, 2, []string{"--dry-run: no such file"}, "run", "--dry-run", "--", "--dry-run")
}

func TestCompletionWords(t *testing.T) {
	for _, tc := range []struct {
		said string
		want string // of the words, those that matter
	}{
		{"", "demo new run measure growth deplete lines inspect completion help"},
		{"-", "--help --version"},
		{"run --", "--out --only --dry-run --fresh --workers --json --help"},
		{"run survey.toml --", "--out --only"},
		{"measure x.fits --medium", "air vacuum"},
		{"deplete t.csv --scale", "asplund2021 lodders2003"},
		{"lines --f-set", "default NIST"},
		{"completion", "bash zsh fish"},
		{"help", "run measure"},
	} {
		words := strings.Fields(works(t, append(strings.Fields(tc.said), completeWord)...))
		for _, w := range strings.Fields(tc.want) {
			if !slices.Contains(words, w) {
				t.Errorf("after %q: no %s among %v", tc.said, w, words)
			}
		}
	}
	for _, said := range []string{"run", "run survey.toml", "inspect a.fits", "run --out"} {
		if out := works(t, append(strings.Fields(said), completeWord)...); out != "" {
			t.Errorf("after %q, where a file is wanted: %q", said, out)
		}
	}
}

// Each shell reads its script without complaint, where the shell is there; bash
// must be. In bash the script completes.
func TestCompletionScripts(t *testing.T) {
	for _, shell := range []string{"bash", "zsh", "fish"} {
		script := works(t, "completion", shell)
		if _, err := exec.LookPath(shell); err != nil {
			if shell == "bash" {
				check.Missing(t, "no bash to try the completion with")
			}
			t.Logf("no %s here: its script is not tried", shell)
			continue
		}
		cmd := exec.Command(shell, "-n", write(t, t.TempDir(), "script", script))
		if out, err := cmd.CombinedOutput(); err != nil {
			t.Errorf("%s does not read its completion script: %v\n%s", shell, err, out)
		}
	}
	// A program that gives the words in place of ours shows what the script asks
	// for, and how it uses the answer.
	dir := t.TempDir()
	stub := write(t, dir, "lacuna", "#!/bin/sh\necho \"$*\" >> \""+dir+"/said\"\nprintf 'asplund2009\\nasplund2021\\nother\\n'\n")
	if err := os.Chmod(stub, 0o755); err != nil {
		t.Fatal(err)
	}
	script := write(t, dir, "try", works(t, "completion", "bash")+`
try() { COMP_WORDS=("$@"); COMP_CWORD=$(($#-1)); _lacuna; echo "${COMPREPLY[*]}"; }
try lacuna deplete --scale asp
try lacuna deplete --sc
`)
	cmd := exec.Command("bash", script)
	cmd.Env = append(os.Environ(), "PATH="+dir+":"+os.Getenv("PATH"))
	out, err := cmd.Output()
	if err != nil || string(out) != "asplund2009 asplund2021\n\n" {
		t.Errorf("bash completes to %q, %v", out, err)
	}
	if got, want := read(t, dir+"/said"), "deplete --scale "+completeWord+"\ndeplete --sc "+completeWord+"\n"; got != want {
		t.Errorf("bash asks\n%swant\n%s", got, want)
	}
}
