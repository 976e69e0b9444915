package atomic

import (
	"fmt"
	"io"
	"math"
	"regexp"
	"strings"

	"lacuna/internal/oops"
)

// Columns are the columns of a line table, ours and a user's own. A user's table
// needs species, f, f_src and one of the two wavelengths; the others may be left
// out. replaces is for a user's table only (see WithFile).
const Columns = "species level lambda_vac_A lambda_air_A f f_err f_grade gamma_s-1 g_low g_up e_low_cm-1 lower upper alias structure missing f_src f_status wave_src wave_status note"

// airTolerance is how far the two wavelength columns may disagree, Å: the last
// printed digits of both.
const airTolerance = 1e-3

var (
	levelForm = regexp.MustCompile(`^(\*{1,5}|[ef]|[NJ]=\d{1,2}(\.5)?)?$`)
	bandForm  = regexp.MustCompile(`^([A-Za-z'0-9]+-[A-Z]) (\(\d+,\d+\)) (.+)$`)
)

// readLines reads a line table. In a user's table known resolves the spelling of
// a species ("NaI").
func readLines(t *records, user bool, known func(string) (string, bool)) ([]Line, error) {
	var out []Line
	for _, r := range t.rows {
		l, err := readLine(r, user, known)
		if err != nil {
			return nil, err
		}
		out = append(out, l)
	}
	return out, nil
}

func readLine(r record, user bool, known func(string) (string, bool)) (Line, error) {
	l := Line{FSet: "default", Level: r.get("level"), Lower: r.get("lower"), Upper: r.get("upper"),
		Missing: r.get("missing"), FSource: r.get("f_src"), WaveSource: r.get("wave_src"), Note: r.get("note"),
		FStatus: Status(r.get("f_status")), WaveStatus: Status(r.get("wave_status")), Alias: aliases(r.get("alias"))}
	var err error
	if l.Species, err = readSpecies(r, known); err != nil {
		return l, err
	}
	if !levelForm.MatchString(l.Level) {
		return l, r.bad("level", fmt.Sprintf("%q is not a level", l.Level), `write nothing, *, **, e, f, N=1 or J=2`)
	}
	if l.Molecule() == strings.HasPrefix(l.Level, "*") && l.Level != "" {
		return l, r.bad("level", fmt.Sprintf("%q does not belong to %s", l.Level, l.Species), "stars are for atoms; e, f, N= and J= for molecules")
	}
	if err = readWave(r, &l); err != nil {
		return l, err
	}
	if l.F, err = r.num("f", 1e-12, 10); err != nil {
		return l, err
	}
	if math.IsNaN(l.F) {
		return l, r.bad("f", "the oscillator strength is missing", "write the absorption f-value")
	}
	if l.FErr, err = fErr(r, l.F); err != nil {
		return l, err
	}
	for _, c := range []struct {
		to     *float64
		name   string
		lo, hi float64
	}{{&l.Gamma, "gamma_s-1", 0, 1e13}, {&l.GLow, "g_low", 1, 1000}, {&l.GUp, "g_up", 1, 1000}, {&l.ELow, "e_low_cm-1", 0, 1e6}} {
		x, err := r.num(c.name, c.lo, c.hi)
		if err != nil {
			return l, err
		}
		if !math.IsNaN(x) {
			*c.to = x
		}
	}
	if l.Parts, err = readStructure(r, &l); err != nil {
		return l, err
	}
	return l, readStatus(r, &l, user)
}

func readSpecies(r record, known func(string) (string, bool)) (string, error) {
	s := strings.Join(strings.Fields(r.get("species")), " ")
	if known != nil {
		if k, ok := known(s); ok {
			return k, nil
		}
	}
	if !validSpecies(s) {
		return "", r.bad("species", fmt.Sprintf("%q is neither an atom in a stage nor a molecule", s),
			`write for example "Na I", "6Li I", "CH+" or "13CN"; an excited level goes into the column level`)
	}
	return s, nil
}

func readWave(r record, l *Line) error {
	vac, err := r.num("lambda_vac_A", 1, 1e7)
	if err != nil {
		return err
	}
	air, err := r.num("lambda_air_A", 1, 1e7)
	if err != nil {
		return err
	}
	switch hasVac, hasAir := !math.IsNaN(vac), !math.IsNaN(air); {
	case !hasVac && !hasAir:
		return r.bad("lambda_vac_A", "no wavelength", "give the vacuum wavelength, or the air wavelength in lambda_air_A")
	case !hasVac:
		if vac = vacOf(air); vac <= airFrom {
			return r.bad("lambda_air_A", "air wavelengths begin at 2000 Å", "give the vacuum wavelength in lambda_vac_A")
		}
	case hasAir && vac <= airFrom:
		return r.bad("lambda_air_A", "air wavelengths begin at 2000 Å", "leave the cell empty")
	case hasAir:
		if d := air - airOf(vac); !(math.Abs(d) <= airTolerance) {
			return r.bad("lambda_air_A", fmt.Sprintf("%.4f Å of air is not %.4f Å of vacuum: that is %.4f Å of air (Ciddor 1996)", air, vac, airOf(vac)),
				"correct one of them, or leave lambda_air_A out")
		}
	}
	l.Wave = vac
	if vac > airFrom {
		l.WaveAir = airOf(vac)
		if !math.IsNaN(air) {
			l.WaveAir = air
		}
	}
	return nil
}

func readStatus(r record, l *Line, user bool) error {
	if l.FSource == "" {
		return r.bad("f_src", "no source of the f-value", "say where it comes from, such as Morton2003 or a note of your own")
	}
	for _, c := range []struct {
		name string
		to   *Status
	}{{"f_status", &l.FStatus}, {"wave_status", &l.WaveStatus}} {
		switch *c.to {
		case Verified, Computed, Memory:
		case "", User:
			if user {
				break
			}
			fallthrough
		default:
			return r.bad(c.name, fmt.Sprintf("%q is not a status", *c.to), "write verified, computed or memory, or leave the column out")
		}
		if user {
			*c.to = User
		}
	}
	if user {
		if l.WaveSource == "" {
			l.WaveSource = l.FSource
		}
		l.File = r.of.file
	}
	return nil
}

// aliases parts a cell at ";". "B-X (0,0) R(0)" also answers to its branch, with
// and without the band, and to the electronic system with the branch.
func aliases(cell string) []string {
	var out []string
	add := func(s string) {
		if s != "" && !contains(out, s) {
			out = append(out, s)
		}
	}
	for _, a := range strings.Split(cell, ";") {
		a = strings.Join(strings.Fields(a), " ")
		if m := bandForm.FindStringSubmatch(a); m != nil {
			add(m[3])
			add(a)
			add(m[2] + " " + m[3])
			add(m[1] + " " + m[3])
			continue
		}
		add(a)
	}
	return out
}

// openRecords reads a user's table from a file.
func openRecords(file string, r io.Reader) (*records, error) {
	known := append(strings.Fields(Columns), "replaces")
	t, err := readRecords(file, r, known, []string{"species", "f", "f_src"})
	if err != nil {
		return nil, err
	}
	_, vac := t.col["lambda_vac_A"]
	if _, air := t.col["lambda_air_A"]; !vac && !air {
		return nil, oops.Input(file, "header", "no column of wavelengths", "add lambda_vac_A, or lambda_air_A")
	}
	if len(t.rows) == 0 {
		return nil, oops.Input(file, "", "no rows", "add a line, or leave the file out")
	}
	return t, nil
}
