package main

import (
	"bytes"
	"go/format"
	"os"
	"testing"
)

// The committed table is what this program writes.
func TestTableIsCurrent(t *testing.T) {
	want, err := format.Source(table())
	if err != nil {
		t.Fatal(err)
	}
	got, err := os.ReadFile("../../nodes.go")
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(got, want) {
		t.Error("voigt/nodes.go is not what gentable writes: run go generate ./voigt")
	}
}

// π to 60 digits, OEIS A000796.
func TestPi(t *testing.T) {
	const want = "3.14159265358979323846264338327950288419716939937510582097494"
	if got := pi().Text('f', 59); got != want {
		t.Errorf("π = %s, want %s", got, want)
	}
}
