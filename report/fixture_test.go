package report

import (
	"math"
	"math/rand/v2"

	"lacuna/abundance"
	"lacuna/atomic"
	"lacuna/budget"
	"lacuna/cog"
	"lacuna/internal/table"
	"lacuna/measure"
	"lacuna/spectrum/frame"
	"lacuna/survey"
)

// The stars, files and numbers here are invented.

// A cloud of the fixture: velocity, Doppler parameter, optical depth at the centre.
type gas struct{ v, b, tau float64 }

// A sketch is what a test asks of one line.
type sketch struct {
	name, species, level string
	wave, air, f         float64
	clouds               []gas
	sn, step             float64
	window               [2]float64
	seed                 uint64
	zero                 float64
	masked               [2]float64
	blends               []measure.Feature
}

// measured draws a spectrum of the sketch and measures it in the plainest way.
func measured(k sketch) measure.Width {
	rng := rand.New(rand.NewPCG(k.seed, 7))
	w := measure.Width{Line: k.name, Species: k.species, Level: k.level, Wave: k.wave, WaveAir: k.air, F: k.f,
		Order: 1, File: "lantern-1.fits", Window: k.window, SNPixel: k.sn, SNElement: k.sn * 1.8,
		LimitSigma: 3, NoiseRatio: 0.82, NoiseRho: []float64{0.31, 0.04, 0, 0, 0}, NoisePixels: 212,
		NoiseBy: "error array, audited", Degree: 2, ContinuumBy: "Legendre, degree by AICc",
		Windows: [][2]float64{{-220, k.window[0] - 5}, {k.window[1] + 5, 220}},
		Zero:    measure.Zero{Level: k.zero, Err: 0.002, By: "prior"}, Blends: k.blends}
	if k.zero != 0 {
		w.Zero.By, w.Zero.Pixels = "black cores", 14
	}
	sigma := 1 / k.sn
	sum, na, wv := 0.0, 0.0, 0.0
	pixels := 0.0
	for v := -220.0; v <= 220; v += k.step {
		tau := 0.0
		for _, c := range k.clouds {
			tau += c.tau * math.Exp(-(v-c.v)*(v-c.v)/(c.b*c.b))
		}
		flux := math.Exp(-tau) + rng.NormFloat64()*sigma + k.zero*(1-math.Exp(-tau))
		inside := v >= k.window[0] && v <= k.window[1]
		bad := k.masked[1] > k.masked[0] && v >= k.masked[0] && v <= k.masked[1]
		if bad {
			flux += 0.6
		}
		p := &w.Profile
		p.V, p.Flux, p.Err = append(p.V, v), append(p.Flux, flux), append(p.Err, sigma)
		p.Bad, p.Used = append(p.Bad, bad), append(p.Used, !inside && !bad)
		p.Placement = append(p.Placement, 0.3*sigma+2e-8*v*v)
		n := 0.0
		if inside && !bad {
			n = 3.768e14 / (k.f * k.wave) * -math.Log(math.Max(flux-k.zero, sigma))
			sum += (1 - flux) * k.step
			wv += v * (1 - flux) * k.step
			na += n * k.step
			pixels++
			w.Depth = math.Max(w.Depth, 1-flux)
		}
		p.Na = append(p.Na, n)
	}
	kms := k.wave / atomic.C // Å per km/s
	err := sigma * math.Sqrt(pixels) * k.step * kms
	w.W = budget.Number{X: sum * kms, Shifts: []budget.Shift{
		{Cause: budget.Photon, D: err}, {Cause: budget.Continuum, Key: "continuum:a", D: 0.7 * err},
		{Cause: budget.Placement, D: 0.5 * err}, {Cause: budget.ZeroLevel, Key: "zero:1", D: 0.002 * sum * kms}},
		From: []budget.Ref{{Kind: "line", Key: k.name}}}
	w.SigmaVE06 = 1.3 * err
	w.V = budget.Number{X: wv / sum, Shifts: []budget.Shift{{Cause: budget.Photon, D: 0.05}}}
	total := w.W.Err()
	w.Detected = w.W.X >= 3*total
	perA := 1.13e20 / (k.f * k.wave * k.wave) // cm⁻² per Å
	w.Linear = w.W.Scale(perA)
	w.AOD = budget.Number{X: na, Shifts: []budget.Shift{{Cause: budget.Photon, D: err * perA}, {Cause: budget.Continuum, D: 0.7 * err * perA}}}
	w.AODV, w.AODB = w.V, budget.Number{X: 4.2, Shifts: []budget.Shift{{Cause: budget.Photon, D: 0.3}}}
	w.TauPeak = -math.Log(math.Max(1-w.Depth, sigma))
	switch {
	case !w.Detected:
		w.Limit, w.LimitWidth, w.LimitB = 3*total, 14, 2
		w.Linear = budget.Limit(w.Linear, w.Limit*perA, 3)
	case w.Depth > 0.9:
		w.Saturated = "flux below 0.1 of the continuum in 9 adjacent pixels"
		w.AOD.Flag |= budget.Lower | budget.Saturated
		w.Linear.Flag |= budget.Lower | budget.Saturated
		w.Flag |= budget.Saturated
	}
	if len(k.blends) > 0 {
		w.Flag |= budget.Blended
	}
	if bad := k.masked; bad[1] > bad[0] {
		w.Flag |= budget.Filled
		w.FillPart = 0.04
	}
	return w
}

