package report

import (
	"lacuna/config"
	"lacuna/survey"
)

// Figures returns every figure of one sightline: its lines, a curve of growth for
// each species that has one, its fitted clouds, and its depletions. Their names begin with
// config.Slug of the sightline's name, so that no two sightlines share one.
func Figures(r survey.Record) []Figure {
	out := LineFigures(r)
	out = append(out, GrowthFigures(r)...)
	out = append(out, CloudFigures(r)...)
	if f, ok := DepletionFigure(r); ok {
		out = append(out, f)
	}
	return out
}

// figureName is the file stem of a sightline's figure.
func figureName(sightline, what string) string {
	return config.Slug(sightline) + "-" + what
}

// GrowthFigures returns a figure for each curve of growth of a sightline.
func GrowthFigures(r survey.Record) []Figure {
	var out []Figure
	for _, g := range r.Result.Growth {
		out = append(out, GrowthFigure(r.Name, g))
	}
	return out
}
