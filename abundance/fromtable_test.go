package abundance_test

import (
	"math"
	"strings"
	"testing"

	"lacuna/abundance"
	"lacuna/internal/oops"
	"lacuna/internal/table"
)

func fromCSV(t testing.TB, text string) ([]abundance.Sightline, error) {
	t.Helper()
	tab, err := table.ReadCSV(strings.NewReader(text), "cols.csv")
	if err != nil {
		t.Fatal(err)
	}
	return abundance.DepleteTable(tab, "asplund2021")
}

func TestDepleteTable(t *testing.T) {
	ss, err := fromCSV(t, `sightline,species,logN,logN_err,logN_kind,logN_HI,logN_HI_err,logN_H2,logN_H2_err,logN_H2_max,hydrogen_source
Lantern 1,Fe II,14.50,0.05,,21.00,0.05,20.0,0.1,,invented
Lantern 2,Zn II,13.10,0.03,value,20.50,0.04,,,19.0,invented
Lantern 1,Na I,13.20,,lower,21.00,0.05,20.0,0.1,,invented
Lantern 3,Fe II,14.2,0.1,,,,,,,
Lantern 2,Ti II,11.5,,upper,,,,,,
Lantern 2,CN N=0,12.5,0.1,,,,,,,
`)
	if err != nil {
		t.Fatal(err)
	}
	if len(ss) != 3 || ss[0].Name != "Lantern 1" || ss[1].Name != "Lantern 2" || len(ss[1].Columns) != 3 {
		t.Fatalf("sightlines: %+v", ss)
	}
	fe := ss[0].Depletions[1]
	if w := 14.5 - math.Log10(1e21+2e20) - (fe.Solar - 12); fe.Element != "Fe" || !near(fe.D.X, w, 1e-9) {
		t.Errorf("D(%s) = %.4f, want %.4f", fe.Element, fe.D.X, w)
	}
	if na := ss[0].Depletions[0]; na.Refused != abundance.TraceRefusal {
		t.Errorf("Na: %q", na.Refused)
	}
	if zn := ss[1].Depletions[1]; zn.Element != "Zn" || zn.D.Kind() != "interval" {
		t.Errorf("Zn with H2 bounded: %s %s", zn.Element, zn.D.Kind())
	}
	if ti := ss[1].Depletions[0]; ti.D.Kind() != "upper" {
		t.Errorf("Ti: %s", ti.D.Kind())
	}
	if ss[2].Hydrogen != nil || ss[2].Depletions[0].Refused != "N(H) is not known" {
		t.Errorf("no hydrogen: %q", ss[2].Depletions[0].Refused)
	}
}

