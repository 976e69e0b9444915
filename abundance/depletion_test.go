package abundance_test

import (
	"math"
	"strings"
	"testing"

	"lacuna/abundance"
	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/internal/check"
	"lacuna/internal/oops"
)

func stated(t testing.TB, x, err float64, kind string) *budget.Number {
	t.Helper()
	n, e := abundance.Stated(x, err, err, kind, 0, "invented")
	if e != nil {
		t.Fatal(e)
	}
	return &n
}

func col(t testing.TB, species string, x, err float64, kind string) abundance.Column {
	t.Helper()
	el, _, _ := atomic.SplitSpecies(species)
	return abundance.Column{Species: species, Element: el, Method: abundance.MethodGiven, LogN: *stated(t, x, err, kind)}
}

func total(t testing.TB, x, err float64, kind string) abundance.Hydrogen {
	t.Helper()
	h, e := abundance.NewHydrogen(abundance.HydrogenInput{Sightline: "Lantern 1", Total: stated(t, x, err, kind), Source: "invented"})
	if e != nil {
		t.Fatal(e)
	}
	return h
}

func deplete(t testing.TB, cols []abundance.Column, h abundance.Hydrogen, scale string) map[string]abundance.Depletion {
	t.Helper()
	ds, err := abundance.Deplete(cols, h, scale)
	if err != nil {
		t.Fatal(err)
	}
	out := map[string]abundance.Depletion{}
	for _, d := range ds {
		out[d.Element] = d
	}
	return out
}

// Savage & Sembach 1996, ARA&A 34, 279, Table 5, the cool cloud towards ζ Oph, in
// their scale and moved to the proto-solar scale of Lodders 2003, as transcribed
// in reference/fstar_examples.csv. Columns and D are printed to 0.01 dex there.
func TestZetaOph(t *testing.T) {
	rows := check.CSV(t, check.Shared(t, "reference/fstar_examples.csv"))
	var cols []abundance.Column
	type want struct{ ss96, l03 float64 }
	wants := map[string]want{}
	for _, r := range rows {
		if !strings.HasPrefix(r["sightline"], "zeta Oph cool") || r["kind"] != "observed" {
			continue
		}
		el := r["element"]
		ion := el + " II"
		if el == "N" || el == "O" {
			ion = el + " I"
		}
		cols = append(cols, col(t, ion, check.F(t, r, "logN_ion"), check.F(t, r, "sig_logN"), "value"))
		wants[el] = want{check.F(t, r, "D_in_its_scale"), check.F(t, r, "D_L03_protosolar")}
	}
	if len(cols) != 9 {
		t.Fatalf("%d rows, want 9", len(cols))
	}
	h := total(t, 21.12, 0.1, "value")
	old := deplete(t, cols, h, "savage-sembach1996")
	now := deplete(t, cols, h, "lodders2003proto")
	for el, w := range wants {
		a, b := old[el], now[el]
		if a.Refused != "" || b.Refused != "" {
			t.Errorf("%s refused: %s %s", el, a.Refused, b.Refused)
			continue
		}
		const tol = 0.0101 // two roundings to 0.01
		if d := math.Abs(a.D.X - w.ss96); !(d <= tol) {
			t.Errorf("D(%s) = %.3f in the scale of 1996, want %.2f", el, a.D.X, w.ss96)
		}
		if d := math.Abs(b.D.X - w.l03); !(d <= tol) {
			t.Errorf("D(%s) = %.3f in that of Lodders 2003, want %.2f", el, b.D.X, w.l03)
		}
		// D_new = D_old + ε_old − ε_new, whatever the columns (the definition)
		if d := math.Abs(b.D.X - (a.D.X + a.Solar - b.Solar)); !(d <= 1e-12) {
			t.Errorf("%s: moving the scale is off by %.1e", el, d)
		}
		if d := math.Abs(a.Gas.X - b.Gas.X); !(d <= 1e-12) {
			t.Errorf("%s: the gas abundance depends on the scale by %.1e", el, d)
		}
	}
}