var (
	caK = sketch{name: "Ca II 3933.66", species: "Ca II", wave: 3934.775, air: 3933.661, f: 0.6267,
		clouds: []gas{{-12, 2.5, 0.9}, {3.5, 3.8, 0.35}}, sn: 120, step: 1.4, window: [2]float64{-24, 18}, seed: 1}
	naD2 = sketch{name: "Na I 5889.95", species: "Na I", wave: 5891.583, air: 5889.951, f: 0.641,
		clouds: []gas{{-12, 2.2, 9}, {3.5, 2.8, 2.5}}, sn: 150, step: 1.4, window: [2]float64{-26, 20}, seed: 2, zero: 0.012,
		blends: []measure.Feature{{Kind: "telluric", Name: "H2O 5890.2", Wave: 5891.95, Range: [2]float64{-4, 4}}}}
	naD1 = sketch{name: "Na I 5895.92", species: "Na I", wave: 5897.558, air: 5895.924, f: 0.320,
		clouds: []gas{{-12, 2.2, 4.5}, {3.5, 2.8, 1.2}}, sn: 140, step: 1.4, window: [2]float64{-26, 20}, seed: 3, zero: 0.012}
	chA = sketch{name: "CH 4300.31", species: "CH", wave: 4301.5235, air: 4300.313, f: 0.00506,
		clouds: []gas{{-12, 2, 0.09}}, sn: 180, step: 1.4, window: [2]float64{-22, 0}, seed: 4,
		masked: [2]float64{5, 9}}
	kI = sketch{name: "K I 7698.96", species: "K I", wave: 7701.0835, air: 7698.9645, f: 0.333,
		sn: 60, step: 2.1, window: [2]float64{-20, -4}, seed: 5}
)

