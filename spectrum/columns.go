package spectrum

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"lacuna/internal/oops"
)

// Names of columns, without case and separators, the best first.
var (
	waveNames = []string{"WAVE", "WAVELENGTH", "WAVELENGTHS", "LAMBDA", "LAM", "WL", "WAV", "AWAV", "LOGLAM", "WAVEVAC", "WAVEAIR", "WAVELENGTHVAC", "WAVELENGTHAIR", "LAMBDAVAC", "LAMBDAAIR",
		"WAVELENGTHVACUUM", "WAVEVACUUM", "ANGSTROM"}
	fluxNames = []string{"FLUX", "FLUXNORM", "NORMFLUX", "NORMALISEDFLUX", "NORMALIZEDFLUX", "RELFLUX", "FLAM", "FLX", "F", "INTENSITY", "INT", "SPECTRUM", "DATA", "COUNTS"}
	errNames  = []string{"ERR", "ERROR", "SIGMA", "SIG", "STDEV", "FLUXERR", "FLUXERROR", "ERRFLUX", "EFLUX", "FLUXSIGMA", "UNCERTAINTY", "RELERR", "STAT", "VAR", "VARIANCE", "FLUXVAR", "FLUXVARIANCE", "IVAR", "FLUXIVAR"}
	lowNames  = []string{"ERRLOW", "ERRORLOW", "ERRLOWER", "ERRORLOWER", "STATERRLOW"}
	maskNames = []string{"DQ", "QUAL", "QUALITY", "FLAG", "FLAGS", "MASK", "ANDMASK", "GOOD", "DQWGT"}
	contNames = []string{"CONTINUUM", "CONT"}
)

// columnName takes a name apart: its comparable form and a unit at its end, as in
// "wave_nm", "Wavelength (nm)" or "lambda [A]".
func columnName(s string) (name, unit string) {
	s = strings.TrimSpace(s)
	for _, b := range []string{"()", "[]"} {
		if i := strings.IndexByte(s, b[0]); i > 0 && strings.HasSuffix(s, b[1:]) {
			unit = strings.TrimSpace(s[i+1 : len(s)-1])
			s = s[:i]
			break
		}
	}
	if i := strings.LastIndexAny(s, "_ "); i > 0 && unit == "" {
		if _, ok := parseWaveUnit(s[i+1:]); ok {
			s, unit = s[:i], s[i+1:]
		}
	}
	return strings.Map(func(r rune) rune {
		if strings.ContainsRune("_-.() ", r) {
			return -1
		}
		return r
	}, strings.ToUpper(s)), unit
}

// picked are the columns of a table by index, −1 for none.
type picked struct {
	wave, flux, err, cont, mask int
	low                         int    // lower errors, where err holds the upper ones
	nameUnit                    string // unit that stood in the wavelength's name
	errKind                     string // "", "variance", "inverse variance", "signal to noise"
	goodIsZero                  bool   // polarity of the mask
	log10                       bool   // wavelengths are log10
}

// pick chooses columns by name, or by the user's word. where names the place in
// errors.
func pick(names []string, o Options, fail func(what, fix string) error) (picked, error) {
	p := picked{wave: -1, flux: -1, err: -1, cont: -1, mask: -1, low: -1, goodIsZero: true}
	var err error
	choose := func(user, what string, among []string) int {
		if err != nil || strings.EqualFold(user, "none") {
			return -1
		}
		if user != "" {
			i := byUser(names, user)
			if i < 0 {
				fix := "its columns: " + strings.Join(names, ", ")
				if near := oops.Nearest(user, names, 2); len(near) > 0 {
					fix = "did you mean " + strings.Join(near, " or ") + "? " + fix
				}
				err = fail(fmt.Sprintf("there is no %s column %s", what, user), fix)
			}
			return i
		}
		for _, want := range among {
			for i, n := range names {
				if got, _ := columnName(n); got == want {
					return i
				}
			}
		}
		return -1
	}
	p.wave = choose(o.WaveCol, "wavelength", waveNames)
	p.flux = choose(o.FluxCol, "flux", fluxNames)
	p.err = choose(o.ErrCol, "error", errNames)
	p.mask = choose(o.MaskCol, "mask", maskNames)
	p.cont = choose(o.ContinuumCol, "continuum", contNames)
	if p.err >= 0 && o.ErrCol == "" {
		p.low = choose("", "lower error", lowNames)
	}
	if err != nil {
		return p, err
	}
	if p.wave >= 0 {
		var name string
		name, p.nameUnit = columnName(names[p.wave])
		p.log10 = name == "LOGLAM" || name == "LOGLAMBDA" || name == "LOGWAVE"
	}
	if p.err >= 0 {
		switch name, _ := columnName(names[p.err]); name {
		case "VAR", "VARIANCE", "FLUXVAR", "FLUXVARIANCE":
			p.errKind = "variance"
		case "IVAR", "FLUXIVAR":
			p.errKind = "inverse variance"
		case "SNR", "SN":
			p.errKind = "signal to noise"
		}
	}
	if p.mask >= 0 {
		name, _ := columnName(names[p.mask])
		p.goodIsZero = !sameText(name, "GOOD", "DQWGT")
	}
	return p, nil
}

