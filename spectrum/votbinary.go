package spectrum

import (
	"encoding/base64"
	"encoding/binary"
	"math"
	"strings"
)

// stream reads the bytes of a STREAM: base64 inside the document.
func (v *votReader) stream() ([]byte, error) {
	var out []byte
	found := false
	for {
		e, err := v.next()
		if err != nil {
			return nil, err
		}
		if e == nil {
			if !found {
				return nil, v.fail("fetch the file again", "binary data without a STREAM")
			}
			return out, nil
		}
		if !strings.EqualFold(e.Name.Local, "STREAM") {
			if err := v.skip(); err != nil {
				return nil, err
			}
			continue
		}
		if href := attribute(*e, "href"); href != "" {
			return nil, v.fail("fetch them and the table into one file", "the data lie elsewhere: %.200s", href)
		}
		if enc := attribute(*e, "encoding"); !strings.EqualFold(enc, "base64") {
			return nil, v.fail("save it with TABLEDATA or base64", "a STREAM with encoding '%.40s' is not read", enc)
		}
		text, err := v.text()
		if err != nil {
			return nil, err
		}
		// The decoder passes over line breaks, not over blanks.
		b, err := base64.StdEncoding.DecodeString(strings.Join(strings.Fields(text), ""))
		if err != nil {
			return nil, v.fail("fetch the file again", "the base64 data are damaged: %v", err)
		}
		out, found = append(out, b...), true
	}
}

// binary reads rows of big-endian values. In BINARY2 each row begins with bits
// that mark its null cells.
func (v *votReader) binary(t *votTable, b []byte, flags bool) error {
	short := func(f *votField) error {
		return v.fail("fetch the file again", "the binary data end in row %d, column %s", t.rows+1, f.name)
	}
	if len(t.fields) == 0 {
		return v.fail("fetch the file again", "binary data without columns")
	}
	for len(b) > 0 {
		var nulls []byte
		if flags {
			n := (len(t.fields) + 7) / 8
			if len(b) < n {
				return short(&t.fields[0])
			}
			nulls, b = b[:n], b[n:]
		}
		width := len(b)
		for k := range t.fields {
			f := &t.fields[k]
			n := f.size
			if n < 0 {
				if len(b) < 4 {
					return short(f)
				}
				n, b = int(binary.BigEndian.Uint32(b)), b[4:]
			}
			size := n * votSize[f.kind]
			if f.kind == "bit" {
				size = (n + 7) / 8
			}
			if n < 0 || size < 0 || n > 8*len(b) || size > len(b) {
				return short(f)
			}
			null := nulls != nil && nulls[k/8]>>(7-k%8)&1 == 1
			f.decode(b[:size], n, null)
			b = b[size:]
		}
		if width == len(b) && !flags {
			return v.fail("fetch the file again", "rows without bytes")
		}
		t.rows++
	}
	return nil
}

// decode appends the n values of a cell; text and complex numbers are passed over.
func (f *votField) decode(b []byte, n int, null bool) {
	size := votSize[f.kind]
	for i := range n {
		x := math.NaN()
		var p []byte
		if f.kind != "bit" {
			p = b[i*size:]
		}
		whole := func(k int64) {
			if x = float64(k); f.null != nil && k == *f.null {
				x = math.NaN()
			}
		}
		switch f.kind {
		case "boolean":
			switch p[0] {
			case 'T', 't', '1':
				x = 1
			case 'F', 'f', '0':
				x = 0
			}
		case "bit":
			x = float64(b[i/8] >> (7 - i%8) & 1)
		case "unsignedbyte":
			whole(int64(p[0]))
		case "short":
			whole(int64(int16(binary.BigEndian.Uint16(p))))
		case "int":
			whole(int64(int32(binary.BigEndian.Uint32(p))))
		case "long":
			whole(int64(binary.BigEndian.Uint64(p)))
		case "float":
			x = float64(math.Float32frombits(binary.BigEndian.Uint32(p)))
		case "double":
			x = math.Float64frombits(binary.BigEndian.Uint64(p))
		default:
			return
		}
		if null {
			x = math.NaN()
		}
		f.values = append(f.values, x)
	}
	if f.size < 0 {
		f.ends = append(f.ends, len(f.values))
	}
}
