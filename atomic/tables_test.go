package atomic

import (
	"math"
	"strings"
	"testing"

	"lacuna/internal/check"
)

// Every row of our tables has a known source and status, stands once, and holds
// numbers that can be true.
func TestLinesAreSourced(t *testing.T) {
	seen := map[string]bool{}
	lines := Default().Lines()
	for i, l := range lines {
		for _, k := range []string{l.FSource, l.WaveSource} {
			if _, ok := Cite(k); !ok {
				t.Errorf("%s: source %q is not in sources.csv", l.Name, k)
			}
		}
		for _, s := range []Status{l.FStatus, l.WaveStatus} {
			if s != Verified && s != Computed && s != Memory {
				t.Errorf("%s: status %q", l.Name, s)
			}
		}
		if seen[l.Name] {
			t.Errorf("%s stands twice", l.Name)
		}
		seen[l.Name] = true
		for _, o := range lines[i+1:] {
			if o.Species == l.Species && o.Level == l.Level && apart(o.Wave, l.Wave) < sameLine {
				t.Errorf("%s and %s are one line", l.Name, o.Name)
			}
		}
		if !(l.F > 1e-9 && l.F < 3) || !(l.FErr >= 0 && l.FErr <= l.F) || !(l.Gamma >= 0 && l.Gamma < 2e10) || !(l.ELow >= 0 && l.ELow < 1000) {
			t.Errorf("%s: f %g ± %g, γ %g, E %g", l.Name, l.F, l.FErr, l.Gamma, l.ELow)
		}
		if (l.WaveAir == 0) != (l.Wave <= 2000) || l.WaveAir != 0 && !(math.Abs(l.WaveAir-airOf(l.Wave)) <= airTolerance) {
			t.Errorf("%s: air %.4f, vacuum %.4f", l.Name, l.WaveAir, l.Wave)
		}
		if l.FErr == 0 && l.Species != "H I" && l.Species != "D I" {
			t.Errorf("%s: an f-value without error", l.Name)
		}
		sum := 0.0
		for _, p := range l.Parts {
			sum += p.Strength
			if _, ok := Cite(p.Source); !ok || !(p.Strength > 0) || !(math.Abs(p.DV) < 10) || p.Isotope == "" {
				t.Errorf("%s: member %+v", l.Name, p)
			}
		}
		if len(l.Parts) > 0 && !(math.Abs(sum-1) <= 1e-12) { // rounding of a dozen terms
			t.Errorf("%s: strengths sum to %.15f", l.Name, sum)
		}
		if !(l.Mass() >= 1 && l.Mass() < 240) {
			t.Errorf("%s: mass %g", l.Name, l.Mass())
		}
	}
}

func TestTablesLoad(t *testing.T) {
	if n := len(alternatives()); n < 80 {
		t.Errorf("%d alternatives", n)
	}
	for _, s := range sets() {
		for _, m := range s.members {
			n := 0
			for _, a := range alternatives() {
				if a.set == m {
					n++
				}
			}
			if n == 0 {
				t.Errorf("set %s: no alternative is called %q", s.name, m)
			}
		}
	}
	for _, b := range Bands() {
		if !(b.WaveErr > 0 && b.WaveErr <= 5) || b.Wave <= b.WaveAir {
			t.Errorf("%s: %+v", b.Name, b)
		}
	}
	prev := 0.0
	for _, l := range StellarLines() {
		if l.WaveAir != 0 && !(math.Abs(l.WaveAir-airOf(l.Wave)) <= 0.01) || l.Wave < prev { // printed to 0.01 Å
			t.Errorf("%s: air %.3f, vacuum %.3f", l.Name, l.WaveAir, l.Wave)
		}
		prev = l.Wave
	}
	used := map[string]bool{}
	for _, l := range Default().Lines() {
		used[l.FSource], used[l.WaveSource] = true, true
		for _, p := range l.Parts {
			used[p.Source] = true
		}
	}
	for _, a := range alternatives() {
		used[a.source] = true
	}
	for _, b := range Bands() {
		used[b.Source], used[b.WSource] = true, true
	}
	for _, s := range scales() {
		used[s.Key] = true
	}
	for _, k := range []string{"IUPAC2021", "NIST-stellar", "Savage-Sembach-rules"} {
		used[k] = true
	}
	for k := range sources() {
		if !used[k] {
			t.Errorf("source %q is not used", k)
		}
	}
}

