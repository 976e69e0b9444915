// Command lacuna turns optical and ultraviolet stellar spectra into interstellar
// column densities and depletions.
package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"regexp"
	"strings"
	"syscall"

	"github.com/urfave/cli/v2"

	"lacuna/internal/oops"
	"lacuna/survey"
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	code := run(ctx, os.Args, os.Stdout, os.Stderr)
	stop()
	os.Exit(code)
}

// run is the program: 0 for success, 2 for a mistake in what the user wrote or
// gave, 1 for any other failure.
func run(ctx context.Context, args []string, stdout, stderr io.Writer) int {
	app := newApp(stdout, stderr)
	if len(args) > 1 && args[len(args)-1] == completeWord {
		complete(stdout, app, args[1:len(args)-1])
		return 0
	}
	app.Metadata = map[string]any{"args": args[1:]}
	args, err := reorder(app, args)
	if err == nil {
		err = app.RunContext(ctx, args)
	}
	if err == nil {
		return 0
	}
	var several *survey.Failed
	if errors.As(err, &several) {
		for _, f := range several.Errs {
			tell(stderr, f)
		}
	} else {
		tell(stderr, err)
	}
	var u *usageError
	if errors.As(err, &u) || oops.IsInput(err) {
		return 2
	}
	if errors.As(err, &several) && several.Mistakes() {
		return 2
	}
	return 1
}

// tell writes each mistake on a line of its own.
func tell(w io.Writer, err error) {
	for line := range strings.Lines(err.Error()) {
		fmt.Fprintf(w, "lacuna: %s\n", strings.TrimRight(line, "\n"))
	}
}

// A usageError is a mistake on the command line.
type usageError struct{ text string }

func (e *usageError) Error() string { return e.text }

func usage(c *cli.Context, format string, a ...any) error {
	name := strings.TrimSpace("lacuna " + c.Command.Name)
	return &usageError{fmt.Sprintf(format, a...) + "; see " + strings.TrimSpace(name+" --help")}
}

func newApp(stdout, stderr io.Writer) *cli.App {
	cli.VersionPrinter = func(c *cli.Context) { fmt.Fprintln(c.App.Writer, "lacuna "+survey.Version()) }
	app := &cli.App{
		Name:                      "lacuna",
		Usage:                     "stellar spectra → interstellar column densities and depletions",
		Version:                   survey.Version(),
		Writer:                    stdout,
		ErrWriter:                 stderr,
		DisableSliceFlagSeparator: true, // "--continuum -250,-60" is one value
		HideHelpCommand:           true, // ours is among the commands
		CustomAppHelpTemplate:     appHelp,
		Flags:                     []cli.Flag{cli.HelpFlag},
		ExitErrHandler:            func(*cli.Context, error) {}, // only main exits
		OnUsageError: func(c *cli.Context, err error, _ bool) error {
			return &usageError{flagError(c, err) + "; options stand after the command, see lacuna --help"}
		},
		Commands: []*cli.Command{
			demoCommand(), newCommand(), runCommand(), measureCommand(), fitCommand(), growthCommand(),
			depleteCommand(), linesCommand(), inspectCommand(), velocityCommand(), completionCommand(), helpCommand(),
		},
		Action: func(c *cli.Context) error {
			if !c.Args().Present() {
				return cli.ShowAppHelp(c)
			}
			return unknownCommand(c)
		},
	}
	for _, cmd := range app.Commands {
		cmd.CustomHelpTemplate = helpText(cmd)
		cmd.OnUsageError = func(c *cli.Context, err error, _ bool) error {
			return &usageError{flagError(c, err) + "; see lacuna " + c.Command.Name + " --help"}
		}
	}
	return app
}

func unknownCommand(c *cli.Context) error {
	var names []string
	for _, cmd := range c.App.Commands {
		names = append(names, cmd.Name)
	}
	word := c.Args().First()
	fix := "lacuna --help lists the commands"
	if near := oops.Nearest(word, names, 1); len(near) > 0 {
		fix = fmt.Sprintf("did you mean lacuna %s? %s", near[0], fix)
	}
	return &usageError{fmt.Sprintf("there is no command %q; %s", word, fix)}
}

