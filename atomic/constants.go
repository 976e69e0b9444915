package atomic

// Constants, CODATA 2022 (arXiv:2409.03787); C is exact.
const (
	C              = 299792.458       // speed of light, km/s
	ElectronRadius = 2.8179403205e-13 // classical electron radius, cm
)
