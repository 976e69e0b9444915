package main

import (
	"fmt"
	"io"
	"math"
	"os"
	"strconv"
	"strings"

	"github.com/urfave/cli/v2"
	"golang.org/x/term"

	"lacuna/internal/disk"
	"lacuna/internal/table"
	"lacuna/report"
)

// one returns the single argument of a command.
func one(c *cli.Context, what string) (string, error) {
	switch c.Args().Len() {
	case 1:
		return c.Args().First(), nil
	case 0:
		return "", usage(c, "no %s given", what)
	}
	return "", usage(c, "one %s wanted, %d given (%s)", what, c.Args().Len(), strings.Join(c.Args().Slice(), " "))
}

// maxVelocity bounds ranges of velocity, km/s, as it does in survey files.
const maxVelocity = 30000

// pair reads "-40,40", km/s.
func pair(c *cli.Context, option, text string) ([2]float64, error) {
	lo, hi, ok := strings.Cut(text, ",")
	a, err1 := strconv.ParseFloat(strings.TrimSpace(lo), 64)
	b, err2 := strconv.ParseFloat(strings.TrimSpace(hi), 64)
	if !ok || err1 != nil || err2 != nil || !(a < b) {
		return [2]float64{}, usage(c, "--%s %q is not two numbers, lower first, with a comma between (-40,40)", option, text)
	}
	if a < -maxVelocity || b > maxVelocity {
		return [2]float64{}, usage(c, "--%s %q goes beyond ±%d km/s", option, text, maxVelocity)
	}
	return [2]float64{a, b}, nil
}

// textOptions says how to write text: colour and the width of the terminal where
// the output is one, else 100 columns without colour.
func textOptions(c *cli.Context) report.Options {
	o := report.Options{Width: 100, ASCII: ascii()}
	if f, ok := c.App.Writer.(*os.File); ok && term.IsTerminal(int(f.Fd())) {
		o.Color = os.Getenv("NO_COLOR") == "" && os.Getenv("TERM") != "dumb"
		if w, _, err := term.GetSize(int(f.Fd())); err == nil && w > 0 {
			o.Width = max(80, min(w, 100))
		}
	}
	return o
}

// ascii reports whether the locale lacks UTF-8.
func ascii() bool {
	for _, v := range []string{"LC_ALL", "LC_CTYPE", "LANG"} {
		if s := os.Getenv(v); s != "" {
			u := strings.ToUpper(s)
			return !strings.Contains(u, "UTF-8") && !strings.Contains(u, "UTF8")
		}
	}
	return false
}

// progress tells on standard error how far long work is, where that is a terminal.
func progress(c *cli.Context, done, of int, name string) {
	if f, ok := c.App.ErrWriter.(*os.File); ok && term.IsTerminal(int(f.Fd())) && of > 1 {
		fmt.Fprintf(f, "\r\033[K%d of %d  %s", done, of, name)
		if done == of {
			fmt.Fprint(f, "\r\033[K")
		}
	}
}

func parseNumber(text string) (float64, error) {
	x, err := strconv.ParseFloat(strings.TrimSpace(text), 64)
	if err == nil && (math.IsNaN(x) || math.IsInf(x, 0)) {
		err = strconv.ErrRange
	}
	return x, err
}

// number reads an option that must be a finite number.
func number(c *cli.Context, option string) (float64, error) {
	x, err := parseNumber(c.String(option))
	if err != nil {
		return 0, usage(c, "--%s %q is not a number", option, c.String(option))
	}
	return x, nil
}

func positive(c *cli.Context, option string) (float64, error) {
	x, err := number(c, option)
	if err == nil && x <= 0 {
		err = usage(c, "--%s %g is not above 0", option, x)
	}
	return x, err
}

func writeFile(path string, text []byte) error {
	return disk.AtomicWrite(path, func(w io.Writer) error { _, err := w.Write(text); return err })
}

func writeTable(path string, t *table.Table) error {
	return disk.AtomicWrite(path, t.WriteECSV)
}
