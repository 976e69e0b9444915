package frame

import "math"

// A Room is the air that light crossed before it was dispersed, where that is not
// standard air: the spectrograph room of an instrument whose wavelength solution
// was made from the laws of optics or from vacuum wavelengths.
//
// A solution from arc lines in the same room with a list in standard air needs no
// Room: star and arc crossed the same air, and the result is in standard air.
type Room struct {
	Pressure    float64 // hPa
	Temperature float64 // °C
	Humidity    float64 // relative, 0 to 1; 0.1 at 20 °C is worth 25 m/s
}

// Standard is the air of the dispersion formulas: 15 °C, 1013.25 hPa, dry.
var Standard = Room{Pressure: 1013.25, Temperature: 15}

// valid keeps to the laboratory range of the formula, with mountains in it.
func (r Room) valid() bool {
	return r.Pressure >= 0 && r.Pressure <= 1200 && r.Temperature >= -40 && r.Temperature <= 60 && r.Humidity >= 0 && r.Humidity <= 1
}

// compress returns P [1 + P (0.601 − 0.00972 T) 10⁻⁸]/(1 + 0.003661 T) for P in Pa
// and T in °C: a number proportional to the density of dry air.
func compress(p, t float64) float64 { return p * (1 + p*(0.601-0.00972*t)*1e-8) / (1 + 0.0036610*t) }

// index returns n − 1 of the room's air at a vacuum wavelength in Å:
//
//	n − 1 = (n − 1)ₛ D(P,T)/D(101325 Pa, 15 °C) − f (3.7345 − 0.0401 σ²) 10⁻¹⁰
//
// with (n − 1)ₛ from the formula for standard air, D as in compress, f the vapour
// pressure in Pa, σ in µm⁻¹.
//
// Source: Birch & Downs 1993, Metrologia 30, 155, with 1994, 31, 315 (from
// memory); saturation pressure of water after Magnus with the constants of WMO
// No. 8, 611.2 exp(17.62 T/(243.12 + T)) Pa. Accuracy 3e-8 in n, 10 m/s.
func (r Room) index(vac float64, f Formula) float64 {
	if !r.valid() {
		return math.NaN()
	}
	s := 1e4 / vac
	vapour := r.Humidity * 611.2 * math.Exp(17.62*r.Temperature/(243.12+r.Temperature))
	return f.index(vac)*compress(100*r.Pressure, r.Temperature)/compress(101325, 15) - vapour*(3.7345-0.0401*s*s)*1e-10
}

// ToAirIn returns the wavelength in the air of a room, λ_vac/n, of a vacuum
// wavelength, both in Å. NaN where ToAir gives NaN or the room is outside 0 to
// 1200 hPa, −40 to 60 °C, humidity 0 to 1.
func ToAirIn(vac float64, f Formula, r Room) float64 {
	if math.IsNaN(ToAir(vac, f)) {
		return math.NaN()
	}
	return vac / (1 + r.index(vac, f))
}

// ToVacuumIn returns the vacuum wavelength of a wavelength in the air of a room,
// both in Å, found by iteration. NaN below MinAir or outside the range of ToAirIn.
func ToVacuumIn(air float64, f Formula, r Room) float64 {
	if !(air >= MinAir) || math.IsInf(air, 1) {
		return math.NaN()
	}
	vac := air * 1.00028
	for range 20 {
		next := air * (1 + r.index(vac, f))
		step := math.Abs(next - vac)
		vac = next
		if step < 1e-10 {
			break
		}
	}
	return vac
}
