package table

import (
	"bytes"
	"errors"
	"io/fs"
	"os"

	"lacuna/internal/oops"
)

// Read reads a table file, ECSV or CSV as its content says.
func Read(path string) (*Table, error) {
	data, err := os.ReadFile(path)
	if err != nil {
		var pe *fs.PathError
		if errors.As(err, &pe) {
			return nil, oops.Input(path, "", "cannot be read: "+pe.Err.Error(), "check the path of the table")
		}
		return nil, err
	}
	body := bytes.TrimPrefix(data, []byte("\xEF\xBB\xBF"))
	lead := bytes.TrimLeft(body, " \t\r\n")
	head := func(s string) bool { return bytes.HasPrefix(lead, []byte(s)) }
	const fix = "give the table as ECSV or CSV"
	switch {
	case bytes.HasPrefix(body, []byte("# %ECSV")):
		return ReadECSV(bytes.NewReader(data), path)
	case head("SIMPLE  ="):
		return nil, oops.Input(path, "", "this is a FITS file, not a text table", fix)
	case head("<"):
		return nil, oops.Input(path, "", "this is XML or HTML, not a text table", fix)
	case head("\x1F\x8B"), head("BZh"), head("PK\x03\x04"):
		return nil, oops.Input(path, "", "this file is compressed", "unpack it first")
	}
	return ReadCSV(bytes.NewReader(data), path)
}
