package simulate

import (
	"fmt"
	"math"
	"math/rand/v2"

	"lacuna/atomic"
	"lacuna/spectrum"
	"lacuna/spectrum/frame"
	"lacuna/voigt"
	"lacuna/voigt/lsf"
)

// An Instrument is a spectrograph with its exposure.
type Instrument struct {
	R           float64      // λ/FWHM
	Sampling    float64      // pixels per FWHM
	Orders      [][2]float64 // Å in Medium, observer's frame
	First       int          // number of the first order; following ones count down
	Medium      frame.Medium // of the wavelengths written
	SN          float64      // per pixel at the top of the blaze
	ReadNoise   float64      // electrons a pixel
	Blaze       bool         // sinc² across each order
	Correlation float64      // of neighbouring pixels' noise, as rebinning makes it; 0 to 0.49
	ErrorScale  float64      // tabulated error over true error; 0: 1
	Zero        float64      // light added everywhere, fraction of the continuum
	Cosmics     []Cosmic
}

// A Cosmic is a hit by a cosmic ray.
type Cosmic struct {
	Wave    float64 // Å, as written
	Counts  float64 // electrons, relative to the continuum there
	Flagged bool    // the reduction found it and set the pixel's quality
}

// An Observation is one exposure and what is true of it.
type Observation struct {
	Segments []spectrum.Segment
	// Light holds for each segment the noise-free flux over the star's smooth
	// continuum, as the detector would see it.
	Light [][]float64
}

// Observe exposes a star. The Earth's velocity v (km/s) is what must be added to
// observed velocities to make them heliocentric. The same seed gives the same
// noise. Lines come from table: every transition in the range whose species
// (with its level) has a column.
func Observe(s Star, in Instrument, table *atomic.Table, v float64, seed1, seed2 uint64) (Observation, error) {
	rng := rand.New(rand.NewPCG(seed1, seed2))
	var obs Observation
	for k, r := range in.Orders {
		seg, light, err := in.order(s, table, v, r, rng)
		if err != nil {
			return Observation{}, fmt.Errorf("simulating %s, order %d: %w", s.Name, in.First-k, err)
		}
		seg.Order = in.First - k
		seg.Label = fmt.Sprintf("order %d", seg.Order)
		obs.Segments = append(obs.Segments, seg)
		obs.Light = append(obs.Light, light)
	}
	return obs, nil
}

func (in Instrument) order(s Star, table *atomic.Table, v float64, r [2]float64, rng *rand.Rand) (spectrum.Segment, []float64, error) {
	step := 1 / (in.R * in.Sampling)
	n := int(math.Log(r[1]/r[0]) / math.Log1p(step))
	wave := make([]float64, n)
	for i := range wave {
		wave[i] = r[0] * math.Pow(1+step, float64(i))
	}
	edges := lsf.Edges(wave)
	if in.Medium == frame.Air {
		for i := range edges {
			edges[i] = frame.ToVacuum(edges[i], frame.Ciddor1996)
		}
	}
	narrow := math.Inf(1)
	for _, c := range s.Clouds {
		narrow = min(narrow, c.B)
	}
	for _, t := range s.Telluric {
		narrow = min(narrow, t.FWHM/(2*math.Sqrt(math.Ln2)))
	}
	resp, err := lsf.Gaussian(edges, func(w float64) float64 { return w / in.R }, narrow, 6)
	if err != nil {
		return spectrum.Segment{}, nil, err
	}
	t := Transmission(s, table, resp.Sub, v)
	light := make([]float64, n)
	resp.Apply(light, t)

	top := in.SN*in.SN + in.ReadNoise*in.ReadNoise // electrons at the top of the blaze, to first order
	seg := spectrum.Segment{
		Wave: wave, Flux: make([]float64, n), Err: make([]float64, n), Mask: make([]spectrum.Reason, n),
		Medium: in.Medium, Frame: frame.Topocentric, Resolution: in.R, Unit: "electron",
	}
	noise := in.noise(n, rng)
	scale := in.ErrorScale
	if scale == 0 {
		scale = 1
	}
	mid := (r[0] + r[1]) / 2
	for i := range wave {
		x := float64(i)/float64(n-1) - 0.5
		cont := top * (1 + s.Slope*(wave[i]-mid)/1000)
		if in.Blaze {
			a := math.Pi * 0.9 * x
			if a != 0 {
				cont *= math.Pow(math.Sin(a)/a, 2)
			}
		}
		light[i] += in.Zero
		mean := cont * light[i]
		sigma := math.Sqrt(math.Max(mean, 0) + in.ReadNoise*in.ReadNoise)
		seg.Flux[i] = mean + sigma*noise[i]
		seg.Err[i] = sigma * scale
		for _, c := range in.Cosmics {
			if c.Wave >= wave[i]-0.5*step*wave[i] && c.Wave < wave[i]+0.5*step*wave[i] {
				seg.Flux[i] += c.Counts * cont
				if c.Flagged {
					seg.Mask[i] |= spectrum.BadFile
				}
			}
		}
	}
	return seg, light, nil
}

// Transmission is the star's lines times the interstellar gas times the air, at
// wave (observer's vacuum Å), with the Earth's velocity v as in Observe.
func Transmission(s Star, table *atomic.Table, wave []float64, v float64) []float64 {
	helio := make([]float64, len(wave))
	for i, w := range wave {
		helio[i] = w * (1 + v/atomic.C)
	}
	tau := make([]float64, len(wave))
	const margin = 0.005 // relative: ±1500 km/s, beyond any damping wing that matters here
	for _, l := range table.Between(helio[0]*(1-margin), helio[len(helio)-1]*(1+margin)) {
		for _, c := range s.Clouds {
			for _, col := range c.Cols {
				if col.Species == l.Carrier() {
					voigt.AddTau(tau, helio, l, voigt.Cloud{V: c.V, B: c.B, LogN: col.LogN})
				}
			}
		}
	}
	t := make([]float64, len(wave))
	for i := range t {
		t[i] = math.Exp(-tau[i])
	}
	s.stellar(t, helio)
	s.air(t, wave)
	return t
}

// noise returns n unit normal deviates; neighbours are correlated by the kernel
// (k, 1, k), whose lag-1 correlation is 2k/(1+2k²).
func (in Instrument) noise(n int, rng *rand.Rand) []float64 {
	white := make([]float64, n+2)
	for i := range white {
		white[i] = rng.NormFloat64()
	}
	k := 0.0
	if c := in.Correlation; c > 0 {
		k = (1 - math.Sqrt(1-2*c*c)) / (2 * c)
	}
	norm := 1 / math.Sqrt(1+2*k*k)
	out := make([]float64, n)
	for i := range out {
		out[i] = norm * (white[i+1] + k*(white[i]+white[i+2]))
	}
	return out
}
