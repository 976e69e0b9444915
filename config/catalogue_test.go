package config

import (
	"bytes"
	"fmt"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"lacuna/internal/oops"
	"lacuna/spectrum/frame"
)

const catalogueTOML = `
[survey]
name = "s"
scale = "asplund2021"
catalogue = "stars.csv"
catalogue_ignore = ["plate"]
[defaults]
velocity = [-50, 45]
lines = ["Na D2"]
spectrum.resolving_power = 40000
[[sightline]]
name = "Lantern 3"
[[sightline.spectrum]]
file = "three.fits"
[[sightline]]
name = "Lantern 2"
override = true
velocity = [-20, 20]
hydrogen = {logN_H = 21, logN_H_err = 0.2, source = "Author 2002"}
`

const catalogueCSV = `name,file,E_BV,E_BV_err,velocity_min,velocity_max,medium,resolving_power,normalised,continuum_err,logN_HI,logN_HI_err,hydrogen_source,plate
Lantern 1,a.fits; b/c.fits,0.3,0.03,-100,100,air,80000,true,0.01,21.10,0.05,Author 2001,7
"Lantern <2>, B",d.fits,,,,,,,,,,,Author 2001,8
Lantern 2,e.fits,,,,,vacuum,,false,,,,,
`

// withCatalogue loads a survey beside a table.
func withCatalogue(t testing.TB, text, csv string) (*Survey, error) {
	t.Helper()
	dir := t.TempDir()
	for name, b := range map[string]string{"s.toml": text, "stars.csv": csv} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(b), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return Load(filepath.Join(dir, "s.toml"))
}

func TestCatalogue(t *testing.T) {
	s, err := withCatalogue(t, catalogueTOML, catalogueCSV)
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, x := range s.Sightlines {
		names = append(names, fmt.Sprintf("%s %d %v", x.Name, len(x.Spectra), x.Velocity))
	}
	want := []string{"Lantern 1 2 [-100 100]", "Lantern <2>, B 1 [-50 45]", "Lantern 2 1 [-20 20]", "Lantern 3 1 [-50 45]"}
	if !reflect.DeepEqual(names, want) {
		t.Errorf("got %v, want %v", names, want)
	}
	x := s.Sightlines[0]
	if *x.EBV != (Quantity{0.3, 0.03, ""}) || *x.Hydrogen.HI != 21.1 || x.Hydrogen.Source != "Author 2001" {
		t.Errorf("%+v %+v", x.EBV, x.Hydrogen)
	}
	for i, file := range []string{"a.fits", "b/c.fits"} {
		if sp := x.Spectra[i]; sp.File != file || sp.Medium != frame.Air || sp.R != 80000 || !*sp.Normalised || sp.ContinuumErr != 0.01 {
			t.Errorf("spectrum %+v", sp)
		}
	}
	if x := s.Sightlines[1]; x.EBV != nil || x.Hydrogen != nil || x.Spectra[0].Normalised != nil || x.Spectra[0].R != 40000 {
		t.Errorf("empty cells are not absent: %+v", x)
	}
	if x := s.Sightlines[2]; x.Spectra[0].Medium != frame.Vacuum || *x.Hydrogen.H != 21 {
		t.Errorf("override: %+v", x)
	}
	r := string(s.Resolved())
	if strings.Contains(r, "catalogue =") || !strings.Contains(r, "file = \"a.fits\"  # catalogue\n") {
		t.Errorf("resolved:\n%s", r)
	}
	again, err := load(t, r)
	if err != nil {
		t.Fatal(err)
	}
	same(t, s.Sightlines, again.Sightlines, s.Resolved(), again.Resolved())
}

func TestCatalogueAsECSV(t *testing.T) {
	ecsv := `# %ECSV 1.0
# ---
# delimiter: ','
# datatype:
# - {name: name, datatype: string}
# - {name: file, datatype: string}
# - {name: ra, unit: deg, datatype: float64}
# - {name: dec, unit: deg, datatype: float64}
# - {name: row, datatype: int64}
# schema: astropy-2.0
name,file,ra,dec,row
Lantern 1,a.fits,83.25,-1.5,2
`
	s, err := withCatalogue(t, ok[:strings.Index(ok, "[[")]+"survey.catalogue = 1", ecsv)
	if err == nil {
		t.Fatal(s)
	}
	s, err = withCatalogue(t, strings.Replace(ok[:strings.Index(ok, "[[")], "name = \"s\"", "name = \"s\"\ncatalogue = \"stars.csv\"", 1), ecsv)
	if err != nil {
		t.Fatal(err)
	}
	if x := s.Sightlines[0]; *x.RA != 83.25 || *x.Dec != -1.5 || x.Spectra[0].Row != 2 {
		t.Errorf("%+v", x)
	}
}

