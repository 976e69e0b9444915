package main

import (
	"fmt"
	"io"
	"strings"

	"github.com/urfave/cli/v2"

	"lacuna/atomic"
)

// completeWord, as the last argument, asks which words may stand in its place.
// The library has such a thing too, but it reads os.Args and stops at file names.
const completeWord = "--complete-word"

func completionCommand() *cli.Command {
	return &cli.Command{
		Name: "completion", Usage: "print a shell completion script",
		ArgsUsage: "bash|zsh|fish",
		Description: `Prints a script by which the shell completes commands, options and some of their values.

Example: lacuna completion bash > ~/.local/share/bash-completion/completions/lacuna`,
		Action: func(c *cli.Context) error {
			shell, err := one(c, "shell")
			if err != nil {
				return err
			}
			script, ok := completions[shell]
			if !ok {
				return usage(c, "no completion for %q: bash, zsh or fish", shell)
			}
			_, err = io.WriteString(c.App.Writer, script)
			return err
		},
	}
}

// complete writes the words that may follow said (the arguments after the
// program's name), one a line; nothing where a file is wanted. The word being
// typed is the last of said where it begins with "-".
func complete(w io.Writer, app *cli.App, said []string) {
	var words []string
	last := ""
	if len(said) > 0 {
		last = said[len(said)-1]
	}
	var cmd *cli.Command
	for _, word := range said {
		if !strings.HasPrefix(word, "-") {
			cmd = app.Command(word)
			break
		}
	}
	switch {
	case cmd == nil && strings.HasPrefix(last, "-"):
		words = []string{"--help", "--version"}
	case cmd == nil && len(said) == 0, cmd != nil && cmd.Name == "help" && last == "help":
		for _, c := range app.Commands {
			words = append(words, c.Name)
		}
	case cmd == nil:
	case cmd.Name == "completion" && last == "completion":
		words = []string{"bash", "zsh", "fish"}
	case strings.HasPrefix(last, "-"):
		for _, f := range cmd.Flags {
			for _, n := range f.Names() {
				words = append(words, "--"+n)
				if _, isBool := f.(*cli.BoolFlag); !isBool && last == "--"+n {
					words = values(n)
					fmt.Fprint(w, lines(words))
					return
				}
			}
		}
		words = append(words, "--help")
	}
	fmt.Fprint(w, lines(words))
}

func lines(words []string) string {
	if len(words) == 0 {
		return ""
	}
	return strings.Join(words, "\n") + "\n"
}

// values are those of an option that takes one of a few words.
func values(option string) []string {
	switch option {
	case "medium":
		return []string{"air", "vacuum"}
	case "frame":
		return []string{"topocentric", "geocentric", "heliocentric", "barycentric", "LSRK", "LSRD", "source"}
	case "to":
		return []string{"heliocentric", "barycentric", "LSRK"}
	case "layout":
		return []string{"linear", "log10", "ln", "orders"}
	case "unit":
		return []string{"Angstrom", "nm", "um"}
	case "f-set":
		return atomic.Default().Sets()
	case "scale":
		var keys []string
		for _, s := range atomic.SolarScales() {
			keys = append(keys, s.Key)
		}
		return keys
	}
	return nil
}

// The scripts ask the program itself what may come next. The word being typed is
// passed on only where it begins with "-", because then options are wanted.
var completions = map[string]string{
	"bash": `_lacuna() {
	local cur="${COMP_WORDS[COMP_CWORD]}" IFS=$'\n'
	local said=( "${COMP_WORDS[@]:0:COMP_CWORD}" )
	[[ "$cur" == -* ]] && said+=( "$cur" )
	COMPREPLY=( $(compgen -W "$("${said[@]}" ` + completeWord + ` 2>/dev/null)" -- "$cur") )
	[ ${#COMPREPLY[@]} -gt 0 ] || COMPREPLY=( $(compgen -f -- "$cur") )
}
complete -o filenames -F _lacuna lacuna
`,
	"zsh": `#compdef lacuna
_lacuna() {
	local -a said opts
	said=("${(@)words[1,CURRENT-1]}")
	[[ "$PREFIX" == -* ]] && said+=("$PREFIX")
	opts=("${(@f)$("${said[@]}" ` + completeWord + ` 2>/dev/null)}")
	if [[ -n "${opts[1]}" ]]; then compadd -a opts; else _files; fi
}
if [[ "$funcstack[1]" == _lacuna ]]; then _lacuna "$@"; else compdef _lacuna lacuna; fi
`,
	"fish": `function __lacuna_complete
	set -l said (commandline -opc)
	set -l cur (commandline -ct)
	string match -q -- '-*' $cur; and set -a said $cur
	command $said ` + completeWord + ` 2>/dev/null
end
complete -c lacuna -a '(__lacuna_complete)'
`,
}
