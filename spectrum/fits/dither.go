package fits

import "sync"

const (
	ditherTable = 10000       // random numbers
	exactZero   = -2147483646 // the stored value that SUBTRACTIVE_DITHER_2 keeps for 0
	reserved    = -2147483647 // up to here no writer stores a number: NaN where ZBLANK is not given
)

// ditherValues is the table of random numbers of the FITS Standard 4.0, appendix
// I: Park and Miller's generator with seed 1. The seed after the last is
// 1043618065, by which the standard lets a writer check itself.
var ditherValues = sync.OnceValue(func() []float64 {
	const a, m = 16807.0, 2147483647.0
	out := make([]float64, ditherTable)
	seed := 1.0
	for i := range out {
		p := a * seed // below 2⁵³: exact
		seed = p - m*float64(int64(p/m))
		out[i] = float64(float32(seed / m)) // writers keep the table in single precision
	}
	return out
})

// A dither walks through the table as the standard says, for one tile.
type dither struct {
	table []float64
	k, m  int
}

// newDither starts at the place of tile row (from 0).
func newDither(row, seed int64) *dither {
	d := &dither{table: ditherValues()}
	d.k = int((row + seed - 1) % ditherTable)
	if d.k < 0 {
		d.k = 0 // no dithering: never asked
	}
	d.m = int(500 * d.table[d.k])
	return d
}

func (d *dither) next() float64 {
	x := d.table[d.m]
	if d.m++; d.m == ditherTable {
		d.k = (d.k + 1) % ditherTable
		d.m = int(500 * d.table[d.k])
	}
	return x
}