// The guards of our own tables, on tables that break each rule.
func TestGuardsRefuse(t *testing.T) {
	head := strings.ReplaceAll(Columns, " ", ",") + "\n"
	row := func(edit func(c []string)) string {
		c := strings.Split("Na I,,5891.5833,5889.9509,0.6411,,AA,6.160e+07,2,4,0,3s 2S1/2,3p 2P3/2,D2,Na I D2,,NIST-ASD,verified,NIST-ASD,verified,", ",")
		edit(c)
		return head + strings.Join(c, ",") + "\n"
	}
	col := map[string]int{}
	for i, c := range strings.Fields(Columns) {
		col[c] = i
	}
	set := func(name, v string) string { return row(func(c []string) { c[col[name]] = v }) }
	cols := strings.Fields(Columns)
	read := func(s string) error {
		r, err := readRecords("t.csv", strings.NewReader(s), cols, cols)
		if err != nil {
			return err
		}
		_, err = readLines(r, false, nil)
		return err
	}
	if err := read(row(func([]string) {})); err != nil {
		t.Fatal("the sound row is refused:", err)
	}
	for name, bad := range map[string][2]string{
		"no source": {"f_src", ""}, "no status": {"f_status", ""}, "status": {"wave_status", "seen"}, "air": {"lambda_air_A", "5889.9529"},
		"f": {"f", "0"}, "no f": {"f", ""}, "species": {"species", "Qq I"}, "level": {"level", "x"}, "star on a molecule": {"species", "CN*"},
		"weight": {"g_low", "0"}, "structure": {"structure", "Na I D9"}, "wrong group": {"structure", "Na I D1"}, "grade": {"f_grade", "Z"},
		"NaN": {"f", "NaN"}, "hex": {"f", "0x1p-1"}, "energy": {"e_low_cm-1", "-1"},
	} {
		if err := read(set(bad[0], bad[1])); err == nil {
			t.Errorf("%s: %s = %q is accepted", name, bad[0], bad[1])
		}
	}
	// rows of the other tables pass through mustSource
	for _, s := range []string{"src,status\nNowhere2000,verified\n", "src,status\nMorton2003,seen\n", "src,status\n,memory\n"} {
		r, err := readRecords("t.csv", strings.NewReader(s), []string{"src", "status"}, nil)
		if err != nil {
			t.Fatal(err)
		}
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("accepted: %q", s)
				}
			}()
			mustSource(r.rows[0], "src", "status")
		}()
	}
	if normalise([]Part{{Strength: 0.9}}, 1e-3) == nil {
		t.Error("strengths that sum to 0.9 are accepted")
	}
}

// Air wavelengths against ../shared/checks/air_vacuum.csv (Ciddor 1996 in an
// independent program, 1e-9 Å).
func TestAirAgainstTable(t *testing.T) {
	n := 0
	for _, r := range check.CSV(t, check.Shared(t, "checks/air_vacuum.csv")) {
		if !strings.Contains(strings.ToLower(r["formula"]), "ciddor") {
			continue
		}
		in, want := check.F(t, r, "lambda_in_A"), check.F(t, r, "lambda_out_A")
		if in < 2000 || in > 20000 {
			continue
		}
		got := 0.0
		switch {
		case strings.HasPrefix(r["direction"], "vac_to_air"):
			got = airOf(in)
		case strings.HasPrefix(r["direction"], "air_to_vac_exact"):
			got = vacOf(in)
		default:
			continue
		}
		n++
		if !(math.Abs(got-want) <= 1e-8) {
			t.Errorf("%s %g: %.10f, want %.10f", r["direction"], in, got, want)
		}
	}
	if n < 10 {
		t.Fatalf("only %d rows compared", n)
	}
}
