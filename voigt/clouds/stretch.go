package clouds

// A stretch is a function on the sub-grid that is 0 outside lo ≤ j < hi.
type stretch struct {
	y      []float64
	lo, hi int
}

// open makes room for a ≤ j < b and returns that part.
func (s *stretch) open(a, b int) []float64 {
	switch {
	case s.lo == s.hi:
		clear(s.y[a:b])
		s.lo, s.hi = a, b
	default:
		if a < s.lo {
			clear(s.y[a:s.lo])
			s.lo = a
		}
		if b > s.hi {
			clear(s.y[s.hi:b])
			s.hi = b
		}
	}
	return s.y[a:b]
}

func sized(s []float64, n int) []float64 {
	if cap(s) < n {
		return make([]float64, n)
	}
	return s[:n]
}

// legendre fills p with P_0(x) … P_{n−1}(x).
func legendre(p []float64, x float64) {
	for k := range p {
		switch k {
		case 0:
			p[0] = 1
		case 1:
			p[1] = x
		default:
			f := float64(k)
			p[k] = ((2*f-1)*x*p[k-1] - (f-1)*p[k-2]) / f
		}
	}
}