func byUser(names []string, user string) int {
	for i, n := range names {
		if strings.EqualFold(strings.TrimSpace(n), strings.TrimSpace(user)) {
			return i
		}
	}
	if k, err := strconv.Atoi(user); err == nil && k >= 1 && k <= len(names) {
		return k - 1
	}
	return -1
}

// sigma turns an error column of any kind into 1σ errors.
func (p picked) sigma(v, flux []float64) []float64 {
	switch p.errKind {
	case "variance":
		for i, x := range v {
			v[i] = math.Copysign(math.Sqrt(math.Abs(x)), x)
		}
	case "inverse variance": // 0 is bad
		for i, x := range v {
			if x > 0 {
				v[i] = 1 / math.Sqrt(x)
			} else {
				v[i] = math.NaN()
			}
		}
	case "signal to noise":
		for i, x := range v {
			v[i] = math.Abs(flux[i]) / x
		}
	}
	return v
}

// flags turns a mask column into bad pixels; a value that is missing is bad.
func (p picked) flags(v []float64) []bool {
	out := make([]bool, len(v))
	for i, x := range v {
		out[i] = math.IsNaN(x) || (x == 0) != p.goodIsZero
	}
	return out
}

// polarity says for people which value of a mask is good.
func (p picked) polarity(name string) string {
	if p.goodIsZero {
		return fmt.Sprintf("quality column %s: 0 is good", name)
	}
	return fmt.Sprintf("quality column %s: 0 is bad", name)
}

// toWave converts a wavelength column to Å. said is the unit that the file gives,
// "" for none.
func (r *reader) toWave(s *Segment, v []float64, said, fromName string, log10 bool) error {
	if log10 {
		for i, x := range v {
			if x > 8 {
				return s.fail(fmt.Sprintf("log10 wavelength %g at pixel %d: 10^%g is no wavelength", x, i+1, x), "is the column linear? Name another one")
			}
			v[i] = math.Pow(10, x)
		}
	}
	name := r.o.WaveUnit
	for _, n := range []string{said, fromName} {
		if name == "" && strings.TrimSpace(n) != "" {
			name = n
		}
	}
	if log10 && r.o.WaveUnit == "" { // log10 of Å, or of what the unit in brackets says
		name = strings.TrimSuffix(strings.TrimPrefix(strings.ToLower(name), "log10("), ")")
		if _, ok := parseWaveUnit(name); !ok {
			name = "Angstrom"
		}
	}
	u, ok := parseWaveUnit(name)
	switch {
	case name == "":
		first, last := math.NaN(), math.NaN()
		if i := slices.IndexFunc(v, finite); i >= 0 {
			first = v[i]
			for j := len(v) - 1; j >= i; j-- {
				if finite(v[j]) {
					last = v[j]
					break
				}
			}
		}
		if u, name, ok = unitBySize(first, last); !ok {
			return s.fail(fmt.Sprintf("wavelengths from %g to %g have no unit", first, last), `give it: unit = "Angstrom", "nm", "um", …`)
		}
		s.UnitGuessed = true
		s.note("wavelengths have no unit: taken for %s by their size", name)
	case !ok:
		return s.fail(fmt.Sprintf("'%s' is not a unit of wavelength", name), `give it: unit = "Angstrom", "nm", "um", …`)
	}
	if u != (waveUnit{wavelength, 1}) {
		for i, x := range v {
			v[i] = u.angstrom(x)
		}
	}
	return nil
}

// firstFinite returns the smallest of the two ends of a wavelength column.
func firstFinite(v []float64) float64 {
	lo := math.Inf(1)
	for _, x := range v {
		if x < lo {
			lo = x
		}
	}
	return lo
}

func parseFloat(s string) (float64, bool) {
	x, err := strconv.ParseFloat(strings.NewReplacer("d", "e", "D", "e").Replace(strings.TrimSpace(s)), 64)
	return x, err == nil && finite(x)
}
