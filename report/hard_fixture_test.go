package report

import (
	"fmt"
	"math"

	"lacuna/abundance"
	"lacuna/budget"
	"lacuna/cog"
	"lacuna/measure"
	"lacuna/spectrum/frame"
	"lacuna/survey"
)

// hard are records that try to break a figure.
func hard() []survey.Record {
	long := measured(sketch{name: "Longspecies XXIV** 12345.6789", species: "Longspecies XXIV", wave: 12349, air: 12345.6789, f: 0.2,
		clouds: []gas{{0, 3, 0.05}}, sn: 20, step: 3, window: [2]float64{-30, 20}, seed: 9})
	twice := measured(caK)
	twice.Order = 2
	crowded := measured(caK)
	crowded.Line = "Ca II 3968.47"
	for i := range 14 {
		crowded.Blends = append(crowded.Blends, measure.Feature{Kind: "stellar", Name: fmt.Sprintf("Fe I 393%d.%d", i%10, i), Wave: crowded.Wave * (1 + (float64(i)*3-20)/299792.458), Range: [2]float64{-3, 3}})
	}
	crowded.Blends = append(crowded.Blends, measure.Feature{Kind: "band", Name: "a diffuse band with a name that is much longer than the panel is wide, by far and away, so that it cannot stand there at all", Wave: crowded.Wave, Range: [2]float64{-900, 900}},
		measure.Feature{Kind: "telluric", Name: "far off", Wave: 2 * crowded.Wave}, measure.Feature{Name: "nowhere", Wave: math.NaN()},
		measure.Feature{Kind: "stellar", Name: "H I Hε", Wave: crowded.Wave * 1.0004, Range: [2]float64{-450, 450}}, measure.Feature{Kind: "stellar", Name: "He I", Wave: crowded.Wave * 0.999, Range: [2]float64{-450, 450}})
	allBad := measured(kI)
	for i := range allBad.Profile.Bad {
		allBad.Profile.Bad[i], allBad.Profile.Used[i] = true, false
	}
	allBad.W, allBad.Linear, allBad.AOD = budget.Number{X: math.NaN()}, budget.Number{X: math.NaN()}, budget.Number{X: math.NaN()}
	allBad.Detected, allBad.Limit = false, 0
	empty := measured(kI)
	empty.Line, empty.Profile = "CN R(0) 3874.61", measure.Profile{}
	wild := measured(naD1)
	wild.Line = "Na I 3302.37"
	p := &wild.Profile
	p.Flux[150], p.Flux[151], p.Flux[152] = 1e30, math.NaN(), -1e30
	p.Na[150], p.Na[151], p.Na[155] = math.Inf(1), math.NaN(), -1e18
	p.V = append(p.V[:100:100], p.V[130:]...) // a gap
	p.Flux, p.Err, p.Na = append(p.Flux[:100:100], p.Flux[130:]...), nil, append(p.Na[:100:100], p.Na[130:]...)
	p.Placement, p.Used, p.Bad = nil, nil, nil
	wild.Window, wild.Blends = [2]float64{0, 0}, nil
	one := measured(kI)
	one.Line = "Li I 6707.76"
	one.Profile = measure.Profile{V: []float64{0}, Flux: []float64{1}}

	r := survey.Record{Name: "Lantern ☉ 7 α^{2} <&> ⁻¹ 星 with a very long name that goes on and on beyond the width of any figure", Status: "done",
		Result: survey.Result{Frame: frame.LSRK, Widths: []measure.Width{long, measured(caK), twice, crowded, allBad, empty, wild, one}}}
	single := survey.Record{Name: "Lantern 8", Status: "done", Result: survey.Result{Widths: []measure.Width{measured(chA)}}}
	stuck := survey.Record{Name: "Lantern 9", Status: "done", Result: survey.Result{Frame: frame.Topocentric, Widths: []measure.Width{empty},
		Growth: []cog.Result{
			{Species: "CN", Levels: []string{"CN N=0", "CN N=1"}, LogN: []budget.Number{dex(12.5, 0.02), {X: 12.2, Flag: budget.Lower}}, B: budget.Number{X: 0.8, Flag: budget.Upper},
				Contours: []cog.Contour{{Delta: 2.3, LogN: []float64{12.4, 12.5, 12.6}, B: []float64{0.5, 0.6, 1.2}, Open: "b"}, {Delta: 6.17}},
				Lines: []cog.LineResult{{Line: "CN R(0) 3874.61", Wave: 3875.7, F: 0.0342, W: 0.0089, Err: 0.0003, Model: 0.0088}, {Line: "CN R(1) 3874.00", Column: 1, Wave: 3875.1, F: 0.0228, W: 0.003, Err: 0.0003, Model: 0.0031},
					{Line: "CN P(1) 3875.76", Column: 1, Wave: 3876.9, F: 0.0114, W: -0.0001, Err: 0.0003}, {Line: "gone", Column: 7}}},
			{Species: "Ti II", Levels: []string{"Ti II"}, LogN: []budget.Number{{X: math.NaN()}}, B: budget.Number{X: math.NaN()}, Stop: "iteration limit"},
			{},
		},
		Depletions: []abundance.Depletion{{Element: "Q", D: budget.Number{X: -1, Up: 0.5, Lo: 0.5, Flag: budget.Interval}}, {Element: "Fe", D: budget.Number{X: -2, Flag: budget.Marginal, Shifts: []budget.Shift{{Cause: budget.Photon, D: 0.4}}, Up: 0.3, Lo: math.Inf(1)}}}}}
	var many []measure.Width
	for i := range 40 {
		k := caK
		k.seed = uint64(i)
		k.name = fmt.Sprintf("Fe I %d.%02d", 3700+i, i)
		many = append(many, measured(k))
	}
	var ds []abundance.Depletion
	for i := range 30 {
		d := abundance.Depletion{Element: []string{"Fe", "Ti", "Ni", "Cr", "Mg", "Zn"}[i%6], D: dex(-0.1*float64(i), 0.05)}
		if i%7 == 0 {
			d.Refused = "trace ion: needs ionization correction"
		}
		ds = append(ds, d)
	}
	return []survey.Record{r, single, stuck, {Name: "Lantern 10", Status: "done", Result: survey.Result{Widths: many, Depletions: ds, Fits: hardFits()}}, {}}
}
