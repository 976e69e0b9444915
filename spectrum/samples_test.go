package spectrum_test

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"testing"

	"lacuna/internal/check"
	"lacuna/internal/oops"
	"lacuna/spectrum"
	"lacuna/spectrum/frame"
)

// expected is formats/samples/expected.json: made with the files by their author,
// and re-read by an independent script of theirs.
type expected struct {
	Files []struct {
		File, Medium, Frame string
		FrameRecorded       any `json:"frame_recorded"`
		MediumRecorded      any `json:"medium_recorded"`
		Uncalibrated        any `json:"uncalibrated_rows"`
		Segments            []struct {
			ID        string
			Valid     int     `json:"valid_pixels"`
			First     float64 `json:"first_A"`
			Last      float64 `json:"last_A"`
			Continuum float64 `json:"continuum_level"`
			HasError  bool    `json:"has_error"`
			Bad       []int   `json:"bad_pixels_index0"`
			TolWave   float64 `json:"tol_wavelength_A"`
			TolFlux   float64 `json:"tol_flux_rel_of_continuum"`
			Spots     []struct {
				Index   int      `json:"index0"`
				Wave    float64  `json:"wavelength_A"`
				VacBary float64  `json:"wavelength_vac_bary_A"`
				Flux    *float64 `json:"flux"`
				Error   *float64 `json:"error"`
			}
			Lines []struct {
				Centre float64 `json:"centre_A"`
				EW     float64 `json:"ew_mA"`
				Bad    int     `json:"bad_pixels_within_5_sigma"`
			}
		}
	}
}

func TestSamples(t *testing.T) {
	dir := check.Shared(t, "formats/samples")
	b, err := os.ReadFile(filepath.Join(dir, "expected.json"))
	if err != nil {
		t.Fatal(err)
	}
	var all expected
	if err := json.Unmarshal(b, &all); err != nil {
		t.Fatal(err)
	}
	if len(all.Files) != 20 {
		t.Fatalf("%d samples", len(all.Files))
	}
	for _, f := range all.Files {
		t.Run(f.File, func(t *testing.T) {
			path := filepath.Join(dir, f.File)
			// Lantern 07's place, for LSRK: sample 19 has no coordinates.
			s, err := spectrum.Read(path, spectrum.Options{Coord: &spectrum.Coord{RA: 312.2345, Dec: 44.1234}})
			if err != nil {
				t.Fatal(err)
			}
			if len(s.Segments) != len(f.Segments) {
				t.Fatalf("%d segments, want %d", len(s.Segments), len(f.Segments))
			}
			for k := range s.Segments {
				g, want := &s.Segments[k], f.Segments[k]
				if f.MediumRecorded != false && string(g.Medium) != f.Medium || f.MediumRecorded == false && g.Medium != frame.UnknownMedium {
					t.Errorf("%s: medium %q (%s), want %q, recorded %v", g.Label, g.Medium, g.MediumBy, f.Medium, f.MediumRecorded)
				}
				// Frames that only an instrument rule knows may be known here.
				if g.Frame != frame.Unknown && string(g.Frame) != f.Frame || f.FrameRecorded != false && g.Frame == frame.Unknown {
					t.Errorf("%s: frame %q (%s), want %q", g.Label, g.Frame, g.FrameBy, f.Frame)
				}
				if len(g.Wave) != want.Valid || (g.Err != nil) != want.HasError {
					t.Fatalf("%s: %d pixels, errors %v; want %d, %v", g.Label, len(g.Wave), g.Err != nil, want.Valid, want.HasError)
				}
				var bad []int
				for i, m := range g.Mask {
					if m.Bad() {
						bad = append(bad, i)
					}
				}
				if !slices.Equal(bad, want.Bad) {
					t.Errorf("%s: bad pixels %v, want %v", g.Label, bad, want.Bad)
				}
				near := func(what string, i int, got, want, tol float64) {
					if !(math.Abs(got-want) <= tol) {
						t.Errorf("%s: %s at %d: %.9g, want %.9g to %g", g.Label, what, i, got, want, tol)
					}
				}
				n := len(g.Wave)
				near("wavelength", 0, g.Wave[0], want.First, want.TolWave)
				near("wavelength", n-1, g.Wave[n-1], want.Last, want.TolWave)
				for _, p := range want.Spots {
					near("wavelength", p.Index, g.Wave[p.Index], p.Wave, want.TolWave)
					if p.Flux != nil {
						near("flux", p.Index, g.Flux[p.Index], *p.Flux, want.TolFlux*want.Continuum)
					}
					if p.Error != nil {
						near("error", p.Index, g.Err[p.Index], *p.Error, 1e-5**p.Error) // six digits are given
					}
				}
				for _, l := range want.Lines {
					near("width", 0, width(g, l.Centre, want.Continuum), l.EW, widthTolerance(l.Bad))
				}
				// On to vacuum and barycentre, the user filling in what no file says.
				if g.Medium == frame.UnknownMedium {
					g.Medium = frame.Medium(f.Medium)
				}
				if g.Frame == frame.Unknown {
					g.Frame = frame.Kind(f.Frame)
				}
				if err := g.ToVacuum(frame.Ciddor1996); err != nil {
					t.Fatal(err)
				}
				if err := g.ToFrame(frame.Barycentric); err != nil {
					t.Fatal(err)
				}
				// Heliocentric wavelengths stand in for barycentric ones: 0.0118 km/s here.
				tol := want.TolWave
				if f.Frame == "HELIOCEN" || strings.HasPrefix(f.File, "07_") {
					tol += 0.0119 / frame.C * 3250
				}
				for _, p := range want.Spots {
					near("vacuum barycentric wavelength", p.Index, g.Wave[p.Index], p.VacBary, tol)
				}
			}
		})
	}
}

