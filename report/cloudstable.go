package report

import (
	"fmt"
	"math"
	"strings"

	"lacuna/budget"
	"lacuna/internal/table"
	"lacuna/survey"
	"lacuna/voigt/clouds"
)

// Clouds returns one row for each species of each fitted cloud.
//
// logN follows logN_kind: with "upper" it is the limit, and N ± N_err is the
// measurement behind it. Parameters that were not fitted have no error and stand in the
// column fixed.
func Clouds(rs []survey.Record) *table.Table {
	v, aboutV := velocityColumn(rs)
	t := table.New(
		word("object", "Sightline"),
		word("fit", "Name of the fit"),
		whole("cloud", "Number of the cloud in the fit"),
		word("name", "Name of the cloud"),
		word("ion", "Species, with its level"),
		word("lines", "Transitions of this species in the fit"),
		real(v, kms, aboutV),
		real(v+"_err", kms, "1σ error"),
		word("b_kind", "value, or upper (b is a limit: the instrument does not resolve it)"),
		real("b", kms, "Doppler parameter"),
		real("b_err", kms, "1σ error; none for a limit"),
		word("logN_kind", "value, upper or lower"),
		real("logN", logCm2, "Column density, or its limit"),
		real("logN_err_up", dexes, "Upward 1σ error; none for a limit"),
		real("logN_err_lo", dexes, "Downward 1σ error; none: open"),
		real("logN_err_f", dexes, "Part of the error: oscillator strengths"),
		real("limit_sigma", "", "Confidence of a limit, in σ"),
		real("N", "1 / cm2", "Column density as measured, detected or not"),
		real("N_err", "1 / cm2", "1σ error"),
		real("tau0", "", "Optical depth at the centre of the strongest line"),
		real("corr_logN_b", "", "Correlation of the errors of log N and b"),
		real("T", "K", "Temperature, where b is split"),
		real("T_err", "K", "1σ error"),
		real("b_turb", kms, "Turbulent part of b, where b is split"),
		real("b_turb_err", kms, "1σ error"),
		word("fixed", "Parameters that were not fitted"),
		word("clouds_by", "user, or automatic: errors then hold for this number of clouds"),
		real("chi2", "", "χ² of the fit"),
		whole("dof", "Degrees of freedom"),
		real("BIC", "", "χ² + k ln n"),
		real("AICc", "", "χ² + 2k + 2k(k+1)/(n − k − 1)"),
		word("stop", "Why the fit stopped"),
		word("flag", "What a reader must know"),
		word("note", "Warnings of the fit"),
	)
	t.Meta = meta(rs)
	for _, r := range rs {
		for _, f := range r.Result.Fits {
			for i, c := range f.Result.Clouds {
				for _, s := range c.Species {
					t.AddRow(cloudRow(r.Name, f, i, c, s)...)
				}
			}
		}
	}
	return t
}

func cloudRow(object string, f survey.Fit, i int, c clouds.CloudFit, s clouds.SpeciesFit) []table.Cell {
	_, v, vErr, _ := numberCells(s.V, 1, 2)
	bKind, b, bErr, _ := numberCells(s.B, 1, 2)
	kind, x, up, lo := numberCells(s.LogN, 1, columnDecimals)
	fErr, conf := errorCell(s.LogN.ErrBy(budget.FValue), 4), table.Missing
	if s.LogN.Is(budget.Upper) || s.LogN.Is(budget.Lower) {
		conf, fErr = positive(s.LogN.Conf, 1), table.Missing
	}
	n := plainValue(s.N)
	if n.Behind != nil {
		n = *n.Behind
	}
	cells := []table.Cell{table.Str(object), table.Str(f.Name), table.Int(i + 1), table.StrOr(c.Name), table.Str(s.Carrier), table.StrOr(strings.Join(linesOf(f, s.Carrier), "; ")),
		v, vErr, bKind, b, bErr, kind, x, up, lo, fErr, conf, linear(n.X), positiveLinear(n.Err()),
		table.Fixed(s.Tau0, 3), table.Fixed(s.CorrNB, 3)}
	for _, p := range []*clouds.Param{c.T, c.Turb} {
		value, e := table.Missing, table.Missing
		if p != nil && !p.Undetermined {
			d := 2
			if p.Err > 0 {
				d = errorDecimals(p.Err, p.Err) + guardDigits
			}
			value, e = table.Fixed(p.X, d), errorCell(p.Err, d)
		}
		cells = append(cells, value, e)
	}
	by := "user"
	if f.Auto {
		by = "automatic"
	}
	r := f.Result
	return append(cells, table.StrOr(strings.Join(notFitted(s), ", ")), table.Str(by), table.Fixed(r.Chi2, 2), table.Int(r.DOF), table.Fixed(r.BIC, 2), positive(r.AICc, 2),
		table.StrOr(r.Stop), flagCell(s.V.Flag|s.B.Flag&^budget.Upper|s.LogN.Flag), table.StrOr(strings.Join(f.Warnings, "; ")))
}

// linesOf names the lines of a species in a fit, each once.
func linesOf(f survey.Fit, carrier string) []string {
	var out []string
	for _, name := range f.Lines {
		for _, w := range f.Windows {
			found := false
			for _, l := range w.Lines {
				found = found || l.Name == name && l.Carrier == carrier
			}
			if found {
				out = append(out, name)
				break
			}
		}
	}
	return out
}

// notFitted names the parameters of a species that were not fitted.
func notFitted(s clouds.SpeciesFit) []string {
	var out []string
	for _, p := range []struct {
		name string
		n    budget.Number
	}{{"v", s.V}, {"b", s.B}, {"logN", s.LogN}} {
		if p.n.Kind() == "value" && !(p.n.Err() > 0) && !p.n.Is(budget.AtBound) {
			out = append(out, p.name)
		}
	}
	return out
}

// linear prints a column density with five digits.
func linear(x float64) table.Cell {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return table.Missing
	}
	return table.Num(fmt.Sprintf("%.4e", x))
}

func positiveLinear(x float64) table.Cell {
	if !(x > 0) {
		return table.Missing
	}
	return linear(x)
}
