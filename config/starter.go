package config

import (
	"bytes"
	_ "embed"
)

//go:embed starter_survey.toml
var starterSurvey []byte

//go:embed starter_growth.toml
var starterGrowth []byte

// Starter is a survey file to begin with: every key is in it and explained.
func Starter() []byte { return bytes.Clone(starterSurvey) }

// StarterGrowth is a growth-curve batch to begin with.
func StarterGrowth() []byte { return bytes.Clone(starterGrowth) }
