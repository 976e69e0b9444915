package config

import (
	"testing"
)

const small = `
[survey]
name = "Lantern survey"
scale = "asplund2021"
[defaults]
velocity = [-50, 45]
lines = ["Na I 5889.95", "Ca II 3933.66"]
zero_level = {level = 0.0, err = 0.005}
[defaults.spectrum]
medium = "air"
[[sightline]]
name = "Lantern 1"
E_BV = {value = 0.3, err = 0.03, source = "invented"}
[[sightline.spectrum]]
file = "lantern1.fits"
correction = 13.888
mask = [[3930.1, 3930.3]]
[[sightline.line]]
name = "Na I 5889.95"
window = [-40, 40]
continuum = [[-250, -60], [60, 250]]
degree = 2
[sightline.hydrogen]
logN_HI = 21.1
logN_HI_err = 0.05
logN_H2_max = 20.2
source = "Author 2001"
[[sightline.column]]
species = "Zn II"
logN = 13.1
kind = "upper"
source = "Author 2001"
[[sightline.adopt]]
species = "Na I"
method = "growth curve"
reason = "the strong line is saturated"
`

func load(t testing.TB, text string) (*Survey, error) {
	t.Helper()
	m, err := parseTOML("lantern.toml", []byte(text), "lacuna new")
	if err != nil {
		return nil, err
	}
	return parse("lantern.toml", m)
}

func TestTmp(t *testing.T) {
	s, err := load(t, small)
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("%s", s.Resolved())
	s2, err := load(t, string(s.Resolved()))
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("%s", s2.Resolved())
}
