package report

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/budget"
	"lacuna/internal/table"
	"lacuna/measure"
	"lacuna/survey"
)

// widthCauses are the errors of a width that have a column each.
var widthCauses = []budget.Cause{budget.Photon, budget.Continuum, budget.Placement, budget.ZeroLevel, budget.Fill, budget.Telluric}

// Widths returns one row for each line measured, in the order of the records.
//
// W_mA follows W_kind: with "upper" it is the limit and has no error.
// W_meas_mA ± W_meas_err_mA is the measurement itself, also of lines that were
// not detected; the columns W_err_…_mA split its error by cause (causes that
// share an unknown may not add in quadrature to the total).
func Widths(rs []survey.Record) *table.Table {
	v, aboutV := velocityColumn(rs)
	cols := []table.Column{
		word("object", "Sightline"),
		word("line", "Transition: species and wavelength, air above 3000 Å, vacuum below"),
		word("ion", "Species"),
		word("level", "Lower level, where the species has several"),
		real("lambda_vac_A", "Angstrom", "Rest wavelength in vacuum"),
		real("lambda_air_A", "Angstrom", "Rest wavelength in air, above 2000 Å"),
		real("f", "", "Oscillator strength"),
		real("f_default", "", "Oscillator strength of the default set, where the survey chose another set and it differs"),
		real("dlogN_default", dexes, "What the default set would add to every log N of this line: log(f/f_default)"),
		word("f_source", "Source of f"),
		word("f_status", "Status of f: verified, computed, memory or user"),
		word("file", "Spectrum"),
		whole("order", "Order or segment"),
		word("frame", "Velocity frame, as SPECSYS of FITS"),
		real("window_lo", kms, "Integration range, lower end"),
		real("window_hi", kms, "Integration range, upper end"),
		word("window_by", "user, or found automatically"),
		word("W_kind", "value, upper (W_mA is a limit) or marginal (between 2σ and the detection threshold)"),
		real("W_mA", mAngst, "Equivalent width, or its limit"),
		real("W_err_mA", mAngst, "1σ error of W_mA; none for a limit"),
		real("W_meas_mA", mAngst, "Equivalent width as measured, detected or not"),
		real("W_meas_err_mA", mAngst, "1σ error of W_meas_mA, all causes"),
	}
	for _, c := range widthCauses {
		cols = append(cols, real("W_err_"+under(c.String())+"_mA", mAngst, "Part of the error: "+causeText(c)))
	}
	cols = append(cols,
		real("W_err_other_mA", mAngst, "Part of the error: all other causes"),
		real("W_err_ve06_mA", mAngst, "Error after Vollmann & Eversberg 2006, for comparison only"),
		real("W_limit_mA", mAngst, "Upper limit of a line that is not detected"),
		real("limit_sigma", "", "Confidence of the limit, in σ"),
		real("limit_width", kms, "Width over which the limit is taken"),
		real("limit_b", kms, "Doppler parameter assumed for the limit"),
		real(v, kms, aboutV+", weighted by absorbed flux"),
		real(v+"_err", kms, "1σ error"),
		real("depth", "", "Deepest 1 − F/C in the window"),
		real("snr", "", "Signal to noise per pixel"),
		real("snr_res", "", "Signal to noise per resolution element"),
		real("noise_ratio", "", "Scatter of line-free pixels over their tabulated error"),
		real("rho1", "", "Correlation of the noise of neighbouring pixels"),
		whole("noise_pixels", "Line-free pixels used"),
		word("noise_by", "Where the pixel errors come from"),
		real("zero", "", "Zero level over the continuum"),
		real("zero_err", "", "1σ error"),
		word("zero_by", "Where the zero level comes from"),
		word("continuum_by", "How the continuum was placed"),
		whole("continuum_degree", "Degree of the continuum"),
		word("continuum_windows", "Continuum windows, km/s"),
		real("fill_part", "", "Part of W in masked pixels that were filled"),
		word("logN_linear_kind", "Kind of logN_linear"),
		real("logN_linear", logCm2, "Column by the weak-line relation"),
		real("logN_linear_err_up", dexes, "Upward 1σ error"),
		real("logN_linear_err_lo", dexes, "Downward 1σ error"),
		word("logN_aod_kind", "Kind of logN_aod"),
		real("logN_aod", logCm2, "Column by apparent optical depth"),
		real("logN_aod_err_up", dexes, "Upward 1σ error"),
		real("logN_aod_err_lo", dexes, "Downward 1σ error"),
		real("v_aod", kms, "Velocity, first moment of the apparent optical depth"),
		real("v_aod_err", kms, "1σ error"),
		real("b_aod", kms, "Doppler parameter, √2 times the second moment"),
		real("b_aod_err", kms, "1σ error"),
		real("aod_bias", "", "Expected relative bias of N_aod by noise, not corrected"),
		real("tau_peak", "", "Largest apparent optical depth"),
		word("saturated", "Why the line counts as saturated"),
		word("flag", "What a reader must know"),
		word("blends", "What else absorbs in the window"),
		word("note", "Notes"),
	)
	t := table.New(cols...)
	t.Meta = meta(rs, table.KV{Key: "medium", Value: "vacuum"})
	for _, r := range rs {
		for _, w := range r.Result.Widths {
			t.AddRow(widthRow(r, w)...)
		}
	}
	return t
}