// The two identities of a depletion: a factor on all columns and on hydrogen
// changes nothing; [X/Y] knows no hydrogen. And the error by parts.
func TestDepletionIdentities(t *testing.T) {
	cols := func(shift float64) []abundance.Column {
		return []abundance.Column{col(t, "Fe II", 14.2+shift, 0.05, "value"), col(t, "Zn II", 12.9+shift, 0.03, "value"), col(t, "Ti II", 11.1+shift, 0.2, "value")}
	}
	a := deplete(t, cols(0), total(t, 21.0, 0.08, "value"), "asplund2021")
	b := deplete(t, cols(0.7), total(t, 21.7, 0.08, "value"), "asplund2021")
	c := deplete(t, cols(0), total(t, 20.0, 0, "upper"), "asplund2021")
	for _, el := range []string{"Fe", "Zn", "Ti"} {
		if d := math.Abs(a[el].D.X - b[el].D.X); !(d <= 1e-12) {
			t.Errorf("%s: a common factor changes D by %.1e", el, d)
		}
	}
	fe := a["Fe"]
	// in quadrature by hand: 0.05 ⊕ 0.08 without, and ⊕ σ(ε) with the scale
	if w := math.Hypot(0.05, 0.08); !(math.Abs(fe.D.Without(budget.Solar)-w) <= 1e-12) {
		t.Errorf("error without the scale %.5f, want %.5f", fe.D.Without(budget.Solar), w)
	}
	if w := math.Hypot(math.Hypot(0.05, 0.08), fe.SolarErr); fe.SolarErr <= 0 || !(math.Abs(fe.D.Err()-w) <= 1e-12) {
		t.Errorf("error with the scale %.5f, want %.5f", fe.D.Err(), w)
	}
	if !(math.Abs(fe.D.ErrBy(budget.Hydrogen)-0.08) <= 1e-12) {
		t.Errorf("hydrogen's part is %.5f, want 0.08", fe.D.ErrBy(budget.Hydrogen))
	}
	for _, h := range []map[string]abundance.Depletion{a, b, c} {
		r, err := abundance.Ratio(h["Fe"], h["Zn"])
		if err != nil {
			t.Fatal(err)
		}
		if r.ErrBy(budget.Hydrogen) != 0 || r.Kind() != "value" {
			t.Errorf("[Fe/Zn] is a %s with %.3f from hydrogen", r.Kind(), r.ErrBy(budget.Hydrogen))
		}
		if w := math.Hypot(0.05, 0.03); !(math.Abs(r.Without(budget.Solar)-w) <= 1e-12) {
			t.Errorf("error of [Fe/Zn] %.5f, want %.5f", r.Without(budget.Solar), w)
		}
		if d := r.X - (a["Fe"].D.X - a["Zn"].D.X); !(math.Abs(d) <= 1e-12) {
			t.Errorf("[Fe/Zn] is not D(Fe) − D(Zn): %.1e", d)
		}
	}
	other := deplete(t, cols(0), total(t, 21, 0.1, "value"), "lodders2003")
	if _, err := abundance.Ratio(a["Fe"], other["Zn"]); err == nil {
		t.Error("two scales were mixed in one ratio")
	}
}

// Which way limits go: practice 1.7 and abundances.md §3, by sign of the definition.
func TestDepletionLimits(t *testing.T) {
	for _, tc := range []struct{ x, h, want string }{
		{"value", "value", "value"}, {"upper", "value", "upper"}, {"lower", "value", "lower"},
		{"value", "upper", "lower"}, {"value", "lower", "upper"},
		{"upper", "lower", "upper"}, {"lower", "upper", "lower"},
		{"lower", "lower", "none"}, {"upper", "upper", "none"},
	} {
		err := func(kind string) float64 {
			if kind == "value" {
				return 0.1
			}
			return 0
		}
		d := deplete(t, []abundance.Column{col(t, "Fe II", 14, err(tc.x), tc.x)}, total(t, 21, err(tc.h), tc.h), "asplund2021")["Fe"]
		if got := d.D.Kind(); got != tc.want {
			t.Errorf("N(X) %s, N(H) %s: D is %s, want %s", tc.x, tc.h, got, tc.want)
		}
		if (tc.want == "none") != (d.Refused != "") {
			t.Errorf("N(X) %s, N(H) %s: refused %q", tc.x, tc.h, d.Refused)
		}
	}
}