// badValue is how the library tells of a value of the wrong type.
var badValue = regexp.MustCompile(`^invalid value ("[^"]*"|\S+) for flag -([^:]+): `)

// flagError puts the library's message on a wrong option into our words, with the
// nearest option to an unknown one.
func flagError(c *cli.Context, err error) string {
	msg := err.Error()
	if m := badValue.FindStringSubmatch(msg); m != nil {
		return fmt.Sprintf("--%s %s is not a whole number", m[2], m[1])
	}
	if word, ok := strings.CutPrefix(msg, "flag needs an argument: "); ok {
		return "--" + strings.TrimLeft(word, "-") + " needs a value"
	}
	if word, ok := strings.CutPrefix(msg, "flag provided but not defined: "); ok {
		var names []string
		for _, f := range c.Command.Flags {
			for _, n := range f.Names() {
				names = append(names, "--"+n)
			}
		}
		word = "--" + strings.TrimLeft(word, "-")
		msg = "there is no option " + word
		if near := oops.Nearest(word, names, 1); len(near) > 0 {
			msg += " (did you mean " + near[0] + "?)"
		}
	}
	return msg
}

// reorder moves options before the other arguments of a command, because the
// library stops looking for options at the first argument. Everything after "--"
// stays as it is. An option without its value, and one given twice that takes one
// value, are mistakes that the library would not notice.
func reorder(app *cli.App, args []string) ([]string, error) {
	if len(args) < 3 {
		return args, nil
	}
	var cmd *cli.Command
	at := 1
	for ; at < len(args); at++ {
		if !strings.HasPrefix(args[at], "-") {
			cmd = app.Command(args[at])
			break
		}
	}
	if cmd == nil {
		return args, nil
	}
	takesValue, many := map[string]bool{}, map[string]bool{}
	for _, f := range cmd.Flags {
		_, isBool := f.(*cli.BoolFlag)
		_, isSlice := f.(*cli.StringSliceFlag)
		for _, n := range f.Names() {
			takesValue[n], many[n] = !isBool, isSlice
		}
	}
	mistake := func(format string, a ...any) error {
		return &usageError{fmt.Sprintf(format, a...) + "; see lacuna " + cmd.Name + " --help"}
	}
	out := append([]string{}, args[:at+1]...)
	var rest []string
	seen := map[string]bool{}
	for i := at + 1; i < len(args); i++ {
		a := args[i]
		switch {
		case a == "--":
			rest = append(rest, args[i+1:]...)
			i = len(args)
		case strings.HasPrefix(a, "-") && a != "-":
			out = append(out, a)
			name, _, hasValue := strings.Cut(strings.TrimLeft(a, "-"), "=")
			if seen[name] && takesValue[name] && !many[name] {
				return nil, mistake("--%s is given twice", name)
			}
			seen[name] = true
			if hasValue || !takesValue[name] {
				continue
			}
			// A value may begin with "-", as negative numbers do, but not with "--".
			if i+1 >= len(args) || strings.HasPrefix(args[i+1], "--") {
				return nil, mistake("--%s needs a value", name)
			}
			i++
			out = append(out, args[i])
		default:
			rest = append(rest, a)
		}
	}
	if len(rest) > 0 {
		out = append(append(out, "--"), rest...)
	}
	return out, nil
}

const appHelp = `{{.Name}}: {{.Usage}}

Usage: lacuna COMMAND [options] [files]

Commands:{{range .VisibleCommands}}
  {{printf "%-11s" .Name}} {{.Usage}}{{end}}

lacuna COMMAND --help explains one command, with an example. Options may stand before
or after file names. Results go to standard output, messages to standard error. Exit
code: 0 success, 2 a mistake in what was given, 1 any other failure. NO_COLOR is respected.

First steps: lacuna demo       runs the whole job on an invented survey
             lacuna new DIR    writes a commented survey file to start from
`
