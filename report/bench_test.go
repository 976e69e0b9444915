package report

import (
	"io"
	"testing"
)

func BenchmarkLineFigure(b *testing.B) {
	r := uv()
	for b.Loop() {
		for _, f := range LineFigures(r) {
			if err := f.WriteSVG(io.Discard); err != nil {
				b.Fatal(err)
			}
		}
	}
}

func BenchmarkGrowthFigure(b *testing.B) {
	r := uv()
	for b.Loop() {
		if err := GrowthFigure(r.Name, r.Result.Growth[0]).WriteSVG(io.Discard); err != nil {
			b.Fatal(err)
		}
	}
}
