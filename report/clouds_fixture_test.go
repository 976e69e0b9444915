package report

import (
	"fmt"
	"math"
	"math/rand/v2"

	"lacuna/abundance"
	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/survey"
	"lacuna/voigt/clouds"
)

// fitWindow draws a window of a fit in the plainest way: Gaussian clouds, noise.
func fitWindow(name string, lines []survey.FitLine, of map[string][]gas, sn float64, seed uint64) survey.FitWindow {
	rng := rand.New(rand.NewPCG(seed, 3))
	w := survey.FitWindow{Name: name, File: "lantern-1.fits", Order: 1, Lines: lines}
	if len(lines) == 0 {
		return w
	}
	lo, hi := lines[0].Wave*(1-120/atomic.C), lines[len(lines)-1].Wave*(1+120/atomic.C)
	step := lines[0].Wave * 1.4 / atomic.C
	n := len(of[lines[0].Name])
	alone := make([][]float64, n)
	for x := lo; x < hi; x += step {
		total := 0.0
		one := make([]float64, n)
		for _, l := range lines {
			v := atomic.C * (x/l.Wave - 1)
			for k, g := range of[l.Name] {
				tau := g.tau * math.Exp(-(v-g.v)*(v-g.v)/(g.b*g.b))
				total += tau
				one[k] += tau
			}
		}
		r := rng.NormFloat64()
		i := len(w.Wave)
		used := i%97 != 40 && i%97 != 41
		w.Wave, w.Model, w.Err = append(w.Wave, x), append(w.Model, math.Exp(-total)), append(w.Err, 1/sn)
		w.Flux, w.Used = append(w.Flux, math.Exp(-total)+r/sn), append(w.Used, used)
		if !used {
			r = 0
		}
		w.Residual = append(w.Residual, r)
		for k := range alone {
			alone[k] = append(alone[k], math.Exp(-one[k]))
		}
	}
	for _, c := range alone {
		w.Clouds = append(w.Clouds, survey.FitCurve{Flux: c})
	}
	return w
}

func speciesFit(carrier string, v, b, n budget.Number, tau float64) clouds.SpeciesFit {
	return clouds.SpeciesFit{Carrier: carrier, V: v, B: b, LogN: n, N: budget.Pow10(n), Tau0: tau, Weakest: tau / 2, CorrNB: -0.4}
}

// naFit is a fit of two lines with two clouds and a species that is not there.
func naFit() survey.Fit {
	d2 := survey.FitLine{Name: naD2.name, Carrier: "Na I", Wave: naD2.wave, Window: [2]float64{-26, 20}}
	d1 := survey.FitLine{Name: naD1.name, Carrier: "Na I", Wave: naD1.wave, Window: [2]float64{-26, 20}}
	k := survey.FitLine{Name: kI.name, Carrier: "K I", Wave: kI.wave, Window: [2]float64{-26, 20}}
	v1, v2 := dex(-12.02, 0.04), budget.Number{X: 3.5}
	limit := budget.Limit(budget.Number{X: 0.7e10, Shifts: []budget.Shift{{Cause: budget.Photon, D: 0.5e10}}}, 2.2e10, 3)
	weak := speciesFit("K I", v1, dex(2.21, 0.06), budget.Log10(limit), 0.01)
	weak.N = *limit.Behind
	sat := dex(12.62, 0.05)
	sat.Up, sat.Lo = 0.09, 0.05
	narrow := budget.Limit(dex(0.4, 0.2), 1.1, 3)
	w := fitWindow("Na I 5889.95, lantern-1.fits order 1", []survey.FitLine{d2}, map[string][]gas{d2.Name: naD2.clouds}, 150, 1)
	w.Telluric = [][2]float64{{5891.7, 5891.9}}
	w.Others = []string{"Fe I 5891.88"}
	return survey.Fit{
		Name: "Na I and K I", Lines: []string{d2.Name, d1.Name, k.Name}, Species: []string{"Na I", "K I"},
		Result: clouds.Result{
			Chi2: 512.3, Pixels: 520, DOF: 503, BIC: 618.7, AICc: 547.2, Stop: "converged", Converged: true,
			Clouds: []clouds.CloudFit{
				{Name: "cloud 1", V: v1, Species: []clouds.SpeciesFit{weak, speciesFit("Na I", v1, dex(2.21, 0.06), sat.With(budget.Saturated), 9)}},
				{Name: "warm", V: v2, Species: []clouds.SpeciesFit{speciesFit("Na I", v2, narrow, dex(11.94, 0.012), 2.5)},
					T: &clouds.Param{X: 900, Err: 200}, Turb: &clouds.Param{X: 1.5, Undetermined: true}},
			},
			Totals: []clouds.Total{
				{Carrier: "K I", N: weak.N, LogN: weak.LogN, Naive: 0.5e10},
				{Carrier: "Na I", N: budget.Pow10(dex(12.70, 0.04)), LogN: dex(12.70, 0.04), Naive: 9e11},
			},
			Windows: []clouds.WindowFit{{Name: w.Name, Pixels: 160, Chi2: 171.2, Zero: 0.012, ZeroErr: 0.002, FWHM: 4.6, Whiteness: clouds.Tests{DurbinWatson: 1.4, WatsonZ: 5}}},
		},
		Windows: []survey.FitWindow{w,
			fitWindow("Na I 5895.92, lantern-1.fits order 1", []survey.FitLine{d1}, map[string][]gas{d1.Name: naD1.clouds}, 140, 2),
			fitWindow("K I 7698.96, lantern-1.fits order 1", []survey.FitLine{k}, map[string][]gas{k.Name: {{-12, 2.2, 0.01}, {3.5, 2.8, 0}}}, 60, 3)},
		Solutions: []clouds.Solution{{Number: 2, V: []float64{-12, 3.5}, Chi2: 512.3, BIC: 618.7, AICc: 547.2}, {Number: 3, V: []float64{-12, 0.1, 3.6}, Chi2: 508, BIC: 633, Refused: "clouds at 0.10 and 3.60 km/s cannot be told apart"}},
		Warnings:  []string{"Na I 5889.95, lantern-1.fits order 1: not in the fit, and may absorb there too: Fe I 5891.88"},
	}
}

