package spectrum

import (
	"bytes"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"lacuna/internal/oops"
	"lacuna/spectrum/fits"
)

// The layouts.
const (
	layoutImage     = "image"
	layoutMultispec = "IRAF multispec"
	layoutMXHI      = "IUE MXHI"
	layoutMXLO      = "IUE MXLO"
	layoutE2DS      = "e2ds of the DRS family"
	layoutKOA       = "KOA polynomial image"
	layoutWaveImage = "image with an image of wavelengths"
	layoutSDP       = "ESO science data product"
	layoutVector    = "row of array cells"
	layoutX1D       = "HST x1d"
	layoutLogLam    = "loglam table"
	layoutRows      = "one row a pixel"
	layoutVOTable   = "VOTable"
	layoutOrders    = "list of orders"
	layoutText      = "text"
	layoutCSV       = "CSV"
	layoutECSV      = "ECSV"
)

// A reader is one file on its way to a Spectrum.
type reader struct {
	o    Options
	c    *fits.Content
	file *fits.File
	s    *Spectrum
}

// Read reads a spectrum. Its layout is recognised by content, never by the name:
// FITS images with a linear or logarithmic axis or a lookup table, tile-compressed
// too; IRAF multispec; orders with polynomials in the header (e2ds of the DRS
// family, KOA); ESO science data products and other tables with array cells, HST
// x1d, IUE MXHI and MXLO, SDSS-like loglam tables, tables with one row a pixel and
// lists of orders; VOTable, ECSV, CSV and plain text; gzip of any of them.
//
// Wavelengths come out in Å, ascending, in the file's medium and frame, each with
// a word on how that was decided; orders stay apart. Pixels are masked, never
// dropped. Errors name the file and the place, and say how to mend it.
func Read(path string, o Options) (*Spectrum, error) {
	c, err := fits.Load(path)
	if err != nil {
		return nil, err
	}
	defer c.Close()
	return read(c, o)
}

func read(c *fits.Content, o Options) (*Spectrum, error) {
	r := &reader{o: o, c: c, s: &Spectrum{Header: map[string]string{}, Coord: o.Coord}}
	if err := r.recognise(); err != nil {
		return nil, err
	}
	if len(r.s.Segments) == 0 {
		what := "no segment of it holds a spectrum"
		if n := len(r.s.Notes); n > 0 {
			what += ": " + strings.Join(r.s.Notes[:min(n, 3)], "; ")
		}
		return nil, oops.Input(c.Name, "", what, "choose an HDU and its columns")
	}
	if !slices.ContainsFunc(r.s.Segments, func(s Segment) bool { return s.Good() > 0 }) {
		return nil, oops.Input(c.Name, "", "no pixel is usable by its flux, error and quality", "look at the quality flags, or choose other columns")
	}
	sum := ""
	if !o.NoSum {
		if err := r.checkSums(); err != nil {
			return nil, err
		}
		var err error
		if sum, err = c.SHA256(); err != nil {
			return nil, err
		}
	}
	for i := range r.s.Segments {
		s := &r.s.Segments[i]
		s.Source.SHA256 = sum
		if err := s.Check(); err != nil {
			return nil, fmt.Errorf("reading %s: %w", c.Name, err)
		}
	}
	return r.s, nil
}

// decisive are keywords on which columns, wavelengths and velocities rest, without
// the numbers at their ends.
var decisive = []string{"BITPIX", "NAXIS", "TFIELDS", "TTYPE", "TFORM", "TUNIT", "TSCAL", "TZERO", "TNULL", "TUCD", "TUTYP", "CRVAL", "CDELT", "CRPIX", "CTYPE", "CUNIT", "CD1_", "PC1_", "DC-FLAG", "BSCALE", "BZERO", "BLANK",
	"SPECSYS", "AIRORVAC", "HELCORR", "VHELIO", "V_HELIO", "HELIO_RV", "BARYCORR", "COEFF", "WV_0_", "WV_4_", "LTV", "LTM1_", "ESO QC VRAD HELICOR", "ESO QC VRAD BARYCOR", "ESO QC BERV"}

// doubled says which of them a header gives twice with different values: the
// first one counts, and one of the cards may be damaged.
func (r *reader) doubled() {
	for _, h := range r.file.HDUs {
		for _, key := range h.Doubled {
			if root := strings.TrimRight(key, "0123456789"); slices.Contains(decisive, root) || slices.Contains(decisive, key) || strings.HasSuffix(key, " DRS BERV") || strings.Contains(key, " DRS CAL TH COEFF LL") {
				r.s.Notes = append(r.s.Notes, fmt.Sprintf("%s: %s stands there twice with different values: the first is taken", h.Where(), key))
			}
		}
	}
}

// maxCheckSums is the largest file whose FITS checksums are looked at, in bytes.
const maxCheckSums = 64 << 20

// checkSums says where a FITS file is not as its writer left it. Editors that
// change a card leave the sum as it was, so this is no error.
func (r *reader) checkSums() error {
	if r.file == nil || r.c.Size > maxCheckSums {
		return nil
	}
	for _, h := range r.file.HDUs {
		what, err := h.CheckSums()
		if err != nil {
			return err
		}
		if what != "" {
			r.s.Notes = append(r.s.Notes, h.Where()+": "+what+": the file was changed or damaged after it was written")
		}
	}
	return nil
}

