package atomic

// nAir is the refractive index of standard air at vacuum wavelength w (Å), by
// Ciddor 1996, Appl. Opt. 35, 1566, eq. 1: what the air columns rest on. Package
// frame has the choice of formulae; it stands in the same row as this one.
func nAir(w float64) float64 {
	s2 := 1e8 / (w * w)
	return 1 + 1e-8*(5792105/(238.0185-s2)+167917/(57.362-s2))
}

func airOf(vac float64) float64 { return vac / nAir(vac) }

// vacOf inverts airOf: each round gains five digits, n − 1 being 3e-4.
func vacOf(air float64) float64 {
	w := air
	for range 6 {
		w = air * nAir(w)
	}
	return w
}

// airFrom is the vacuum wavelength (Å) above which air wavelengths are used.
const airFrom = 2000
