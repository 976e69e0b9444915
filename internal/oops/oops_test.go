package oops_test

import (
	"fmt"
	"strings"
	"testing"

	"lacuna/internal/oops"
)

func TestMistake(t *testing.T) {
	err := fmt.Errorf("reading: %w", oops.Input("a.toml", "sightline 2", "no window", "add window = [-40, 40]"))
	if !oops.IsInput(err) {
		t.Fatal("a wrapped mistake is not recognised")
	}
	if want := "reading: a.toml: sightline 2: no window; add window = [-40, 40]"; err.Error() != want {
		t.Errorf("got %q, want %q", err, want)
	}
	if oops.IsInput(fmt.Errorf("disk full")) {
		t.Error("an ordinary error counts as the user's mistake")
	}
}

func TestNearest(t *testing.T) {
	got := strings.Join(oops.Nearest("windwo", []string{"lines", "window", "windows", "scale"}, 2), ",")
	if got != "window,windows" {
		t.Errorf("got %q", got)
	}
	if got := oops.Nearest("zzzz", []string{"lines", "window"}, 3); len(got) != 0 {
		t.Errorf("unlike words offered: %q", got)
	}
}