func TestBadDepleteTables(t *testing.T) {
	const head = "sightline,species,logN,logN_err,logN_kind,logN_HI,logN_HI_err,logN_H2,logN_H2_err,logN_H,logN_H_err,logN_H_max\n"
	for _, tc := range []struct{ name, in, want string }{
		{"negative", head + "a,Fe II,-14,0.1,,21,0.1,,,,,\n", "cols.csv: line 2, column logN: found -14, expected 5 to 25"},
		{"linear", head + "a,Fe II,3e14,0.1,,21,0.1,,,,,\n", "give log10"},
		{"NaN", head + "a,Fe II,nan,0.1,,21,0.1,,,,,\n", "line 2, column logN: found nan"},
		{"NaN error", head + "a,Fe II,14,nan,,21,0.1,,,,,\n", "line 2, column logN_err: found nan"},
		{"word", head + "a,Fe II,14,0.1,,x,0.1,,,,,\n", `line 2, column logN_HI: found "x", expected a number`},
		{"no error", head + "a,Fe II,14,,,21,0.1,,,,,\n", "line 2, column logN_err: a value without an error"},
		{"zero error", head + "a,Fe II,14,0,,21,0.1,,,,,\n", "line 2, column logN_err: found 0"},
		{"negative error", head + "a,Fe II,14,-0.1,,21,0.1,,,,,\n", "line 2, column logN_err"},
		{"limit with error", head + "a,Fe II,14,0.1,upper,21,0.1,,,,,\n", "line 2, column logN_err: a limit with an error"},
		{"kind", head + "a,Fe II,14,0.1,about,21,0.1,,,,,\n", `line 2, column logN_kind: "about" is no kind`},
		{"species", head + "a,Fx II,14,0.1,,21,0.1,,,,,\n", `line 2, column species: "Fx II" is not a known ion`},
		{"species near", head + "a,FeII,14,0.1,,21,0.1,,,,,\n", "did you mean Fe II"},
		{"hydrogen as row", head + "a,H I,21,0.1,,21,0.1,,,,,\n", "hydrogen is no row"},
		{"no species", head + "a,,14,0.1,,21,0.1,,,,,\n", "line 2, column species: a column of no species"},
		{"no column", head + "a,Fe II,,,,21,0.1,,,,,\n", "line 2, column logN: no column of Fe II"},
		{"no sightline", head + ",Fe II,14,0.1,,21,0.1,,,,,\n", "line 2, column sightline: no sightline"},
		{"twice", head + "a,Fe II,14,0.1,,21,0.1,,,,,\na,Fe II,14,0.1,,21,0.1,,,,,\n", "line 3, column species: Fe II of a stands in the table twice"},
		{"H I differs", head + "a,Fe II,14,0.1,,21,0.1,,,,,\na,Zn II,14,0.1,,21.1,0.1,,,,,\n", "line 3, column logN_HI: logN_HI of this sightline differs from line 2"},
		{"H I without error", head + "a,Fe II,14,0.1,,21,,,,,,\n", "line 2, column logN_HI_err: a value without an error"},
		{"error without H I", head + "a,Fe II,14,0.1,,,0.1,,,,,\n", "line 2, column logN_HI: an error or a kind without a column"},
		{"total beside part", head + "a,Fe II,14,0.1,,21,0.1,,,21.1,0.1,\n", "the total N(H) beside"},
		{"H2 alone", head + "a,Fe II,14,0.1,,,,20,0.1,,,\n", "N(H2) alone does not give N(H)"},
		{"value and limit", head + "a,Fe II,14,0.1,,,,,,21.1,0.1,22\n", "line 2, column logN_H: logN_H beside logN_H_max"},
		{"columns", "star,ion,N\na,Fe II,14\n", `no column "sightline"`},
		{"unit", "sightline,species,logN (1 / cm2),logN_err\na,Fe II,14,0.1\n", "not a logarithm"},
		{"no rows", head, "the table has no rows"},
	} {
		_, err := fromCSV(t, tc.in)
		if err == nil || !oops.IsInput(err) || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("%s: %v, want %q", tc.name, err, tc.want)
		}
	}
}

// Whatever table is accepted: no panic, every number of D is finite or refused.
func FuzzDepleteTable(f *testing.F) {
	f.Add("sightline,species,logN,logN_err,logN_kind,logN_HI,logN_HI_err\na,Fe II,14,0.1,,21,0.1\na,C II*,14,,upper,,\n")
	f.Add("object,species,logN,logN_err,logN_H,logN_H_max\na,CN N=1,12,0.1,,21\n,,,,,\n")
	f.Add("sightline,species,logN,logN_err_up,logN_err_lo,logN_H,logN_H_kind\na,Cl I,14,0.1,0.2,21,upper\n")
	f.Fuzz(func(t *testing.T, in string) {
		tab, err := table.ReadCSV(strings.NewReader(in), "fuzz")
		if err != nil {
			return
		}
		ss, err := abundance.DepleteTable(tab, "asplund2009")
		if err != nil {
			if !oops.IsInput(err) {
				t.Fatalf("%q: %v is not an input error", in, err)
			}
			return
		}
		for _, s := range ss {
			for _, d := range s.Depletions {
				if (d.Refused == "") != (d.D.Kind() != "none") || math.IsInf(d.D.X, 0) {
					t.Fatalf("%q: %s: D = %v, refused %q", in, d.Element, d.D.X, d.Refused)
				}
			}
		}
	})
}