// lantern1 is a plain sightline with a bit of everything.
func lantern1() survey.Record {
	ws := []measure.Width{measured(caK), measured(naD2), measured(naD1), measured(chA), measured(kI)}
	h := &abundance.Hydrogen{Route: "N(H I) + 2 N(H2)", HI: dex(20.92, 0.05), H2: dex(19.8, 0.1), H: dex(20.98, 0.045),
		Source: "invented for this test"}
	ca := abundance.Column{Species: "Ca II", Element: "Ca", Method: "apparent optical depth", Line: caK.name,
		LogN: budget.Log10(ws[0].AOD), Rule: "one unsaturated line"}
	na := abundance.Column{Species: "Na I", Element: "Na", Method: "apparent optical depth", Line: naD1.name,
		LogN: budget.Log10(ws[2].AOD), Rule: "all lines saturated: the weakest line's lower limit"}
	ch := abundance.Column{Species: "CH", Method: "weak line", Line: chA.name, LogN: budget.Log10(ws[3].Linear), Rule: "one weak line, τ₀ ≤ 0.3"}
	ki := abundance.Column{Species: "K I", Element: "K", Method: "weak line", Line: kI.name, LogN: budget.Log10(ws[4].Linear), Rule: "no line detected: limit"}
	cols := []abundance.Column{
		{Species: "Ca II", Element: "Ca", Method: "weak line", Line: caK.name, LogN: budget.Log10(ws[0].Linear)}, ca,
		{Species: "Na I", Element: "Na", Method: "weak line", Line: naD2.name, LogN: budget.Log10(ws[1].Linear)},
		{Species: "Na I", Element: "Na", Method: "apparent optical depth", Line: naD2.name, LogN: budget.Log10(ws[1].AOD)},
		{Species: "Na I", Element: "Na", Method: "weak line", Line: naD1.name, LogN: budget.Log10(ws[2].Linear)}, na, ch, ki}
	for i := range cols {
		cols[i].Rule = ""
	}
	return survey.Record{Schema: survey.Schema, Key: "0", Name: "Lantern 1", Status: "done", Result: survey.Result{
		Scale: "asplund2021", FSet: "default", Frame: frame.Heliocent,
		Spectra: []survey.SpectrumInfo{{File: "lantern-1.fits", Layout: "linear image", Orders: 1, Medium: "vacuum", MediumBy: "survey file",
			Frame: "TOPOCENT", FrameBy: "header", R: 65000, RBy: "survey file", Shifts: []frame.Applied{{Keyword: "VHELIO", To: frame.Heliocent, V: 13.9}}}},
		Widths: ws, Columns: cols, Adopted: []abundance.Column{ca, na, ch, ki},
		Fits: []survey.Fit{naFit()}, Verdicts: naVerdicts(),
		Doublets: []measure.Doublet{{Species: "Na I", Strong: naD2.name, Weak: naD1.name,
			Delta: dex(0.21, 0.02), Corrected: budget.Number{X: math.NaN()}, Refused: "difference 0.21 dex exceeds 0.15"}},
		Hydrogen: h,
		Rows:     []survey.Row{{Table: "lines", Key: "Ca II 3933.66 f", Value: "0.6267", Source: "AuthorA2001", Status: "verified"}},
		Depletions: []abundance.Depletion{
			{Element: "Ca", Species: []string{"Ca II"}, D: budget.Number{X: math.NaN(), Flag: budget.Trace}, Scale: "asplund2021", Solar: 6.30, SolarErr: 0.03, Refused: "trace ion: needs ionization correction"},
			{Element: "Na", Species: []string{"Na I"}, D: budget.Number{X: math.NaN(), Flag: budget.Trace}, Scale: "asplund2021", Solar: 6.22, SolarErr: 0.03, Refused: "trace ion: needs ionization correction"},
		},
		Warnings: []string{"Na I 5889.95: 1 telluric line falls into the window and is not corrected; look at the spectrum of a hot star with little dust, or choose another line"},
	}}
}