func widthRow(r survey.Record, w measure.Width) []table.Cell {
	row := rowOf(r, "lines", w.Line+" f")
	by := "user"
	if w.AutoWindow {
		by = "automatic"
	}
	_, meas, measErr, _ := numberCells(plainValue(w.W), mA, widthDecimals(w.W.X*mA))
	kind, x, err := table.Str("value"), meas, measErr
	limit := table.Missing
	if w.Limit > 0 {
		limit = table.Num(outward(w.Limit*mA, widthDecimals(w.Limit*mA)+guardDigits, true))
	}
	switch {
	case !meas.Set:
		kind = table.Missing
	case marginal(w):
		kind = table.Str("marginal")
	case !w.Detected && w.Limit > 0:
		kind, x, err = table.Str("upper"), limit, table.Missing
	}
	fDefault, dDefault := table.Missing, table.Missing
	if w.FDefault > 0 {
		fDefault, dDefault = table.Exact(w.FDefault), table.Fixed(math.Log10(w.F/w.FDefault), 4)
	}
	cells := []table.Cell{
		table.Str(r.Name), table.Str(w.Line), table.Str(w.Species), table.StrOr(w.Level),
		table.Fixed(w.Wave, 4), positive(w.WaveAir, 4), table.Exact(w.F), fDefault, dDefault, table.StrOr(row.Source), table.StrOr(row.Status),
		table.StrOr(w.File), table.Int(w.Order), table.StrOr(string(r.Result.Frame)),
		table.Fixed(w.Window[0], 2), table.Fixed(w.Window[1], 2), table.Str(by),
		kind, x, err, meas, measErr,
	}
	d := widthDecimals(w.W.X*mA) + guardDigits
	if e := w.W.Err() * mA; e > 0 {
		d = errorDecimals(e, e) + guardDigits
	}
	for _, c := range widthCauses {
		cells = append(cells, errorCell(w.W.ErrBy(c)*mA, d))
	}
	cells = append(cells, errorCell(w.W.Without(widthCauses...)*mA, d), errorCell(w.SigmaVE06*mA, d), limit)
	if w.Limit > 0 {
		cells = append(cells, table.Exact(w.LimitSigma), table.Fixed(w.LimitWidth, 2), table.Fixed(w.LimitB, 2))
	} else {
		cells = append(cells, table.Missing, table.Missing, table.Missing)
	}
	vel := func(n budget.Number) []table.Cell {
		_, x, e, _ := numberCells(n, 1, 2)
		return []table.Cell{x, e}
	}
	cells = append(cells, vel(w.V)...)
	rho := table.Missing
	if len(w.NoiseRho) > 0 {
		rho = table.Fixed(w.NoiseRho[0], 3)
	}
	cells = append(cells, table.Fixed(w.Depth, 4), positive(w.SNPixel, 1), positive(w.SNElement, 1),
		positive(w.NoiseRatio, 3), rho, table.Int(w.NoisePixels), table.StrOr(w.NoiseBy),
		table.Fixed(w.Zero.Level, 4), errorCell(w.Zero.Err, 4), table.StrOr(w.Zero.By),
		table.StrOr(w.ContinuumBy), table.Int(w.Degree), table.StrOr(windowsText(w.Windows)), table.Fixed(w.FillPart, 3))
	for _, n := range []budget.Number{w.Linear, w.AOD} {
		k, x, up, lo := numberCells(budget.Log10(n), 1, columnDecimals)
		cells = append(cells, k, x, up, lo)
	}
	cells = append(cells, vel(w.AODV)...)
	cells = append(cells, vel(w.AODB)...)
	return append(cells, table.Fixed(w.AODBias, 4), positive(w.TauPeak, 3), table.StrOr(w.Saturated),
		flagCell(w.Flag|w.W.Flag), table.StrOr(blendsText(w.Blends)), table.StrOr(strings.Join(w.Notes, "; ")))
}

// plainValue reads W as W ± σ, whatever limit is flagged beside it.
func plainValue(n budget.Number) budget.Number {
	n.Flag &^= budget.Upper | budget.Lower | budget.Interval | budget.Marginal
	return n
}

func windowsText(ws [][2]float64) string {
	var parts []string
	for _, w := range ws {
		parts = append(parts, fmt.Sprintf("%.1f..%.1f", w[0], w[1]))
	}
	return strings.Join(parts, " ")
}

func blendsText(fs []measure.Feature) string { return strings.Join(blendNames(fs), "; ") }

// blendNames names what else absorbs, with its kind where the name does not say
// it, and each name once.
func blendNames(fs []measure.Feature) []string {
	var out []string
	for _, f := range fs {
		s := f.Name
		if f.Kind != "" && f.Kind != "transition" && !strings.Contains(f.Name, f.Kind) {
			s += " (" + f.Kind + ")"
		}
		if !slices.Contains(out, s) {
			out = append(out, s)
		}
	}
	return out
}

func under(s string) string {
	return strings.NewReplacer(" ", "_", "-", "_").Replace(s)
}

// causeText says in a few words what a cause of error is.
func causeText(c budget.Cause) string {
	switch c {
	case budget.Photon:
		return "pixel noise"
	case budget.Continuum:
		return "fitted continuum"
	case budget.Placement:
		return "continuum placement"
	case budget.ZeroLevel:
		return "zero level"
	case budget.Fill:
		return "masked pixels filled"
	case budget.Profile:
		return "instrument profile, b assumed"
	case budget.Structure:
		return "cloud structure, saturation"
	case budget.Telluric:
		return "telluric correction"
	case budget.FValue:
		return "oscillator strength"
	case budget.Disagreement:
		return "methods that disagree"
	case budget.Excitation:
		return "unseen levels"
	case budget.Ionization:
		return "unseen stages of ionization"
	case budget.Hydrogen:
		return "hydrogen column"
	case budget.Solar:
		return "solar abundance"
	case budget.VelocityZero:
		return "zero point of velocity"
	}
	return c.String()
}