// expected.json says that summing (1 − flux/continuum) Δλ gives the width to
// 0.05 mÅ where no pixel is bad; where some are they lack here.
func widthTolerance(bad int) float64 {
	if bad > 0 {
		return math.Inf(1)
	}
	return 0.05
}

// width sums over 0.8 Å on either side: more than 5 sigma of every line.
func width(g *spectrum.Segment, centre, level float64) float64 {
	sum := 0.0
	for i := 1; i+1 < len(g.Wave); i++ {
		if math.Abs(g.Wave[i]-centre) < 0.8 && !g.Mask[i].Bad() {
			sum += (1 - g.Flux[i]/level) * (g.Wave[i+1] - g.Wave[i-1]) / 2
		}
	}
	return 1000 * sum
}

// formats/bad/expected.json: what every broken file deserves.
func TestBadFiles(t *testing.T) {
	dir := check.Shared(t, "formats/bad")
	b, err := os.ReadFile(filepath.Join(dir, "expected.json"))
	if err != nil {
		t.Fatal(err)
	}
	var all struct {
		Files []struct {
			File, Expect string
			Mention      []string `json:"message_should_mention"`
			Pixels       int
			Masked       int      `json:"masked_pixels"`
			HasError     *bool    `json:"has_error"`
			First        *float64 `json:"first_A"`
			Last         *float64 `json:"last_A"`
		}
	}
	if err := json.Unmarshal(b, &all); err != nil {
		t.Fatal(err)
	}
	if len(all.Files) != 20 {
		t.Fatalf("%d files", len(all.Files))
	}
	for _, f := range all.Files {
		t.Run(f.File, func(t *testing.T) {
			s, err := spectrum.Read(filepath.Join(dir, f.File), spectrum.Options{})
			if f.Expect == "error" {
				if !oops.IsInput(err) {
					t.Fatalf("error %v, want one of the user's input", err)
				}
				for _, word := range append(f.Mention, f.File) {
					if !strings.Contains(strings.ToLower(err.Error()), strings.ToLower(word)) {
						t.Errorf("%q does not mention %q", err, word)
					}
				}
				return
			}
			if err != nil {
				t.Fatal(err)
			}
			g := &s.Segments[0]
			if len(s.Segments) != 1 || len(g.Wave) != f.Pixels || len(g.Wave)-g.Good() != f.Masked {
				t.Errorf("%d segments, %d pixels, %d masked; want 1, %d, %d", len(s.Segments), len(g.Wave), len(g.Wave)-g.Good(), f.Pixels, f.Masked)
			}
			if f.HasError != nil && (g.Err != nil) != *f.HasError {
				t.Errorf("has errors: %v, want %v", g.Err != nil, *f.HasError)
			}
			if f.First != nil && !(math.Abs(g.Wave[0]-*f.First) < 1e-6) || f.Last != nil && !(math.Abs(g.Wave[len(g.Wave)-1]-*f.Last) < 1e-6) {
				t.Errorf("%.4f to %.4f Å, want %.4f to %.4f", g.Wave[0], g.Wave[len(g.Wave)-1], *f.First, *f.Last)
			}
			said := strings.ToLower(strings.Join(append(g.Notes, s.Notes...), "; "))
			for _, word := range f.Mention {
				if !strings.Contains(said, strings.ToLower(word)) {
					t.Errorf("notes %q do not mention %q", said, word)
				}
			}
		})
	}
}

// formats/bad/expected.json gives a file that promises 4 TB no more than 64 MiB.
func TestHugePromiseCostsNoMemory(t *testing.T) {
	path := filepath.Join(check.Shared(t, "formats/bad"), "b03_huge_naxis1.fits")
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	if _, err := spectrum.Read(path, spectrum.Options{}); err == nil {
		t.Fatal("it was read")
	}
	runtime.ReadMemStats(&after)
	if used := after.TotalAlloc - before.TotalAlloc; used > 1<<20 { // headers are a few kB
		t.Errorf("%d bytes allocated", used)
	}
}