func TestCatalogueMistakes(t *testing.T) {
	const head = "name,file,E_BV,E_BV_err,velocity_min,velocity_max,resolving_power,medium,normalised,logN_HI,logN_HI_err,hydrogen_source\n"
	text := strings.Replace(catalogueTOML[:strings.Index(catalogueTOML, "[[")], "catalogue_ignore = [\"plate\"]\n", "", 1)
	for _, tc := range []struct {
		name, text, csv string
		want            []string
	}{
		{"unknown column", text, "name,file,logN_Hl\nLantern 1,a.fits,21\n", []string{"stars.csv: column logN_Hl: unknown column; did you mean logN_HI? else add it to catalogue_ignore"}},
		{"a slip beside *", strings.Replace(text, "[defaults]", "catalogue_ignore = [\"*\"]\n[defaults]", 1), "name,file,mediun\nLantern 1,a.fits,air\n", []string{"mediun: unknown column; did you mean medium?"}},
		{"no names", text, "file\na.fits\n", []string{"stars.csv: column name: missing"}},
		{"no rows", text, "name,file\n", []string{"row"}},
		{"no name", text, "name,file\n,a.fits\n", []string{"stars.csv line 2: name: missing"}},
		{"name twice", text, "name,file\nA,a.fits\nA,b.fits\n", []string{"stars.csv line 3 (A): the same name as stars.csv line 2 (A)"}},
		{"no file", text, "name,file\nA,\n", []string{"stars.csv line 2 (A): has neither a spectrum nor a column"}},
		{"a word for a number", text, head + "A,a.fits,high,,,,,,,,,\n", []string{"line 2 (A): E_BV: \"high\" is not a number; leave the cell empty"}},
		{"nan", text, head + "A,a.fits,,,,,nan,,,,,\n", []string{"line 2 (A): spectrum 1: resolving_power: NaN is not a number to work with"}},
		{"hex", text, head + "A,a.fits,,,,,0x10,,,,,\n", []string{"resolving_power: \"0x10\" is not a number"}},
		{"impossible", text, head + "A,a.fits,,,,,-1,,,,,\n", []string{"resolving_power: -1 is impossible"}},
		{"unknown word", text, head + "A,a.fits,,,,,,Air,,,,\n", []string{"medium: \"Air\" is not known; did you mean \"air\"?"}},
		{"switch", text, head + "A,a.fits,,,,,,,maybe,,,\n", []string{"normalised: \"maybe\" is neither true nor false"}},
		{"half a velocity", text, head + "A,a.fits,,,3,,,,,,,\n", []string{"velocity_min: only one of velocity_min and velocity_max"}},
		{"error without value", text, head + "A,a.fits,,0.1,,,,,,,,\n", []string{"E_BV: E_BV_err without E_BV"}},
		{"hydrogen without source", text, head + "A,a.fits,,,,,,,,21,0.1,\n", []string{"hydrogen: source: missing"}},
		{"empty file name", text, "name,file\nA,a.fits;\n", []string{"spectrum 2: file: \"\" is empty"}},
		{"ignored but not there", strings.Replace(text, "[defaults]", "catalogue_ignore = [\"plate\"]\n[defaults]", 1), "name,file\nA,a.fits\n", []string{`catalogue_ignore: the catalogue has no column "plate"`}},
		{"ragged", text, "name,file\nA,a.fits,7\n", []string{"stars.csv", "line 2"}},
		{"FITS", text, "SIMPLE  =                    T\n", []string{"this is a FITS file"}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			_, err := withCatalogue(t, tc.text, tc.csv)
			checkMistake(t, err, tc.want)
			if err != nil && strings.Contains(err.Error(), "\n") {
				t.Errorf("more than the one mistake:\n%v", err)
			}
		})
	}
}

func TestCatalogueIgnoresAll(t *testing.T) {
	text := strings.Replace(catalogueTOML, `["plate"]`, `["*"]`, 1)
	csv := strings.Replace(catalogueCSV, "plate", "Gaia source", 1)
	if _, err := withCatalogue(t, text, csv); err != nil {
		t.Error(err)
	}
}

func FuzzCatalogue(f *testing.F) {
	f.Add(catalogueCSV)
	f.Add("# %ECSV 1.0\n# ---\n# datatype:\n# - {name: name, datatype: string}\nname\nA\n")
	dir := f.TempDir()
	if err := os.WriteFile(filepath.Join(dir, "s.toml"), []byte(catalogueTOML), 0o644); err != nil {
		f.Fatal(err)
	}
	f.Fuzz(func(t *testing.T, csv string) {
		if err := os.WriteFile(filepath.Join(dir, "stars.csv"), []byte(csv), 0o644); err != nil {
			t.Fatal(err)
		}
		s, err := Load(filepath.Join(dir, "s.toml"))
		if err != nil {
			if !oops.IsInput(err) {
				t.Fatal(err)
			}
			return
		}
		again, err := load(t, string(s.Resolved()))
		if err != nil {
			t.Fatalf("%v\n%s", err, s.Resolved())
		}
		same(t, s.Sightlines, again.Sightlines, s.Resolved(), again.Resolved())
	})
}

// A survey of this size must stay a matter of seconds; see the benchmark.
func BenchmarkCatalogue(b *testing.B) {
	var csv bytes.Buffer
	csv.WriteString("name,file,resolving_power,E_BV\n")
	for i := range 10000 {
		fmt.Fprintf(&csv, "Star %d,s%d.fits,40000,0.3\n", i, i)
	}
	text := catalogueTOML[:strings.Index(catalogueTOML, "[[")]
	text = strings.Replace(text, "catalogue_ignore = [\"plate\"]\n", "", 1)
	for b.Loop() {
		if _, err := withCatalogue(b, text, csv.String()); err != nil {
			b.Fatal(err)
		}
	}
}