func naVerdicts() []abundance.Verdict {
	return []abundance.Verdict{
		{Species: "Na I", Against: "fit", Compared: 4, With: "growth curve", Sigma: 3.2, Dex: 0.21},
		{Species: "Ca II", Against: "apparent optical depth", Compared: 1, Agree: true, Sigma: 0.4},
	}
}

// hardFits try to break tables, text and figures of clouds.
func hardFits() []survey.Fit {
	line := survey.FitLine{Name: "Ca II 3933.66", Carrier: "Ca II", Wave: caK.wave, Window: [2]float64{-26, 20}}
	near := survey.FitLine{Name: "Longspecies XXIV** 12345.6789", Carrier: "Longspecies XXIV**", Wave: caK.wave * (1 + 35/atomic.C), Window: [2]float64{-20, 20}}
	var gs []gas
	crowd := clouds.Result{Stop: "iteration limit", Chi2: 1e9, DOF: 0}
	for i := range 14 {
		v := dex(-8+1.1*float64(i), 0.3)
		gs = append(gs, gas{v.X, 1, 0.2})
		crowd.Clouds = append(crowd.Clouds, clouds.CloudFit{V: v, Species: []clouds.SpeciesFit{speciesFit("Ca II", v, dex(1, 0.9), dex(11, 2), 0.2)}})
	}
	both := fitWindow("both", []survey.FitLine{line, near}, map[string][]gas{line.Name: gs, near.Name: gs[:1]}, 40, 8)
	both.Flux[100], both.Residual[100] = 1e30, 1e30
	both.Flux[101], both.Residual[101] = -1e30, -1e30
	both.Telluric = [][2]float64{{both.Wave[120], both.Wave[125]}, {1, 2}}
	nothing := clouds.SpeciesFit{Carrier: "Ca II", V: budget.Number{X: math.NaN()}, B: budget.Number{X: math.NaN()}, LogN: budget.Number{X: math.NaN()}, N: budget.Number{X: math.NaN()}, Tau0: math.NaN()}
	open := dex(12, 0.3)
	open.Up, open.Lo = math.Inf(1), 0.2
	many := survey.Fit{Name: "Fe I many lines <&> α^{2} 星", Result: clouds.Result{
		Clouds: []clouds.CloudFit{{V: dex(0, 1), Species: []clouds.SpeciesFit{speciesFit("Fe I", dex(0, 1), dex(2, 1), open, 0.5)}}},
		Totals: []clouds.Total{{Carrier: "Fe I", N: budget.Pow10(dex(12, 0.3)), LogN: open}}}}
	for i := range 27 {
		l := survey.FitLine{Name: fmt.Sprintf("Fe I %d.%02d", 3700+20*i, i), Carrier: "Fe I", Wave: 3701 + 20*float64(i), Window: [2]float64{-20, 20}}
		many.Lines = append(many.Lines, l.Name)
		many.Windows = append(many.Windows, fitWindow(l.Name, []survey.FitLine{l}, map[string][]gas{l.Name: {{0, 2, 0.3}}}, 50, uint64(i)))
	}
	return []survey.Fit{
		{Name: "crowd", Lines: []string{line.Name, near.Name}, Auto: true, Result: crowd, Windows: []survey.FitWindow{both}},
		{Name: "no cloud", Lines: []string{line.Name}, Auto: true, Windows: []survey.FitWindow{fitWindow("flat", []survey.FitLine{line}, nil, 40, 9)}},
		{Name: "no pixel", Lines: []string{line.Name}, Result: clouds.Result{Clouds: []clouds.CloudFit{{Species: []clouds.SpeciesFit{nothing}}}, Totals: []clouds.Total{{Carrier: "Ca II", LogN: nothing.LogN}}},
			Windows: []survey.FitWindow{{Lines: []survey.FitLine{line}}}},
		{},
		many,
	}
}
