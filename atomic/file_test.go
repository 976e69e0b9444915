package atomic

import (
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"lacuna/internal/oops"
)

func TestWithFile(t *testing.T) {
	path := filepath.Join(t.TempDir(), "own.csv")
	text := `# lines of Lantern 3
species,level,lambda_air_A,f,f_err,f_src,replaces,structure
Ca II,,3933.6614,0.6500,0.0100,my lifetime,,
"nai",,5889.9509,0.6405,,another paper,,0.375@-0.63 0.625@+0.378
CH,e,3143.162,0.006746,,Masseron2014,CH 3143.15,
CN,N=4,3872.04,0.0188,,computed,,
SO,,2500.00,0.01,,invented,,
`
	if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	tab, err := Default().WithFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if n := len(tab.Lines()) - len(Default().Lines()); n != 2 {
		t.Errorf("%d lines were added, want 2", n)
	}
	k := must(tab.Find("Ca II K"))
	if k.F != 0.65 || k.FErr != 0.01 || k.FStatus != User || k.File != path || k.Gamma != find(t, "Ca II K").Gamma || k.FSource != "my lifetime" {
		t.Errorf("Ca II K: %+v", k)
	}
	d2 := must(tab.Find("Na I D2"))
	if d2.F != 0.6405 || !(math.Abs(d2.FErr-0.06405) < 1e-12) || len(d2.Parts) != 2 || d2.Name != "Na I 5889.95" {
		t.Errorf("Na I D2: %+v", d2)
	}
	ch := must(tab.Find("CH 3143.15"))
	if !(math.Abs(ch.WaveAir-3143.162) < 1e-9) || ch.Alias[0] != "Q2(1)+QR12(1)" {
		t.Errorf("CH 3143: %+v", ch)
	}
	if cn := must(tab.Find("CN 3872.04")); cn.Carrier() != "CN N=4" {
		t.Errorf("CN: %q", cn.Carrier())
	}
	if so := must(tab.Find("SO")); !(math.Abs(so.Mass()-48.059) < 0.001) || !so.Molecule() { // 32.06 + 15.999
		t.Errorf("SO: %g", so.Mass())
	}
	// a set does not undo the user's own value
	if k := must(must(tab.WithSet("NIST")).Find("Ca II K")); k.F != 0.65 {
		t.Errorf("after WithSet f = %g", k.F)
	}
	if k := find(t, "Ca II K"); k.F != 0.6267 {
		t.Error("the default table was changed")
	}
	// our own lines.csv is itself a valid file of a user
	if tab, err = Default().WithFile("lines.csv"); err != nil || len(tab.Lines()) != len(Default().Lines()) {
		t.Errorf("lines.csv as a user's file: %v", err)
	}
}

