package simulate

import (
	"lacuna/spectrum/frame"
)

// An Exposure is one file of the demonstration.
type Exposure struct {
	File       string
	Star       Star
	Instrument Instrument
	Earth      float64 // km/s to add for heliocentric; 0 with Heliocentric
	Frame      frame.Kind
}

// Lantern is the invented survey of the demonstration: three stars that do not
// exist, with the kinds of sightline that an observer meets. Lantern 1: a
// reddened star behind two close clouds, saturated Na I D, molecules. Lantern 2:
// a lightly reddened star with one thin cloud, where most molecules are limits.
// Lantern 3: a hot star in the ultraviolet, where dominant ions give depletions.
func Lantern() []Exposure {
	water := []TelluricLine{ // invented strengths; positions near those of water around 5890 Å
		{Wave: 5885.6, Tau: 0.05, FWHM: 3.5}, {Wave: 5887.61, Tau: 0.03, FWHM: 3.5},
		{Wave: 5893.28, Tau: 0.06, FWHM: 3.5}, {Wave: 5902.9, Tau: 0.04, FWHM: 3.5},
	}
	oxygen := []TelluricLine{
		{Wave: 7690.2, Tau: 0.35, FWHM: 3.2}, {Wave: 7692.9, Tau: 0.35, FWHM: 3.2}, {Wave: 7697.0, Tau: 0.25, FWHM: 3.2},
		{Wave: 7698.7, Tau: 0.25, FWHM: 3.2},
	}
	one := Star{
		Name: "Lantern 1", RV: -62, Slope: -0.3,
		Clouds: []Cloud{
			{V: -14.2, B: 1.3, Cols: []Col{
				{"Na I", 12.85}, {"K I", 11.42}, {"Ca II", 12.05}, {"Ca I", 9.75}, {"Ti II", 11.55},
				{"CH", 13.05}, {"CH+", 12.80}, {"CN N=0", 12.20}, {"CN N=1", 11.82}, {"Fe II", 14.30},
			}},
			{V: -6.5, B: 1.8, Cols: []Col{
				{"Na I", 12.10}, {"K I", 10.60}, {"Ca II", 11.85}, {"Ti II", 11.40}, {"CH", 12.50}, {"CH+", 12.90},
			}},
		},
		Lines: []StellarLine{
			{Wave: 3934.775, Depth: 0.10, VSini: 140}, {Wave: 3971.198, Depth: 2.2, VSini: 140},
			{Wave: 5877.25, Depth: 0.55, VSini: 140},
		},
		Telluric: append(append([]TelluricLine{}, water...), oxygen...),
	}
	two := Star{
		Name: "Lantern 2", RV: 18, Slope: -0.2,
		Clouds: []Cloud{
			{V: 4.8, B: 2.1, Cols: []Col{
				{"Na I", 11.30}, {"K I", 9.75}, {"Ca II", 11.55}, {"Ti II", 11.10}, {"CH", 11.9}, {"CH+", 11.85},
			}},
		},
		Lines:    []StellarLine{{Wave: 3971.198, Depth: 3.0, VSini: 220}},
		Telluric: append(append([]TelluricLine{}, water...), oxygen...),
	}
	three := Star{
		Name: "Lantern 3", RV: 30, Slope: 0.2,
		Clouds: []Cloud{
			{V: 8.5, B: 3.2, Cols: []Col{
				{"Fe II", 14.25}, {"Zn II", 12.75}, {"Cr II", 12.85}, {"Si II", 15.05}, {"Mg I", 12.65},
				{"Mn II", 12.70}, {"Ni II", 13.05},
			}},
			{V: 21.0, B: 4.0, Cols: []Col{{"Fe II", 13.75}, {"Zn II", 11.95}, {"Cr II", 12.30}, {"Si II", 14.40}}},
		},
		Lines: []StellarLine{{Wave: 2350.2, Depth: 0.12, VSini: 90}, {Wave: 2052.4, Depth: 0.08, VSini: 90}},
	}
	blue := Instrument{
		R: 60000, Sampling: 2.6, First: 132, Medium: frame.Air, SN: 160, ReadNoise: 4, Blaze: true, Correlation: 0.33, ErrorScale: 1.3,
		Orders: [][2]float64{{3278, 3328}, {3360, 3410}, {3850, 3906}, {3915, 3985}, {4205, 4262}, {4270, 4330}},
		Cosmics: []Cosmic{
			{Wave: 3933.44, Counts: 2.5, Flagged: true}, // in the flank of Ca II K
			{Wave: 4303.2, Counts: 1.8},                 // in the continuum of CH 4300
		},
	}
	red := Instrument{
		R: 65000, Sampling: 2.8, First: 98, Medium: frame.Air, SN: 220, ReadNoise: 4, Blaze: true, Correlation: 0.33, ErrorScale: 1.3, Zero: 0.003,
		Orders: [][2]float64{{5848, 5932}, {7640, 7746}},
	}
	faint := blue
	faint.SN, faint.Cosmics = 90, nil
	uv := Instrument{
		R: 45000, Sampling: 2, First: 340, Medium: frame.Vacuum, SN: 45, ReadNoise: 3, Blaze: true,
		Orders: [][2]float64{{1800, 1822}, {2015, 2036}, {2046, 2070}, {2240, 2270}, {2335, 2385}, {2565, 2612}},
	}
	return []Exposure{
		{File: "lantern1_blue.fits", Star: one, Instrument: blue, Earth: 13.21, Frame: frame.Topocentric},
		{File: "lantern1_red.fits", Star: one, Instrument: red, Earth: 13.21, Frame: frame.Topocentric},
		{File: "lantern2_blue.fits", Star: two, Instrument: faint, Earth: -21.74, Frame: frame.Topocentric},
		{File: "lantern2_red.fits", Star: two, Instrument: red, Earth: -21.74, Frame: frame.Topocentric},
		{File: "lantern3_uv.fits", Star: three, Instrument: uv, Frame: frame.Heliocent},
	}
}
