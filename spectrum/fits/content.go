package fits

import (
	"bytes"
	"compress/flate"
	"compress/gzip"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"os"

	"lacuna/internal/oops"
)

// MaxInflated is the largest size in bytes that a gzip file may have when it is
// unpacked; beyond it the file is refused as damaged or hostile.
const MaxInflated = 2 << 30

// inMemory is how much of an unpacked file is kept in memory; what is larger
// goes to a temporary file.
const inMemory = 16 << 20

// Content is the bytes of one file, unpacked where it was gzip, for reading
// anywhere in it.
type Content struct {
	io.ReaderAt
	Name string // as given
	Size int64  // unpacked
	Gzip bool

	file *os.File
	sum  string // SHA-256, once known
}

// Load opens a file and unpacks it where its first bytes say gzip; all members
// of a gzip file are read. Close releases it.
func Load(path string) (*Content, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, oops.Input(path, "", plainOpenError(err), "check the name")
	}
	info, err := f.Stat()
	if err != nil {
		f.Close()
		return nil, fmt.Errorf("reading %s: %w", path, err)
	}
	if !info.Mode().IsRegular() {
		f.Close()
		return nil, oops.Input(path, "", "not a file", "give the name of one spectrum file")
	}
	c := &Content{ReaderAt: f, Name: path, Size: info.Size(), file: f}
	var magic [2]byte
	if n, _ := f.ReadAt(magic[:], 0); n != 2 || magic != [2]byte{0x1f, 0x8b} {
		return c, nil
	}
	sum := sha256.New()
	if err = c.unpack(io.TeeReader(f, sum)); err != nil {
		c.Close()
		if oops.IsInput(err) {
			return nil, err
		}
		return nil, fmt.Errorf("reading %s: %w", path, err)
	}
	c.sum = hex.EncodeToString(sum.Sum(nil))
	return c, nil
}

// SHA256 returns the checksum of the file as it lies on disk, in hexadecimal.
func (c *Content) SHA256() (string, error) {
	if c.sum == "" {
		sum := sha256.New()
		if _, err := io.Copy(sum, io.NewSectionReader(c, 0, c.Size)); err != nil {
			return "", fmt.Errorf("reading %s: %w", c.Name, err)
		}
		c.sum = hex.EncodeToString(sum.Sum(nil))
	}
	return c.sum, nil
}

// FromBytes is a Content of bytes that are not in a file; gzip is not unpacked.
func FromBytes(name string, b []byte) *Content {
	return &Content{ReaderAt: bytes.NewReader(b), Name: name, Size: int64(len(b))}
}

// Close releases the file; reading afterwards fails.
func (c *Content) Close() error {
	if c.file == nil {
		return nil
	}
	err := c.file.Close()
	c.file = nil
	return err
}

// unpack reads all gzip members of r, at most MaxInflated bytes.
func (c *Content) unpack(r io.Reader) error {
	z, err := gzip.NewReader(r)
	if err != nil {
		return c.gzipError(err)
	}
	var buf bytes.Buffer
	n, err := io.CopyN(&buf, z, inMemory)
	if errors.Is(err, io.EOF) {
		c.file.Close()
		c.file = nil
		c.ReaderAt, c.Size, c.Gzip = bytes.NewReader(buf.Bytes()), n, true
		return nil
	}
	if err != nil {
		return c.gzipError(err)
	}
	tmp, err := os.CreateTemp("", "lacuna-*.unpacked")
	if err != nil {
		return err
	}
	os.Remove(tmp.Name()) // it lives as long as it is open
	if _, err = buf.WriteTo(tmp); err == nil {
		var m int64
		m, err = io.Copy(tmp, io.LimitReader(z, MaxInflated-n+1))
		n += m
	}
	switch {
	case err != nil:
		tmp.Close()
		return c.gzipError(err)
	case n > MaxInflated:
		tmp.Close()
		return oops.Inputf(c.Name, "", "unpack it yourself and see what is in it",
			"gzip data unpack to more than %d MiB", MaxInflated>>20)
	}
	c.file.Close()
	c.file = tmp
	c.ReaderAt, c.Size, c.Gzip = tmp, n, true
	return nil
}

func (c *Content) gzipError(err error) error {
	if errors.Is(err, io.ErrUnexpectedEOF) || errors.Is(err, io.EOF) {
		return oops.Input(c.Name, "", "gzip data end unexpectedly (unexpected end of file)", "fetch the file again")
	}
	if errors.Is(err, gzip.ErrHeader) || errors.Is(err, gzip.ErrChecksum) || isFlate(err) {
		return oops.Input(c.Name, "", fmt.Sprintf("gzip data are damaged (%v)", err), "fetch the file again")
	}
	return err
}

func plainOpenError(err error) string {
	switch {
	case errors.Is(err, os.ErrNotExist):
		return "there is no such file"
	case errors.Is(err, os.ErrPermission):
		return "no permission to read it"
	}
	return err.Error()
}

// isFlate reports an error of the compressed stream itself.
func isFlate(err error) bool {
	var corrupt flate.CorruptInputError
	return errors.As(err, &corrupt)
}
