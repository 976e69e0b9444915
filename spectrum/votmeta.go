package spectrum

import (
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"math"
	"strings"
)

// votMeta turns parameters with known utypes into the words of text headers.
func (r *reader) votMeta(t *votTable) map[string]string {
	meta := map[string]string{}
	for utype, value := range t.params {
		for _, known := range []struct{ end, key string }{{"spectralframe.refpos", "frame"}, {"target.name", "object"}, {"spectralaxis.respower", "resolution"}, {"spectralaxis.resolution.respower", "resolution"}} {
			if strings.HasSuffix(utype, known.end) {
				meta[known.key] = value
			}
		}
		if strings.HasSuffix(utype, "target.pos") || strings.HasSuffix(utype, "target.pos.value") {
			if words := strings.Fields(value); len(words) == 2 {
				ra, ok1 := parseFloat(words[0])
				dec, ok2 := parseFloat(words[1])
				if r.s.Coord == nil && ok1 && ok2 && ra >= 0 && ra < 360 && math.Abs(dec) <= 90 {
					r.s.Coord = &Coord{ra, dec}
				}
			}
		}
	}
	if meta["object"] != "" {
		r.s.Object = meta["object"]
	}
	if meta["frame"] != "" {
		r.s.Header["SpectralFrame.RefPos"] = meta["frame"]
	}
	return meta
}

// latinReader lets documents in ASCII and Latin-1 through; encoding/xml reads
// UTF-8 alone.
func latinReader(charset string, in io.Reader) (io.Reader, error) {
	switch strings.ToLower(charset) {
	case "us-ascii", "ascii":
		return in, nil
	case "iso-8859-1", "latin1", "latin-1", "windows-1252":
		return &latin1{in: in}, nil
	}
	return nil, fmt.Errorf("encoding %s is not read", charset)
}

// latin1 turns bytes into the letters of the same number.
type latin1 struct {
	in   io.Reader
	rest []byte
}

func (l *latin1) Read(p []byte) (int, error) {
	if len(l.rest) == 0 {
		var buf [2048]byte
		n, err := l.in.Read(buf[:])
		if n == 0 {
			return 0, err
		}
		l.rest = latin1ToUTF8(buf[:n])
	}
	n := copy(p, l.rest)
	l.rest = l.rest[n:]
	return n, nil
}

// xmlError puts the place into an error of the XML reader.
func (v *votReader) xmlError(err error) error {
	line, _ := v.d.InputPos()
	var syntax *xml.SyntaxError
	switch {
	case errors.As(err, &syntax):
		return v.r.fail(syntax.Line, "fetch the file again", "the XML is damaged: %s", syntax.Msg)
	case errors.Is(err, io.EOF), errors.Is(err, io.ErrUnexpectedEOF):
		return v.r.fail(line, "fetch the file again", "the VOTable ends before its last element")
	}
	return v.r.fail(line, "save it as UTF-8", "%v", err)
}
