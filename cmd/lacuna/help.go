package main

import (
	"fmt"
	"strconv"
	"strings"
	"unicode/utf8"

	"github.com/urfave/cli/v2"
)

// helpWidth is the number of columns of help texts.
const helpWidth = 100

// helpCommand is "lacuna help COMMAND".
func helpCommand() *cli.Command {
	return &cli.Command{
		Name: "help", Usage: "explain a command, with an example",
		ArgsUsage:   "[COMMAND]",
		Description: "Example: lacuna help measure",
		Action: func(c *cli.Context) error {
			if !c.Args().Present() {
				return cli.ShowAppHelp(c)
			}
			cmd := c.App.Command(c.Args().First())
			if cmd == nil {
				return unknownCommand(c)
			}
			_, err := fmt.Fprint(c.App.Writer, helpText(cmd))
			return err
		},
	}
}

// helpText explains a command: what it does, an example, its options.
func helpText(cmd *cli.Command) string {
	var b strings.Builder
	fmt.Fprintf(&b, "lacuna %s: %s\n\nUsage: lacuna %s\n\n%s\n\nOptions:\n", cmd.Name, cmd.Usage,
		strings.TrimSpace(cmd.Name+" "+cmd.ArgsUsage), description(cmd))
	var rows [][2]string
	wide := 0
	for _, f := range cmd.Flags {
		if f == cli.HelpFlag { // the library adds it when it first runs the command
			continue
		}
		rows = append(rows, optionText(f))
	}
	rows = append(rows, [2]string{"-h, --help", "show this"})
	for _, r := range rows {
		wide = max(wide, utf8.RuneCountInString(r[0]))
	}
	for _, r := range rows {
		for i, line := range fold(r[1], helpWidth-wide-4) {
			name := r[0]
			if i > 0 {
				name = ""
			}
			fmt.Fprintf(&b, "  %-*s  %s\n", wide, name, line)
		}
	}
	return b.String()
}

// description is that of the command, an example that is too long broken as a shell
// takes it.
func description(cmd *cli.Command) string {
	lines := strings.Split(cmd.Description, "\n")
	for i, l := range lines {
		if strings.HasPrefix(l, "Example: ") && utf8.RuneCountInString(l) > helpWidth {
			lines[i] = strings.Join(fold(l, helpWidth-6), " \\\n    ")
		}
	}
	return strings.Join(lines, "\n")
}

// optionText is an option with its value, and what it does.
func optionText(f cli.Flag) [2]string {
	doc := f.(cli.DocGenerationFlag)
	value, usage := "", doc.GetUsage()
	if before, rest, ok := strings.Cut(usage, "`"); ok {
		if word, after, ok := strings.Cut(rest, "`"); ok {
			value, usage = " "+word, before+word+after
		}
	}
	_, isBool := f.(*cli.BoolFlag)
	text := doc.GetDefaultText()
	if plain, err := strconv.Unquote(text); err == nil {
		text = plain
	}
	if text != "" && !isBool {
		usage += " (default: " + text + ")"
	}
	return [2]string{"--" + f.Names()[0] + value, usage}
}

// fold breaks a text into lines of at most wide columns.
func fold(text string, wide int) []string {
	var lines []string
	line := ""
	for _, word := range strings.Fields(text) {
		switch {
		case line == "":
			line = word
		case utf8.RuneCountInString(line)+1+utf8.RuneCountInString(word) <= wide:
			line += " " + word
		default:
			lines, line = append(lines, line), word
		}
	}
	return append(lines, line)
}
