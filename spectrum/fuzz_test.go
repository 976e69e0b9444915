package spectrum

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"lacuna/internal/oops"
	"lacuna/spectrum/fits"
	"lacuna/spectrum/frame"
)

// fuzzRead: refusing is fine, with an error of the user's input; a panic or a
// spectrum that Check does not pass is not. What was read goes to vacuum and the
// Sun, or says why not.
func fuzzRead(t *testing.T, in []byte, o Options) {
	s, err := read(fits.FromBytes("fuzz", in), o)
	if err != nil {
		if !oops.IsInput(err) {
			t.Fatalf("not the user's error: %v", err)
		}
		return
	}
	for i := range s.Segments {
		g := &s.Segments[i]
		if err := g.Check(); err != nil {
			t.Fatal(err)
		}
		if g.ToVacuum(frame.Ciddor1996) == nil && g.ToFrame(frame.Heliocent) == nil {
			if g.Medium != frame.Vacuum || g.Frame != frame.Heliocent {
				t.Fatalf("%s, %s after conversion", g.Medium, g.Frame)
			}
		}
		g.Cut(3000, 4000)
	}
}

// shared adds small files of ../../shared, where they are.
func shared(f *testing.F, patterns ...string) {
	for _, p := range patterns {
		names, _ := filepath.Glob(filepath.Join("../../shared/formats", p))
		for _, n := range names {
			if b, err := os.ReadFile(n); err == nil && len(b) < 40000 {
				f.Add(b)
			}
		}
	}
}

func FuzzReadText(f *testing.F) {
	for _, s := range []string{"# wave_A flux err\n5000.0 1.00 0.01\n5000.1 0.98 0.01\n", "wave_nm,flux,err,mask\n500.0,1,.1,0\n499.9,nan,.1,1\n",
		"lam flam\n1.2E3 -1\n1.3D3 2\n", "5000 1 0\n5001 0 0\n5002 1 1\n5003 - inf\n", "\"Wavelength (nm)\";Flux\n500;1\n501;2\n",
		"# %ECSV 1.0\n# ---\n# datatype:\n# - {name: wave, unit: nm, datatype: float64}\n# - {name: flux, datatype: float64}\n# meta: {frame: LSRK, medium: air}\nwave flux\n500 1\n501 2\n",
		"# medium: air\n# frame: TOPOCENT\n# correction: 13.9\nwave flux\n5000 1\n5001 2\n", "0 1\n-1 2\n1e308 3\n", "order,wave,flux\n1,5000,1\n1,5001,1\n2,5000,1\n2,5001,1\n"} {
		f.Add([]byte(s))
	}
	shared(f, "samples/*.txt", "samples/*csv", "bad/*.txt", "bad/*.csv")
	f.Fuzz(func(t *testing.T, in []byte) {
		fuzzRead(t, in, Options{})
	})
}

func FuzzReadFITS(f *testing.F) {
	var b bytes.Buffer
	for _, line := range []string{"WAVE", "LINEAR", "WAVE-LOG", "FREQ", "VRAD"} {
		for _, flag := range []int{0, 1} {
			b.Reset()
			v := 3933.0
			if flag == 1 {
				v = 3.6
			}
			fits.WriteImage(&b, [][]float64{{1, 2, 3}, {.1, 0, -1}}, []fits.Entry{{Key: "CTYPE1", Value: line}, {Key: "CRVAL1", Value: v}, {Key: "CDELT1", Value: 1e-3}, {Key: "CRPIX1", Value: 1},
				{Key: "DC-FLAG", Value: flag}, {Key: "RESTWAV", Value: 5e-7}, {Key: "CUNIT1", Value: "nm"}, {Key: "SPECSYS", Value: "TOPOCENT"}, {Key: "VHELIO", Value: 12.5}})
			f.Add(bytes.Clone(b.Bytes()))
		}
	}
	cells := [][]float64{{3933, 3934, 3935}}
	one := [][]float64{{3}}
	for _, names := range [][]string{{"WAVE", "FLUX", "ERR", "QUAL"}, {"WAVELENGTH", "FLUX", "ERROR", "DQ"}} {
		b.Reset()
		var cols []fits.Vector
		for _, n := range names {
			cols = append(cols, fits.Vector{Name: n, Unit: "Angstrom", Type: 'D', Rows: cells})
		}
		cols = append(cols, fits.Vector{Name: "NELEM", Type: 'J', Rows: one}, fits.Vector{Name: "SPORDER", Type: 'I', Rows: one})
		fits.WriteTable(&b, []fits.Entry{{Key: "TELESCOP", Value: "HST"}, {Key: "HELCORR", Value: "COMPLETE"}}, "SCI", cols, nil)
		f.Add(bytes.Clone(b.Bytes()))
	}
	b.Reset()
	var cols []fits.Vector
	for _, n := range []string{"lambda", "flux", "sigma", "flags"} {
		cols = append(cols, fits.Vector{Name: n, Unit: "um", Type: 'E', Rows: [][]float64{{.5}, {.6}, {.7}}})
	}
	fits.WriteTable(&b, nil, "SPEC", cols, nil)
	f.Add(bytes.Clone(b.Bytes()))
	// A lookup axis, orders with polynomials, multispec, wavelengths in an image.
	lookup := rawImage([]int{3}, func(i int) float64 { return 1 }, "CTYPE1  = 'AWAV-TAB'", "CUNIT1  = 'nm'", "CRVAL1  = 1", "CDELT1  = 0.5", "PS1_0   = 'T'", "PS1_1   = 'x'", "PS1_2   = 'i'")
	b.Reset()
	fits.WriteTable(&b, nil, "T", []fits.Vector{{Name: "x", Type: 'D', Rows: [][]float64{{500, 501}}}, {Name: "i", Type: 'D', Rows: [][]float64{{1, 2}}}}, nil)
	f.Add(append(lookup, b.Bytes()[2880:]...))
	f.Add(e2dsImage("ESO DRS", 2, nil))
	f.Add(koaImage("4050 0.1 0 0"))
	f.Add(multispecImage(5, []string{"1 10 2 5000 0.5 5 0 1 2 1 0 4 1 1 5 5000 5002", "2 11 1 3.7 1e-5 5 0 1 2"}))
	wave := rawImage([]int{3}, func(i int) float64 { return 5000 + float64(i) }, "PCOUNT  = 0", "GCOUNT  = 1", "EXTNAME = 'WAVE'")
	copy(wave, "XTENSION= 'IMAGE   '          ")
	f.Add(append(rawImage([]int{3}, func(i int) float64 { return 1 }, "EXTNAME = 'FLUX'"), wave...))
	shared(f, "samples/*.fits", "bad/*.fits")
	f.Fuzz(func(t *testing.T, in []byte) {
		if !bytes.HasPrefix(in, []byte("SIMPLE  =")) {
			return
		}
		fuzzRead(t, in, Options{})
		fuzzRead(t, in, Options{WaveUnit: "nm", Frame: frame.Topocentric, Medium: frame.Air, Row: 1, FluxCol: "1", ErrCol: "2"})
	})
}

// A name with any byte in it must come back in errors as it is.
func TestErrorsNameTheFile(t *testing.T) {
	_, err := read(fits.FromBytes("my spectrum.dat", []byte("a b\n")), Options{})
	if err == nil || !strings.HasPrefix(err.Error(), "my spectrum.dat: ") {
		t.Errorf("%v", err)
	}
}
