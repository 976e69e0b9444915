package report

import (
	"math"
	"strconv"
	"strings"
	"testing"

	"lacuna/survey"
)

// A species that is not detected has its limit as logN without errors, and N ± σ beside
// it; a b that is not resolved is a limit; what was not fitted has no error and is named.
func TestCloudsTable(t *testing.T) {
	r := lantern1()
	tab := Clouds([]survey.Record{r})
	if err := tab.Check(); err != nil {
		t.Fatal(err)
	}
	if tab.Rows() != 3 {
		t.Fatalf("%d rows", tab.Rows())
	}
	get := func(col string, row int) string { return column(t, tab, col)[row].Text }
	for _, tc := range []struct {
		col  string
		want [3]string
	}{
		{"cloud", [3]string{"1", "1", "2"}},
		{"ion", [3]string{"K I", "Na I", "Na I"}},
		{"lines", [3]string{"K I 7698.96", "Na I 5889.95; Na I 5895.92", "Na I 5889.95; Na I 5895.92"}},
		{"b_kind", [3]string{"value", "value", "upper"}},
		{"logN_kind", [3]string{"upper", "value", "value"}},
		{"limit_sigma", [3]string{"3.0", "", ""}},
		{"logN_err_lo", [3]string{"", "0.0500", "0.01200"}},
		{"N_err", [3]string{"5.0000e+09", "", ""}},
		{"fixed", [3]string{"", "", "v"}},
		{"T", [3]string{"", "", "900"}},
		{"b_turb", [3]string{"", "", ""}},
	} {
		for i, want := range tc.want {
			if got := get(tc.col, i); want != "" && !strings.HasPrefix(got, want) || want == "" && got != "" && tc.col != "N_err" {
				t.Errorf("%s of row %d: %q, want %q", tc.col, i+1, got, want)
			}
		}
	}
	if v := column(t, tab, "v_helio_err")[2]; v.Set {
		t.Errorf("a velocity that was not fitted has error %s", v.Text)
	}
	// The limit is rounded outward: at or above log 2.2e10, by less than 1e-4.
	if x, err := strconv.ParseFloat(get("logN", 0), 64); err != nil || !(x >= math.Log10(2.2e10)) || !(x < math.Log10(2.2e10)+1e-4) {
		t.Errorf("limit %s", get("logN", 0))
	}
}

// A cloud alone is drawn where it is deep enough, and its curve has no ends elsewhere.
func TestShallow(t *testing.T) {
	got := shallow([]float64{1, 0.997, 0.99, 0.5, 0.996, 1}, 0.005)
	for i, drawn := range []bool{false, false, true, true, false, false} {
		if math.IsNaN(got[i]) == drawn {
			t.Errorf("point %d: %v", i, got[i])
		}
	}
}

// The curve through a model's pixels keeps their values.
func TestSmoothKeepsPixels(t *testing.T) {
	x := []float64{0, 1, 2, 3, 4, 5, 6}
	y := []float64{1, 1, 0.9, 0.4, 0.9, 1, 1}
	sx, sy := smooth(x, y)
	for i := range x {
		k := 5 * i
		if sx[k] != x[i] || !(math.Abs(sy[k]-y[i]) < 1e-12) {
			t.Errorf("pixel %d: %v, %v", i, sx[k], sy[k])
		}
	}
	if sx, _ := smooth(x[:2], y[:2]); len(sx) != 2 {
		t.Error("two pixels are no curve to smooth")
	}
}
