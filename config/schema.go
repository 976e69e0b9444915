package config

var (
	frameWords   = []string{"heliocentric", "barycentric", "LSRK"}
	fileFrames   = []string{"topocentric", "geocentric", "heliocentric", "barycentric", "LSRK", "LSRD", "source"}
	mediumWords  = []string{"air", "vacuum"}
	formulaWords = []string{"ciddor1996", "edlen1966", "edlen1953", "morton2000"}
	kindWords    = []string{"value", "upper", "lower"}
	methodWords  = []string{"weak line", "apparent optical depth", "growth curve", "fit", "given"}
)

// schema is every key the program knows.
var schema = []KeyDoc{
	{Table: "survey", Name: "name", Type: Text, Required: true, Meaning: "Name of the survey, for titles."},
	{Table: "survey", Name: "frame", Type: Text, Default: `"heliocentric"`, Words: frameWords, Meaning: "Velocity frame of every result. Velocities are v = cz, positive receding."},
	{Table: "survey", Name: "scale", Type: Text, Meaning: "Solar abundance scale. Required as soon as any sightline has hydrogen; none is taken silently."},
	{Table: "survey", Name: "f_set", Type: Text, Default: `"default"`, Meaning: "Set of oscillator strengths, chosen as a whole and never mixed."},
	{Table: "survey", Name: "line_table", Type: Text, Meaning: "CSV file whose rows override or add transitions; results say so."},
	{Table: "survey", Name: "catalogue", Type: Text, Meaning: "CSV or ECSV table that makes one sightline a row (see Catalogue below)."},
	{Table: "survey", Name: "catalogue_ignore", Type: Texts, Meaning: "Catalogue columns that are not for this program; [\"*\"] for all that it does not know."},
	{Table: "survey", Name: "air_formula", Type: Text, Default: `"ciddor1996"`, Words: formulaWords, Meaning: "Refractive index of air by which air wavelengths become vacuum wavelengths."},
	{Table: "survey", Name: "seed", Type: Integer, Default: `1`, Range: "[0, 9007199254740991]", Meaning: "Seed of every random number; the same seed gives the same results."},

	{Table: "sightline", Name: "name", Type: Text, Required: true, Meaning: "Name of the star. Unique, also without regard to capitals."},
	{Table: "sightline", Name: "override", Type: Switch, Default: `false`, Meaning: "true: this sightline is a row of the catalogue, and the keys given here take the place of the row's."},
	{Table: "sightline", Name: "note", Type: Text, Meaning: "Free text, kept with the configuration in the manifest."},
	{Table: "sightline", Name: "spectral_type", Type: Text, Meaning: "MK type of the star, kept with the configuration."},
	{Table: "sightline", Name: "V_mag", Type: Number, Unit: "mag", Range: "[-30, 50]", Meaning: "V magnitude, kept with the configuration."},
	{Table: "sightline", Name: "ra", Type: Number, Unit: "°", Range: "[0, 360)", Meaning: "Right ascension (ICRS), where the spectra do not say: the LSRK needs it."},
	{Table: "sightline", Name: "dec", Type: Number, Unit: "°", Range: "[-90, 90]", Meaning: "Declination (ICRS)."},
	{Table: "sightline", Name: "E_BV", Type: Table, Meaning: "Reddening E(B−V) with its error and source, kept with the configuration."},
	{Table: "sightline", Name: "velocity", Type: Pair, Unit: "km/s", Range: "[-30000, 30000]", Common: true, Meaning: "Where gas is expected, in the frame of the results: the window of every line that has none of its own, and the range over which other lines count as blends."},
	{Table: "sightline", Name: "lines", Type: Texts, Common: true, Meaning: "Transitions to measure, by name, with the settings of the sightline."},
	{Table: "sightline", Name: "auto_window", Type: Switch, Default: `false`, Common: true, Meaning: "true: windows are ranges to search; the one used is found from the line's edges."},
	{Table: "sightline", Name: "detection", Type: Number, Unit: "σ", Default: `3.0`, Range: "[1, 10]", Common: true, Meaning: "A line is detected when W/σ(W) reaches this."},
	{Table: "sightline", Name: "limit_sigma", Type: Number, Unit: "σ", Default: `3.0`, Range: "[1, 10]", Common: true, Meaning: "Level of upper limits."},
	{Table: "sightline", Name: "limit_width", Type: Number, Unit: "km/s", Default: `0.0`, Range: "[0, 10000]", Common: true, Meaning: "Width over which a limit is taken; 0 for twice the observed full width at half maximum."},
	{Table: "sightline", Name: "b_atom", Type: Number, Unit: "km/s", Default: `2.0`, Range: "(0, 1000]", Common: true, Meaning: "Doppler parameter assumed for the limit of an atom's line where nothing was detected."},
	{Table: "sightline", Name: "b_molecule", Type: Number, Unit: "km/s", Default: `1.0`, Range: "(0, 1000]", Common: true, Meaning: "The same for molecules."},
	{Table: "sightline", Name: "b_range", Type: Pair, Unit: "km/s", Default: `[0.3, 30.0]`, Range: "(0, 1000]", Common: true, Meaning: "Doppler parameters that the curve of growth may try."},
	{Table: "sightline", Name: "zero_level", Type: Table, Default: `{level = 0.0, err = 0.01}`, Common: true, Meaning: "Where zero flux lies, as a part of the continuum: used where no black line core measures it."},
	{Table: "sightline", Name: "max_degree", Type: Integer, Default: `3`, Range: "[0, 5]", Common: true, Meaning: "Highest degree of a continuum whose degree is found automatically."},
	{Table: "sightline", Name: "spectrum", Type: Tables, Common: true, Meaning: "The spectra of the star. [defaults.spectrum], one table, is for all spectra."},
	{Table: "sightline", Name: "line", Type: Tables, Common: true, Meaning: "Transitions with settings of their own. [[defaults.line]] is for all sightlines, key by key."},
	{Table: "sightline", Name: "hydrogen", Type: Table, Meaning: "Hydrogen columns, for depletions."},
	{Table: "sightline", Name: "column", Type: Tables, Meaning: "Column densities from elsewhere."},
	{Table: "sightline", Name: "adopt", Type: Tables, Meaning: "Your own choice of a column, in place of the rule's."},

	{Table: "sightline.spectrum", Name: "file", Type: Text, Required: true, Meaning: "The file, relative to the survey file."},
	{Table: "sightline.spectrum", Name: "medium", Type: Text, Words: mediumWords, Meaning: "What wavelengths are measured in. Needed where the file does not say; overrules it, and is reported, where it does."},
	{Table: "sightline.spectrum", Name: "frame", Type: Text, Words: fileFrames, Meaning: "Velocity frame of the file's wavelengths. As for medium."},
	{Table: "sightline.spectrum", Name: "correction", Type: Number, Unit: "km/s", Range: "[-1000, 1000]", Meaning: "Velocity to add to reach the survey's frame, in place of the header's."},
	{Table: "sightline.spectrum", Name: "resolving_power", Type: Number, Range: "[100, 1e7]", Meaning: "λ/FWHM of the instrument, in place of the header's."},
	{Table: "sightline.spectrum", Name: "resolving_power_err", Type: Number, Default: `0.05`, Range: "[0, 1)", Meaning: "Its relative 1σ error."},
	{Table: "sightline.spectrum", Name: "normalised", Type: Switch, Meaning: "true: the continuum was divided out. Needs continuum_err."},
	{Table: "sightline.spectrum", Name: "continuum_err", Type: Number, Range: "(0, 1)", Meaning: "Relative 1σ error of a continuum that is not our own. Required with normalised = true, continuum_column or continuum_file."},
	{Table: "sightline.spectrum", Name: "continuum_column", Type: Text, Meaning: "Column of the file that holds the continuum."},
	{Table: "sightline.spectrum", Name: "continuum_file", Type: Text, Meaning: "Second file with the continuum on the same wavelengths."},
	{Table: "sightline.spectrum", Name: "zero_level", Type: Table, Meaning: "Zero level of this spectrum, in place of the sightline's."},
	{Table: "sightline.spectrum", Name: "hdu", Type: Integer, Range: "[0, 9999]", Meaning: "FITS unit to read, counted from 0 for the primary one. Found where not given."},
	{Table: "sightline.spectrum", Name: "row", Type: Integer, Range: "[1, 1e9]", Meaning: "Row of a table, or line of an image, counted from 1. All where not given."},
	{Table: "sightline.spectrum", Name: "orders", Type: Integers, Range: "[-9999, 9999]", Meaning: "The only orders to use. All where not given."},
	{Table: "sightline.spectrum", Name: "columns", Type: Table, Meaning: "Names (or numbers, from 1) of the columns to read, where the file does not make them clear."},
	{Table: "sightline.spectrum", Name: "unit", Type: Text, Words: []string{"Angstrom", "nm", "um", "m", "1/cm", "log10(Angstrom)"}, Meaning: "Unit of the wavelengths, where the file does not say."},
	{Table: "sightline.spectrum", Name: "mask", Type: Pairs, Unit: "Å", Range: "(0, 1e8)", Meaning: "Wavelengths not to use: Å in the file's own medium and frame, as a plot of the file shows them."},
	{Table: "sightline.spectrum", Name: "note", Type: Text, Meaning: "Free text, kept with the configuration in the manifest."},

	{Table: "sightline.line", Name: "name", Type: Text, Required: true, Meaning: "The transition: \"Na I 5889.95\", \"Ca II K\", \"CN R(0)\"."},
	{Table: "sightline.line", Name: "use", Type: Switch, Default: `true`, Meaning: "false: leave it out, although [defaults] or lines name it."},
	{Table: "sightline.line", Name: "required", Type: Switch, Meaning: "true: an error where no spectrum holds the line; false: a warning. True for lines that the sightline names itself, false for those of [defaults], where not given."},
	{Table: "sightline.line", Name: "window", Type: Pair, Unit: "km/s", Range: "[-30000, 30000]", Meaning: "Integration range in the frame of the results; the sightline's velocity where not given."},
	{Table: "sightline.line", Name: "auto_window", Type: Switch, Meaning: "As in the sightline, for this line."},
	{Table: "sightline.line", Name: "continuum", Type: Pairs, Unit: "km/s", Range: "[-30000, 30000]", Meaning: "Where the continuum is fitted, outside the window, on both sides of it (one side is enough for degree 0). Found automatically where not given."},
	{Table: "sightline.line", Name: "degree", Type: Integer, Default: `-1`, Range: "[-1, 5]", Meaning: "Degree of the continuum; −1: by an information criterion, up to max_degree."},
	{Table: "sightline.line", Name: "order", Type: Integer, Range: "[-9999, 9999]", Meaning: "The one order to measure it in. Every order that holds it where not given."},
	{Table: "sightline.line", Name: "file", Type: Text, Meaning: "The one spectrum to measure it in, as written in its file key."},
	{Table: "sightline.line", Name: "b", Type: Number, Unit: "km/s", Range: "(0, 1000]", Meaning: "Doppler parameter assumed for a limit; b_atom or b_molecule where not given."},
	{Table: "sightline.line", Name: "limit_width", Type: Number, Unit: "km/s", Range: "[0, 10000]", Meaning: "As in the sightline, for this line."},
	{Table: "sightline.line", Name: "note", Type: Text, Meaning: "Free text, kept with the configuration in the manifest."},

	{Table: "sightline.hydrogen", Name: "logN_HI", Type: Number, Unit: "log cm⁻²", Range: "[10, 25]", Meaning: "N(H I)."},
	{Table: "sightline.hydrogen", Name: "logN_HI_err", Type: Number, Unit: "dex", Range: "(0, 5]", Meaning: "Its 1σ error. Required with it."},
	{Table: "sightline.hydrogen", Name: "logN_HI_max", Type: Number, Unit: "log cm⁻²", Range: "[10, 25]", Meaning: "Upper limit of N(H I), in place of a value (21 cm towards a star in the disc)."},
	{Table: "sightline.hydrogen", Name: "logN_H2", Type: Number, Unit: "log cm⁻²", Range: "[10, 25]", Meaning: "N(H₂)."},
	{Table: "sightline.hydrogen", Name: "logN_H2_err", Type: Number, Unit: "dex", Range: "(0, 5]", Meaning: "Its 1σ error. Required with it."},
	{Table: "sightline.hydrogen", Name: "logN_H2_max", Type: Number, Unit: "log cm⁻²", Range: "[10, 25]", Meaning: "Upper limit of N(H₂), in place of a value: N(H) is then an interval."},
	{Table: "sightline.hydrogen", Name: "logN_H", Type: Number, Unit: "log cm⁻²", Range: "[10, 25]", Meaning: "Total N(H) = N(H I) + 2 N(H₂), where only that is known. Not together with the others."},
	{Table: "sightline.hydrogen", Name: "logN_H_err", Type: Number, Unit: "dex", Range: "(0, 5]", Meaning: "Its 1σ error. Required with it."},
	{Table: "sightline.hydrogen", Name: "logN_H_max", Type: Number, Unit: "log cm⁻²", Range: "[10, 25]", Meaning: "Upper limit of the total, in place of a value."},
	{Table: "sightline.hydrogen", Name: "source", Type: Text, Required: true, Meaning: "Where the columns come from: paper and route."},

	{Table: "sightline.column", Name: "species", Type: Text, Required: true, Meaning: "The species: \"Zn II\", \"CN N=1\"."},
	{Table: "sightline.column", Name: "logN", Type: Number, Unit: "log cm⁻²", Range: "[5, 25]", Required: true, Meaning: "Its column density, or the limit."},
	{Table: "sightline.column", Name: "logN_err", Type: Number, Unit: "dex", Range: "(0, 5]", Meaning: "1σ error. Required for a value."},
	{Table: "sightline.column", Name: "kind", Type: Text, Default: `"value"`, Words: kindWords, Meaning: "value, upper limit or lower limit."},
	{Table: "sightline.column", Name: "sigma", Type: Number, Unit: "σ", Range: "[1, 10]", Meaning: "Level of an upper limit; limit_sigma where not given."},
	{Table: "sightline.column", Name: "source", Type: Text, Required: true, Meaning: "Where it comes from."},

	{Table: "sightline.adopt", Name: "species", Type: Text, Required: true, Meaning: "The species."},
	{Table: "sightline.adopt", Name: "method", Type: Text, Words: methodWords, Meaning: "Take the column of this method. Or give logN."},
	{Table: "sightline.adopt", Name: "logN", Type: Number, Unit: "log cm⁻²", Range: "[5, 25]", Meaning: "Take this column."},
	{Table: "sightline.adopt", Name: "logN_err", Type: Number, Unit: "dex", Range: "(0, 5]", Meaning: "1σ error. Required for a value."},
	{Table: "sightline.adopt", Name: "kind", Type: Text, Words: kindWords, Meaning: "value (where not given), upper limit or lower limit; only with logN."},
	{Table: "sightline.adopt", Name: "reason", Type: Text, Required: true, Meaning: "Why; every table that shows the column shows this."},

	{Table: "zero_level", Name: "level", Type: Number, Range: "[-0.5, 0.5]", Required: true, Meaning: "Zero level over the continuum."},
	{Table: "zero_level", Name: "err", Type: Number, Range: "[0, 0.5]", Required: true, Meaning: "Its 1σ error."},

	{Table: "E_BV", Name: "value", Type: Number, Unit: "mag", Range: "[-1, 20]", Required: true, Meaning: "E(B−V)."},
	{Table: "E_BV", Name: "err", Type: Number, Unit: "mag", Range: "(0, 20]", Meaning: "1σ error; unknown where not given."},
	{Table: "E_BV", Name: "source", Type: Text, Meaning: "Where it comes from."},

	{Table: "columns", Name: "wave", Type: Text, Meaning: "Wavelength."},
	{Table: "columns", Name: "flux", Type: Text, Meaning: "Flux."},
	{Table: "columns", Name: "err", Type: Text, Meaning: "1σ error."},

	{Table: "growth", Name: "name", Type: Text, Required: true, Meaning: "Name of the batch, for titles."},
	{Table: "growth", Name: "f_set", Type: Text, Default: `"default"`, Meaning: "Set of oscillator strengths."},
	{Table: "growth", Name: "line_table", Type: Text, Meaning: "CSV file whose rows override or add transitions."},
	{Table: "growth", Name: "b_range", Type: Pair, Unit: "km/s", Default: `[0.3, 30.0]`, Range: "(0, 1000]", Meaning: "Doppler parameters to try."},
	{Table: "growth", Name: "table", Type: Text, Meaning: "CSV or ECSV table of widths: columns sightline (or object), line, W_mA, W_err_mA and, where there are limits, W_kind (value, marginal, upper). Other columns are left alone. The widths.ecsv of a survey serves as it is: what it did not detect enters as W ± σ."},
	{Table: "growth", Name: "limit_sigma", Type: Number, Unit: "σ", Default: `3.0`, Range: "[1, 10]", Meaning: "Level of limits that do not say their own."},

	{Table: "growth.sightline", Name: "name", Type: Text, Required: true, Meaning: "Name of the star. Unique; a name that the table has too adds to it."},
	{Table: "growth.sightline", Name: "note", Type: Text, Meaning: "Free text, kept with the configuration in the manifest."},
	{Table: "growth.sightline", Name: "b_range", Type: Pair, Unit: "km/s", Range: "(0, 1000]", Meaning: "In place of the batch's."},
	{Table: "growth.sightline", Name: "width", Type: Tables, Meaning: "The measured widths."},
	{Table: "growth.sightline", Name: "share_b", Type: Tables, Meaning: "Species or levels that share one Doppler parameter."},

	{Table: "growth.sightline.width", Name: "line", Type: Text, Required: true, Meaning: "The transition."},
	{Table: "growth.sightline.width", Name: "W_mA", Type: Number, Unit: "mÅ", Range: "[-1e6, 1e6]", Meaning: "Equivalent width; with err_mA. A non-detection of your own keeps W ± σ, also where W is negative."},
	{Table: "growth.sightline.width", Name: "err_mA", Type: Number, Unit: "mÅ", Range: "(0, 1e6]", Meaning: "1σ error. Required with W_mA."},
	{Table: "growth.sightline.width", Name: "limit_mA", Type: Number, Unit: "mÅ", Range: "(0, 1e6]", Meaning: "Somebody else's upper limit, in place of W_mA and err_mA."},
	{Table: "growth.sightline.width", Name: "sigma", Type: Number, Unit: "σ", Range: "[1, 10]", Meaning: "Level of the limit; limit_sigma where not given."},
	{Table: "growth.sightline.width", Name: "note", Type: Text, Meaning: "Free text, kept with the configuration in the manifest."},

	{Table: "growth.sightline.share_b", Name: "species", Type: Texts, Required: true, Meaning: "Two or more: \"CN N=0\", \"CN N=1\"."},
}
