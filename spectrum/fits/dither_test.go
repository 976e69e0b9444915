package fits

import (
	"math"
	"testing"
)

// FITS Standard 4.0, appendix I: after 10000 numbers the seed is 1043618065.
func TestDitherTable(t *testing.T) {
	table := ditherValues()
	if got := table[len(table)-1] * 2147483647; len(table) != 10000 || !(math.Abs(got-1043618065) <= 64) { // single precision: 2³⁰/2²⁴
		t.Errorf("the last of %d seeds is %.0f, want 1043618065", len(table), got)
	}
}