// recognise looks at the first bytes.
func (r *reader) recognise() error {
	head := make([]byte, 4096)
	n, _ := r.c.ReadAt(head, 0)
	head = head[:n]
	text := bytes.TrimLeft(bytes.TrimPrefix(head, []byte("\xef\xbb\xbf")), " \t\r\n")
	low := bytes.ToLower(text)
	refuse := func(what, fix string) error { return oops.Input(r.c.Name, "", what, fix) }
	switch {
	case len(head) == 0:
		return refuse("the file is empty", "fetch the file again")
	case bytes.HasPrefix(head, []byte("SIMPLE  =")):
		return r.fits()
	case bytes.HasPrefix(head, []byte("BZh")):
		return refuse("it is packed with bzip2", "unpack it with bunzip2")
	case bytes.HasPrefix(head, []byte{0x1f, 0x9d}):
		return refuse("it is packed with compress", "unpack it with uncompress")
	case bytes.HasPrefix(head, []byte{0x1f, 0x8b}):
		return refuse("it is packed with gzip twice", "unpack it once with gunzip")
	case bytes.HasPrefix(head, []byte("PK\x03\x04")):
		return refuse("it is a zip archive", "unpack it with unzip")
	case bytes.HasPrefix(low, []byte("<!doctype")), bytes.HasPrefix(low, []byte("<html")):
		what := "not a FITS file or a table: it is an HTML page"
		if _, rest, ok := bytes.Cut(text, []byte("<title>")); ok {
			title, _, _ := bytes.Cut(rest, []byte("<"))
			if len(title) < 200 {
				what += " (title: " + strings.TrimSpace(strings.ToValidUTF8(string(title), "?")) + ")"
			}
		}
		return refuse(what, "the download failed; fetch the file again")
	case bytes.HasPrefix(low, []byte("<votable")), bytes.HasPrefix(low, []byte("<?xml")):
		return r.votable()
	case bytes.HasPrefix(head, []byte{0xff, 0xfe}), bytes.HasPrefix(head, []byte{0xfe, 0xff}):
		return refuse("the text is UTF-16", "save it as UTF-8")
	case bytes.IndexByte(head, 0) >= 0:
		return refuse("it holds NUL bytes and no layout that is known", "give FITS or text")
	case bytes.HasPrefix(text, []byte("# %ECSV ")):
		return r.ecsv()
	}
	return r.text()
}

// fits chooses the layout of a FITS file by the first rule that fits.
func (r *reader) fits() error {
	f, err := fits.New(r.c)
	if err != nil {
		return err
	}
	r.file = f
	r.s.Notes = append(r.s.Notes, f.Notes...)
	r.doubled()
	hdus := f.HDUs
	if r.o.HDU != "" {
		h, err := r.chosen()
		if err != nil {
			return err
		}
		hdus = []*fits.HDU{h}
	}
	for _, rule := range []func(h *fits.HDU) (layout string, read func() error){r.special, r.tables} {
		for _, h := range hdus {
			if h.Err != nil {
				continue
			}
			if layout, read := rule(h); read != nil {
				r.s.Layout = layout
				return read()
			}
		}
	}
	if done, err := r.images(hdus); done || err != nil {
		return err
	}
	return r.nothing(hdus)
}

// chosen returns the HDU that the user named.
func (r *reader) chosen() (*fits.HDU, error) {
	var names []string
	for _, h := range r.file.HDUs {
		if strconv.Itoa(h.Index) == r.o.HDU || h.Name() != "" && strings.EqualFold(h.Name(), r.o.HDU) {
			return h, h.Err
		}
		names = append(names, h.Describe())
	}
	return nil, oops.Input(r.c.Name, "", "there is no HDU "+r.o.HDU, "choose one of: "+strings.Join(names, "; "))
}

// nothing is the error where no rule fits.
func (r *reader) nothing(hdus []*fits.HDU) error {
	var list []string
	for _, h := range hdus {
		if h.Err != nil {
			return h.Err
		}
	}
	for _, h := range hdus {
		if (h.Kind == fits.Binary || h.Kind == fits.Ascii) && h.Rows == 0 {
			return h.Fail("table has no rows (NAXIS2=0)", "fetch the file again")
		}
		if len(list) < 20 {
			list = append(list, h.Describe())
		}
	}
	return oops.Input(r.c.Name, "", "no spectrum is recognised in it: "+strings.Join(list, "; "),
		"name HDU and columns: hdu, columns = {wave = …, flux = …}")
}

// headers are those that belong to an HDU.
func (r *reader) headers(h *fits.HDU) cards {
	if h.Index == 0 {
		return cards{&h.Header}
	}
	return cards{&h.Header, &r.file.HDUs[0].Header}
}

// special recognises the layouts that would be taken for something else by the
// rules for tables and images.
func (r *reader) special(h *fits.HDU) (string, func() error) {
	switch {
	case isIUE(h) != "":
		return isIUE(h), func() error { return r.iue(h) }
	case r.isMultispec(h):
		return layoutMultispec, func() error { return r.multispec(h) }
	case drsCoefficients(h) != "":
		return layoutE2DS, func() error { return r.e2ds(h, drsCoefficients(h)) }
	case isKOA(h):
		return layoutKOA, func() error { return r.koa(h) }
	}
	return "", nil
}
