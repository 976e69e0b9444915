package telluric

import (
	"fmt"
	"math"

	"lacuna/atomic"
	"lacuna/spectrum/frame"
)

// Ground state X³Σg⁻, v = 0, of ¹⁶O₂ (cm⁻¹): rotation B, D, H, spin-spin λ, spin-
// rotation γ. From memory of the microwave literature; they reproduce the lines
// 1₋ and 1₊ at 118.75 and 56.27 GHz (test).
const (
	xB = 1.43767648
	xD = 4.84256e-6
	xH = 2.8e-12
	xL = 1.984751
	xG = -0.00842536
)

// A band of the b¹Σg⁺ – X³Σg⁻ system: T is the origin, counted from F₂ at N = 0,
// B and D the rotational constants of the upper level, cm⁻¹.
type band struct {
	name    string
	t, b, d float64
	err     float64 // 1σ of the positions, Å
	sum     float64 // column of O₂ at the zenith times band intensity, cm⁻¹
}

// A band: T and B from memory, agreeing with measured positions as they are. B and
// γ band: T and B fitted to telluric lines (24 of HD 34452; 16 of V779 Cen, LMC
// X-4 and QV Nor), D from memory. sum: half of 4.5e24 cm⁻² times 2.2e-22, 1.5e-23
// and 8.6e-25 cm (memory), the half from the depths of the γ lines measured here;
// it only serves for the class of strength.
var bands = []band{
	{"A", 13120.909, 1.391250, 5.369e-6, 0.010, 500},
	{"B", 14525.653, 1.372950, 5.400e-6, 0.007, 33},
	{"γ", 15902.437, 1.354630, 5.460e-6, 0.005, 1.9},
}

// ground returns the energy (cm⁻¹) of spin component c of rotational level N of
// X³Σ⁻: c = 1 is J = N+1, 2 is J = N, 3 is J = N−1, relative to J = N at N = 0.
//
//	F₂ = B N(N+1) − D N²(N+1)² + H N³(N+1)³
//	F₁ = F₂ + (2N+3)B − λ − √((2N+3)²B² + λ² − 2λB) + γ(N+1)
//	F₃ = F₂ − (2N−1)B − λ + √((2N−1)²B² + λ² − 2λB) − γN
//
// Schlapp 1937, Phys. Rev. 51, 342, as given in Herzberg, Spectra of Diatomic
// Molecules, ch. V (from memory). At N = 1 the root of F₃ is taken as B − λ: the
// level J = 0 has no partner to mix with. Good to 0.005 cm⁻¹ for N < 40.
func ground(n, c int) float64 {
	N := float64(n)
	x := N * (N + 1)
	f2 := xB*x - xD*x*x + xH*x*x*x
	switch c {
	case 1:
		k := 2*N + 3
		return f2 + k*xB - xL - math.Sqrt(k*k*xB*xB+xL*xL-2*xL*xB) + xG*(N+1)
	case 3:
		k := 2*N - 1
		root := math.Sqrt(k*k*xB*xB + xL*xL - 2*xL*xB)
		if n == 1 {
			root = xB - xL
		}
		return f2 - k*xB - xL + root - xG*N
	}
	return f2
}

func (b band) upper(j int) float64 {
	x := float64(j * (j + 1))
	return b.t + b.b*x - b.d*x*x
}

// depth is the class of a line of N and upper level J, from its share of the band
// at 250 K: P ∝ N, R ∝ N+1, halved between the two spin components. The width of
// a line is W = S/√(1 + S/4w), linear to square-root with pressure width w, its
// depth 1 − exp(−W/FWHM) at R = 44,000: a rough guide, right to a class.
func (b band) depth(n int, share, wavenumber float64) float64 {
	const w = 0.03 // cm⁻¹, half width at half maximum, mean over the atmosphere
	s := b.sum * share
	ew := s / math.Sqrt(1+s/(4*w))
	return 1 - math.Exp(-ew/(1.064*wavenumber/44000))
}

func class(depth float64) Strength {
	switch {
	case depth < 0.10:
		return Weak
	case depth < 0.30:
		return Medium
	case depth < 0.55:
		return Strong
	}
	return Saturated
}

// boltzmann is the weight of a line before normalisation.
func boltzmann(n int, branch byte) float64 {
	const kT = 250 * 0.695034800 // cm⁻¹; k from CODATA 2022
	hl := float64(n)
	if branch == 'R' {
		hl++
	}
	return hl / 2 * math.Exp(-ground(n, 2)/kT)
}

// maxN ends the bands: beyond it lines of the A band are below 1 %.
const maxN = 45

// oxygen computes the lines of the O₂ bands: N is odd in the ground state (nuclear
// spin 0), J = N ± 1 in the upper. Lines shallower than 1 % are left out.
func oxygen() []Line {
	norm := 0.0
	for n := 1; n <= maxN; n += 2 {
		norm += 2*boltzmann(n, 'P') + 2*boltzmann(n, 'R')
	}
	var out []Line
	for _, b := range bands {
		for n := 1; n <= maxN; n += 2 {
			for _, br := range []struct {
				name string
				c, j int
			}{{"PP", 2, n - 1}, {"PQ", 3, n - 1}, {"RR", 2, n + 1}, {"RQ", 1, n + 1}} {
				if br.name == "PQ" && n == 1 {
					continue // J = 0 to J = 0
				}
				nu := b.upper(br.j) - ground(n, br.c)
				depth := b.depth(n, boltzmann(n, br.name[0])/norm, nu)
				if depth < 0.01 {
					continue
				}
				l := Line{Molecule: "O2", Wave: 1e8 / nu, WaveErr: b.err, Strength: class(depth), Source: "O2-constants", Status: atomic.Computed,
					Note: b.name + " band"}
				l.WaveAir = frame.ToAir(l.Wave, frame.Ciddor1996)
				l.Name = fmt.Sprintf("O2 %s %s(%d) %.2f", b.name, br.name, n, l.WaveAir)
				out = append(out, l)
			}
		}
	}
	return out
}