func TestWithFileRefuses(t *testing.T) {
	const head = "species,lambda_vac_A,f,f_src\n"
	for text, want := range map[string]string{
		"":                                          "no header",
		"species,f\n":                               `"f_src" is missing`,
		"species,f,f_src\n":                         "no column of wavelengths",
		head:                                        "no rows",
		"species,lambda_vac_A,f,fsrc\n":             `did you mean "f_src"`,
		"species,species,f,f_src\n":                 "stands twice",
		head + "Na I,5891.6,0.6\n":                  "line 2: not as many cells",
		head + "Na I,5891.6,0.6,\n":                 "line 2, f_src: no source",
		head + "Na I,5891.6,nan,x\n":                `line 2, f: "nan" is not a number`,
		head + "Na I,5891.6,0x1,x\n":                "is not a number",
		head + "Na I,5891.6,-1,x\n":                 "out of range",
		head + "Na I,,0.1,x\n":                      "no wavelength",
		head + "# note\nNa,5891.6,0.1,x\n":          "line 3, species",
		head + "C I*,1656.2672,0.1,x\n":             "an excited level goes into the column level",
		head + "Na I,5891.5600,0.6,x\n":             "Na I 5889.95 stands 1.2 km/s away",
		head + "Na I,4000,0.6,x\nNa I,4000,0.6,y\n": "the same line as in line 2",
		head + "Na I,5891.5833,0.6,x\nNa I,5891.5830,0.6,y\n":                      "as line 2 does",
		"species,lambda_vac_A,f,f_src,replaces\nNa I,5891.6,0.6,x,K I 7699\n":      "is a line of K I",
		"species,lambda_vac_A,f,f_src,replaces\nNa I,5891.6,0.6,x,Na I 1\n":        "no line at 1",
		"species,lambda_vac_A,lambda_air_A,f,f_src\nNa I,5891.5833,5889.9,0.6,x\n": "Ciddor",
		"species,lambda_vac_A,f,f_src,f_err,f_grade\nNa I,4000,0.6,x,0.1,A\n":      "both f_err and f_grade",
		"species,lambda_vac_A,f,f_src,f_grade\nNa I,4000,0.6,x,200%\n":             "not a grade",
		"species,lambda_vac_A,f,f_src,structure\nNa I,4000,0.6,x,0.5@0 0.2@1\n":    "sum to 0.70000",
		"species,lambda_vac_A,f,f_src,structure\nNa I,4000,0.6,x,0.5@zz\n":         "strength@offset",
		"species,lambda_vac_A,f,f_src,level\nNa I,4000,0.6,x,N=1\n":                "does not belong",
		"species,lambda_vac_A,f,f_src,f_status\nNa I,4000,0.6,x,sure\n":            "not a status",
		"species,lambda_vac_A,f,f_src\n\"Na I,4000,0.6,x\n":                        "line",
		"species,lambda_vac_A,f,f_src\nNa I,4000,0.6,\xff\n":                       "UTF-8",
	} {
		_, err := Default().withReader("own.csv", strings.NewReader(text))
		if err == nil {
			t.Errorf("accepted: %q", text)
			continue
		}
		if !oops.IsInput(err) || !strings.HasPrefix(err.Error(), "own.csv") || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: %v; want %q", text, err, want)
		}
	}
	if _, err := Default().WithFile(filepath.Join(t.TempDir(), "absent.csv")); !oops.IsInput(err) {
		t.Errorf("an absent file: %v", err)
	}
}

func FuzzWithFile(f *testing.F) {
	own, err := os.ReadFile("lines.csv")
	if err != nil {
		f.Fatal(err)
	}
	f.Add(own[:3000])
	f.Add([]byte("species,lambda_air_A,f,f_src,structure,replaces\nCa II,3933.6614,0.65,x,1@0,\nSO+,4000,1,y,,none\n"))
	f.Add([]byte("\ufeffspecies;f\n"))
	f.Fuzz(func(t *testing.T, in []byte) {
		tab, err := Default().withReader("fuzz.csv", strings.NewReader(string(in)))
		if err != nil {
			if !oops.IsInput(err) {
				t.Fatalf("not the user's mistake: %v", err)
			}
			return
		}
		seen, prev, own := map[string]bool{}, 0.0, 0
		for _, l := range tab.Lines() {
			if l.File != "" {
				own++
				if l.FStatus != User || l.FSource == "" {
					t.Fatalf("%+v", l)
				}
			}
			sum := 0.0
			for _, p := range l.Parts {
				sum += p.Strength
			}
			ok := !seen[l.Name] && l.Wave >= prev && l.F > 0 && l.FErr >= 0 && l.FErr <= l.F && l.Mass() > 0 &&
				!math.IsInf(l.Wave, 0) && !math.IsNaN(l.WaveAir) && (len(l.Parts) == 0 || math.Abs(sum-1) < 1e-9)
			if !ok {
				t.Fatalf("accepted %q: %+v", in, l)
			}
			seen[l.Name], prev = true, l.Wave
		}
		if own == 0 {
			t.Fatalf("accepted without a line: %q", in)
		}
	})
}
