package fits

import (
	"fmt"
	"math/bits"
)

// rice unpacks n whole numbers of size bytes (1, 2 or 4; single bytes have no
// sign) in blocks of so many pixels, by the algorithm RICE_1 of the FITS Standard
// 4.0, section 10.4.1: differences of neighbours, folded to positive numbers, as
// unary high parts and raw low parts whose width each block says.
func rice(b []byte, n, block, size int) ([]int64, error) {
	width := uint(8 * size)
	var head, most uint // bits that say the width, and the width that means raw
	switch size {
	case 1:
		head, most = 3, 6
	case 2:
		head, most = 4, 14
	default:
		head, most = 5, 25
	}
	// Every block takes its head at least: a promise beyond that is not believed.
	if need := int64(width) + int64((n+block-1)/block)*int64(head); need > 8*int64(len(b)) {
		return nil, fmt.Errorf("%w: %d bytes are too few", errTile, len(b))
	}
	r := bitReader{b: b}
	last := uint32(r.take(width))
	out := make([]int64, n)
	mask := uint32(1)<<(width-1)<<1 - 1 // of the values; 2³² wraps to all ones
	for i := 0; i < n; {
		fs := int(r.take(head)) - 1
		if fs > int(most) {
			return nil, fmt.Errorf("%w: a block of %d low bits before pixel %d", errTile, fs, i+1)
		}
		for end := min(i+block, n); i < end; i++ {
			var u uint32
			switch {
			case fs < 0:
			case fs == int(most):
				u = uint32(r.take(width))
			default:
				u = r.zeros()<<uint(fs) | uint32(r.take(uint(fs)))
			}
			d := u >> 1
			if u&1 == 1 {
				d = ^d
			}
			last = (last + d) & mask
			out[i] = signed(last, size)
		}
		if r.over {
			return nil, fmt.Errorf("%w: it ends at pixel %d", errTile, i+1)
		}
	}
	return out, nil
}

func signed(x uint32, size int) int64 {
	switch size {
	case 1:
		return int64(x)
	case 2:
		return int64(int16(x))
	}
	return int64(int32(x))
}

// A bitReader takes bits from the most significant end; over is set once it ran
// out of them.
type bitReader struct {
	b    []byte
	at   int // bit
	over bool
}

// take returns the next n ≤ 32 bits.
func (r *bitReader) take(n uint) uint64 {
	if r.at+int(n) > 8*len(r.b) {
		r.over = true
		r.at = 8 * len(r.b)
		return 0
	}
	var v uint64
	for n > 0 {
		have := uint(8 - r.at%8)
		k := min(have, n)
		part := uint64(r.b[r.at/8]) >> (have - k) & (1<<k - 1)
		v = v<<k | part
		r.at += int(k)
		n -= k
	}
	return v
}

// zeros counts zero bits up to the next one bit, and takes that too.
func (r *bitReader) zeros() uint32 {
	n := uint32(0)
	for r.at < 8*len(r.b) {
		rest := uint(8 - r.at%8)
		part := r.b[r.at/8] << (8 - rest)
		if part == 0 {
			n += uint32(rest)
			r.at += int(rest)
			continue
		}
		k := bits.LeadingZeros8(part)
		r.at += k + 1
		return n + uint32(k)
	}
	r.over = true
	return n
}
