package config

import (
	"slices"

	"lacuna/atomic"
	"lacuna/spectrum/frame"
)

// finder looks transitions up.
type finder interface {
	Find(name string) (atomic.Line, error)
}

type anyLine struct{}

func (anyLine) Find(name string) (atomic.Line, error) {
	return atomic.Line{Name: name, Species: name}, nil
}

func (l *loader) lineTable(s *Survey) finder {
	if s.Scale != "" && !slices.Contains(scaleKeys(), s.Scale) {
		l.bad("survey: scale", "choose one", "%s is no solar scale", show(s.Scale))
	}
	return anyLine{}
}

func molecule(a atomic.Line) bool { return slices.Contains([]string{"CH", "CH+", "CN"}, a.Species) }
func carriers() []string          { return []string{"CH", "CN N=0"} }
func scaleKeys() []string         { return []string{"asplund2009", "asplund2021"} }

// Formula is the air formula of the survey.
func (s *Survey) Formula() frame.Formula {
	f, err := frame.ParseFormula(s.AirFormula)
	if err != nil {
		panic("config: air formula " + s.AirFormula) // checked when loaded
	}
	return f
}

func (l *loader) growthLines(g *Growth) finder { return anyLine{} }