// uv is a sightline with many lines, levels, limits and depletions.
func uv() survey.Record {
	type t struct {
		name, species, level string
		wave, f              float64
		tau                  float64
	}
	var ws []measure.Width
	for i, l := range []t{
		{"Fe II 1608.45", "Fe II", "", 1608.4508, 0.0577, 1.6}, {"Fe II 1611.20", "Fe II", "", 1611.2003, 0.00138, 0.05},
		{"Fe II 2249.88", "Fe II", "", 2249.8768, 0.00182, 0.08}, {"Fe II 2260.78", "Fe II", "", 2260.7805, 0.00244, 0.11},
		{"Fe II 2344.21", "Fe II", "", 2344.2139, 0.114, 4.6}, {"Fe II 2374.46", "Fe II", "", 2374.4603, 0.0313, 1.3},
		{"Fe II 2382.76", "Fe II", "", 2382.7642, 0.320, 13}, {"Fe II* 2396.36", "Fe II", "*", 2396.3559, 0.279, 0},
		{"Si II 1808.01", "Si II", "", 1808.0129, 0.00208, 0.7}, {"S II 1250.58", "S II", "", 1250.578, 0.00543, 1.1},
		{"Zn II 2026.14", "Zn II", "", 2026.137, 0.501, 0.3}, {"Mn II 2576.88", "Mn II", "", 2576.877, 0.361, 0.6},
		{"C I** 1657.01", "C I", "**", 1657.0082, 0.104, 0.02},
	} {
		w := measured(sketch{name: l.name, species: l.species, level: l.level, wave: l.wave, f: l.f, sn: 40 + 5*float64(i), step: 1.3,
			clouds: []gas{{8, 4, l.tau}, {24, 5, 0.3 * l.tau}}, window: [2]float64{-6, 40}, seed: uint64(20 + i)})
		ws = append(ws, w)
	}
	ws[4].Blends = []measure.Feature{{Kind: "stellar", Name: "Fe III 2344.3 (stellar)", Wave: 2344.3, Range: [2]float64{-30, 30}},
		{Kind: "transition", Name: "Fe II* 2345.00", Wave: 2344.42, Range: [2]float64{-5, 5}}, {Kind: "transition", Name: "C I* 2344.2", Wave: 2344.23, Range: [2]float64{-5, 5}}}
	d := func(el string, x, e, solar float64, f budget.Flag) abundance.Depletion {
		n := budget.Number{X: x, Flag: f}
		if f == 0 {
			n.Shifts = []budget.Shift{{Cause: budget.Photon, D: e}, {Cause: budget.Hydrogen, Key: "NH:Lantern 2", D: -0.06}, {Cause: budget.Solar, Key: "solar:" + el, D: -0.04}}
		}
		return abundance.Depletion{Element: el, Species: []string{el + " II"}, D: n, Gas: budget.Number{X: x + solar, Shifts: n.Shifts}, Scale: "asplund2021", Solar: solar, SolarErr: 0.04}
	}
	r := survey.Record{Schema: survey.Schema, Name: "Lantern 2", Index: 1, Status: "done", Result: survey.Result{
		Scale: "asplund2021", FSet: "default", Frame: frame.Barycentric, Widths: ws,
		Spectra:  []survey.SpectrumInfo{{File: "lantern-2.fits", Layout: "HST x1d", Orders: 31, Medium: "vacuum", MediumBy: "header", Frame: "HELIOCEN", FrameBy: "header", R: 114000}},
		Hydrogen: &abundance.Hydrogen{Route: "N(H I) + 2 N(H2)", HI: dex(20.8, 0.06), H2: dex(20.1, 0.1), H: dex(20.94, 0.06), Source: "invented"},
		Depletions: []abundance.Depletion{d("Fe", -2.13, 0.03, 7.46, 0), d("Si", -1.02, 0.05, 7.51, budget.Lower), d("S", -0.11, 0.11, 7.12, 0),
			d("Zn", -0.42, 0.05, 4.56, 0), d("Mn", -1.48, 0.03, 5.42, budget.Upper),
			{Element: "C", Species: []string{"C I"}, D: budget.Number{X: math.NaN()}, Scale: "asplund2021", Solar: 8.46, SolarErr: 0.04, Refused: "trace ion: needs ionization correction"}},
	}}
	r.Result.Growth = []cog.Result{growth()}
	return r
}

func dex(x, e float64) budget.Number {
	return budget.Number{X: x, Shifts: []budget.Shift{{Cause: budget.Photon, D: e}}}
}

func everything() []survey.Record {
	return []survey.Record{lantern1(), uv(), {Schema: survey.Schema, Name: "Lantern 3", Index: 2, Status: "failed", Error: "lantern-3.fits: HDU 1: the file ends after 2880 of 40320 bytes"}}
}

func tablesOf(rs []survey.Record) map[string]*table.Table {
	return map[string]*table.Table{"widths": Widths(rs), "columns": Columns(rs), "depletions": Depletions(rs), "growth": Growth(rs), "clouds": Clouds(rs)}
}
