package lsf

import (
	"math"
	"testing"
)

// Against the standard library's complementary error function.
func TestNormal(t *testing.T) {
	table := nodes()
	worst := 0.0
	for i := range 400_001 {
		x := -10 + 20*float64(i)/400_000
		want := 0.5 * math.Erfc(-x/math.Sqrt2)
		d := math.Abs(normal(table, x) - want)
		worst = max(worst, d)
		if !(d <= 5e-16) { // two roundings of numbers up to 1
			t.Fatalf("Φ(%g) = %.17g, want %.17g", x, normal(table, x), want)
		}
	}
	t.Logf("largest error %.1e", worst)
	if !math.IsNaN(normal(table, math.NaN())) || normal(table, math.Inf(1)) != 1 || normal(table, math.Inf(-1)) != 0 {
		t.Error("special values")
	}
}