func TestWhichIons(t *testing.T) {
	h := total(t, 21, 0.05, "value")
	ds := deplete(t, []abundance.Column{
		col(t, "Na I", 13.5, 0.05, "value"), col(t, "Ca II", 12.5, 0.05, "value"), col(t, "Ca I", 10.2, 0.05, "value"),
		col(t, "Fe I", 11.4, 0.05, "value"), col(t, "Fe II", 14.5, 0.05, "value"), col(t, "CH", 13.1, 0.05, "value"), col(t, "CN N=0", 12.1, 0.05, "value"),
		col(t, "Al III", 12.1, 0.05, "value"), col(t, "Cl II", 12.9, 0.05, "value"), col(t, "K I", 11, 0, "upper"),
	}, h, "asplund2021")
	if len(ds) != 6 {
		t.Errorf("%d elements, want 6 (no molecules)", len(ds))
	}
	for _, el := range []string{"Na", "K"} {
		if d := ds[el]; d.Refused != "trace ion: needs ionization correction" || d.D.Kind() != "none" {
			t.Errorf("%s: %q, %s", el, d.Refused, d.D.Kind())
		}
	}
	ca := ds["Ca"]
	if !strings.Contains(ca.Refused, "Ca II holds only part") || ca.D.Kind() != "none" {
		t.Errorf("Ca: %q, %s", ca.Refused, ca.D.Kind())
	}
	// 12.5 − 21 − (6.30 − 12) = −2.80 with ε(Ca) of Asplund et al. 2021
	if notes := strings.Join(ca.Notes, "; "); !strings.Contains(notes, "D(Ca) > -2.80 from Ca II alone") {
		t.Errorf("Ca notes: %s", notes)
	}
	if fe := ds["Fe"]; fe.Refused != "" || len(fe.Species) != 1 || fe.Species[0] != "Fe II" {
		t.Errorf("Fe: %+v", fe)
	}
	if d := ds["Al"]; d.Refused == "" {
		t.Errorf("Al III gave a depletion")
	}
	if d := ds["Cl"]; d.D.Kind() != "lower" || !strings.Contains(strings.Join(d.Notes, ";"), "Cl I is not there") {
		t.Errorf("Cl II alone: %s, %v", d.D.Kind(), d.Notes)
	}
	both := deplete(t, []abundance.Column{col(t, "Cl I", 14, 0.05, "value"), col(t, "Cl II", 13, 0.05, "value")}, h, "asplund2021")["Cl"]
	if w := 14 + math.Log10(1.1); both.D.Kind() != "value" || !(math.Abs(both.LogN.X-w) <= 1e-12) {
		t.Errorf("N(Cl) = %.4f, want %.4f", both.LogN.X, w)
	}
}

func TestRefusals(t *testing.T) {
	fe := []abundance.Column{col(t, "Fe II", 14, 0.1, "value")}
	h := total(t, 21, 0.1, "value")
	for _, tc := range []struct{ scale, want string }{{"", "none is taken silently"}, {"asplund2020", "did you mean asplund20"}} {
		if _, err := abundance.Deplete(fe, h, tc.scale); !oops.IsInput(err) || !strings.Contains(err.Error(), tc.want) {
			t.Errorf("scale %q: %v", tc.scale, err)
		}
	}
	if _, err := abundance.Deplete(append(fe, fe...), h, "asplund2021"); !oops.IsInput(err) {
		t.Errorf("one species twice: %v", err)
	}
	if d := deplete(t, fe, abundance.Hydrogen{}, "asplund2021")["Fe"]; d.Refused != "N(H) is not known" || d.LogN.Kind() != "value" {
		t.Errorf("without hydrogen: %q", d.Refused)
	}
	from, err := abundance.NewHydrogen(abundance.HydrogenInput{Sightline: "a", Total: stated(t, 21, 0.3, "value"), Source: "invented", Tracer: "Zn II"})
	if err != nil {
		t.Fatal(err)
	}
	zn := deplete(t, []abundance.Column{col(t, "Zn II", 13, 0.1, "value")}, from, "asplund2021")["Zn"]
	if !strings.Contains(zn.Refused, "derived from Zn II") {
		t.Errorf("N(H) from zinc used for zinc: %q", zn.Refused)
	}
	lacking := 0 // an element that a scale does not have is refused with the scale's name
	for _, s := range atomic.SolarScales() {
		if _, err := atomic.Solar(s.Key, "Sn"); err == nil {
			continue
		}
		lacking++
		d := deplete(t, []abundance.Column{col(t, "Sn II", 11.3, 0.1, "value")}, h, s.Key)["Sn"]
		if d.Refused != "the scale "+s.Key+" has no value for Sn" || d.D.Kind() != "none" {
			t.Errorf("%s: %q", s.Key, d.Refused)
		}
	}
	if lacking == 0 {
		t.Error("every scale has it: choose another element")
	}
}
