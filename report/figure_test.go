package report

import (
	"bytes"
	"encoding/xml"
	"errors"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"gonum.org/v1/plot/vg"
)

// svg writes a figure, and if LACUNA_LOOK names a folder also puts it there for
// people to look at.
func svg(t testing.TB, f Figure) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := f.WriteSVG(&b); err != nil {
		t.Fatal(err)
	}
	if dir := os.Getenv("LACUNA_LOOK"); dir != "" {
		if err := os.WriteFile(filepath.Join(dir, f.Name+".svg"), b.Bytes(), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return b.Bytes()
}

func allFigures() []Figure {
	var out []Figure
	for _, r := range append(everything(), hard()...) {
		out = append(out, Figures(r)...)
	}
	return out
}

// Every figure is well-formed XML without NaN, titled, and each of its letters
// has a glyph: what a font lacks would vanish in silence.
func TestFiguresAreSound(t *testing.T) {
	names := map[string]bool{}
	for _, f := range allFigures() {
		if names[f.Name] {
			t.Errorf("two figures are named %s", f.Name)
		}
		names[f.Name] = true
		b := svg(t, f)
		if strings.Contains(string(b), "NaN") || strings.Contains(string(b), "Inf\"") {
			t.Errorf("%s: NaN or Inf in the file", f.Name)
		}
		d := xml.NewDecoder(bytes.NewReader(b))
		var in []string
		texts, title := 0, ""
		for {
			tok, err := d.Token()
			if errors.Is(err, io.EOF) {
				break
			}
			if err != nil {
				t.Fatalf("%s: %v", f.Name, err)
			}
			switch x := tok.(type) {
			case xml.StartElement:
				in = append(in, x.Name.Local)
				if x.Name.Local == "text" {
					texts++
					attr := map[string]string{}
					for _, a := range x.Attr {
						attr[a.Name.Local] = a.Value
					}
					if !strings.Contains(attr["font-family"], "sans-serif") || attr["textLength"] == "" || attr["font-size"] == "" {
						t.Errorf("%s: text without fallback font, size or length: %v", f.Name, attr)
					}
				}
			case xml.EndElement:
				in = in[:len(in)-1]
			case xml.CharData:
				switch in0 := append([]string{""}, in...)[len(in)]; in0 {
				case "title":
					title += string(x)
				case "text":
					for _, r := range string(x) {
						if !hasGlyph(r) {
							t.Errorf("%s: the font has no %q (in %q)", f.Name, r, x)
						}
					}
				}
			}
		}
		if texts == 0 || strings.TrimSpace(title) == "" && f.Title != "" {
			t.Errorf("%s: %d texts, title %q", f.Name, texts, title)
		}
	}
}

// Nothing is drawn outside the page, no text is smaller than 7 pt but powers and
// indices, no text lies on another, and a column's width is a journal's.
func TestFiguresAreLegible(t *testing.T) {
	for _, f := range allFigures() {
		p := probed(f)
		for _, b := range p.bad {
			t.Errorf("%s: %s", f.Name, b)
		}
		if f.Width != oneColumn && f.Width != twoColumn {
			t.Errorf("%s is %v mm wide", f.Name, f.Width/vg.Millimeter)
		}
		if f.Height > 250*vg.Millimeter {
			t.Errorf("%s is %v mm high, more than a page", f.Name, f.Height/vg.Millimeter)
		}
		page := vg.Rectangle{Max: vg.Point{X: f.Width, Y: f.Height}}
		if !within(p.paths, page) {
			t.Errorf("%s: a line leaves the page: %v", f.Name, p.paths)
		}
		for i, a := range p.texts {
			if !within(a.box, page) {
				t.Errorf("%s: %q leaves the page: %v", f.Name, a.text, a.box)
			}
			if a.size < textSize*small-1e-9 {
				t.Errorf("%s: %q is set in %v pt", f.Name, a.text, a.size)
			}
			for _, b := range p.texts[:i] {
				if a.size == b.size && overlap(a.box, b.box) > 0.3 {
					t.Errorf("%s: %q %v lies on %q %v", f.Name, a.text, a.box, b.text, b.box)
				}
			}
		}
	}
}

func within(r, page vg.Rectangle) bool {
	return r.Min.X >= page.Min.X && r.Min.Y >= page.Min.Y && r.Max.X <= page.Max.X && r.Max.Y <= page.Max.Y
}

// overlap is the smaller side, in points, of what two boxes share.
func overlap(a, b vg.Rectangle) float64 {
	w := min(a.Max.X, b.Max.X) - max(a.Min.X, b.Min.X)
	h := min(a.Max.Y, b.Max.Y) - max(a.Min.Y, b.Min.Y)
	return float64(min(w, h))
}

// The same record gives the same bytes.
func TestFiguresAreDeterministic(t *testing.T) {
	a, b := Figures(uv()), Figures(uv())
	for i := range a {
		if !bytes.Equal(svg(t, a[i]), svg(t, b[i])) {
			t.Errorf("%s differs from run to run", a[i].Name)
		}
	}
}

func TestPNG(t *testing.T) {
	var b bytes.Buffer
	if err := Figures(lantern1())[0].WritePNG(&b, 100); err != nil {
		t.Fatal(err)
	}
	if !bytes.HasPrefix(b.Bytes(), []byte("\x89PNG\r\n")) {
		t.Error("not a PNG")
	}
}
