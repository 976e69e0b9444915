package main

import (
	"fmt"
	"math"
	"math/rand/v2"

	"lacuna/atomic"
	"lacuna/voigt/clouds"
	"lacuna/voigt/lsf"
)

// A population is a class of sightlines by what they truly are.
type population struct {
	name      string
	gap       [2]float64 // separation of neighbours over the FWHM of their lines behind the instrument
	tau       [2]float64 // central optical depth of the strongest line
	b         [2]float64 // over the Doppler parameter of the instrument, FWHM/1.665
	most      int        // clouds at most
	gapName   string
	depthName string
}

func (p population) String() string { return p.name }

// populations are all classes.
func populations() []population {
	gaps := []struct {
		name string
		gap  [2]float64
	}{{"apart >2", [2]float64{2, 3.5}}, {"touching 1–2", [2]float64{1, 2}}, {"blended 0.5–1", [2]float64{0.5, 1}}}
	depths := []struct {
		name string
		tau  [2]float64
	}{{"0.1–0.5", [2]float64{0.1, 0.5}}, {"0.5–3", [2]float64{0.5, 3}}, {"3–30", [2]float64{3, 30}}}
	var out []population
	for _, g := range gaps {
		for _, d := range depths {
			out = append(out, population{
				name: g.name + "; τ₀ " + d.name, gap: g.gap, tau: d.tau, b: [2]float64{1. / 3, 3}, most: 8,
				gapName: g.name, depthName: d.name,
			})
		}
	}
	for _, d := range depths {
		out = append(out, population{
			name: "unresolved; τ₀ " + d.name, gap: gaps[0].gap, tau: d.tau, b: [2]float64{0.1, 1. / 3}, most: 4,
			gapName: "apart >2, b unresolved", depthName: d.name,
		})
	}
	return out
}

// What is unknown in a fit, with the 1σ that the fit is told.
const (
	widthErr = 0.05 // of the width of the profile, relative
	zeroErr  = 0.01 // of the zero level, part of the continuum
)

// A sightline is one simulated truth.
type sightline struct {
	clouds     []gas
	carrier    string
	resolution float64
	scale      float64 // true width of the profile over the stated one
	scenes     []scene
	sigma      float64   // noise of a pixel
	ma         []float64 // the noise is white noise filtered with this, Σ² = 1
	mask       [][]bool
	views      []view
}

func logUniform(rng *rand.Rand, lim [2]float64) float64 {
	return math.Exp(math.Log(lim[0]) + rng.Float64()*math.Log(lim[1]/lim[0]))
}

// fwhm is the true FWHM (Å) of the profile, times a factor.
func (s *sightline) fwhm(factor float64) func(wave float64) float64 {
	return func(wave float64) float64 { return factor * s.scale * wave / s.resolution }
}

// gases are what is observed: doublets and single lines.
var gases = []struct {
	carrier string
	lines   []string
}{
	{"Na I", []string{"Na I 5889.95", "Na I 5895.92"}},
	{"Ca II", []string{"Ca II 3933.66", "Ca II 3968.47"}},
	{"K I", []string{"K I 7698.96"}},
	{"Ca II", []string{"Ca II 3933.66"}},
}

// lines returns the transitions of a choice of gases; their strengths are known exactly.
func transitions(names []string) []*atomic.Line {
	var out []*atomic.Line
	for _, n := range names {
		l, err := atomic.Default().Find(n)
		if err != nil {
			panic(err)
		}
		l.FErr = 0
		out = append(out, &l)
	}
	return out
}

// draw draws a sightline of the class.
func (p population) draw(rng *rand.Rand, snr float64) *sightline {
	s := &sightline{sigma: 1 / snr, resolution: logUniform(rng, [2]float64{20_000, 200_000})}
	what := gases[rng.IntN(len(gases))]
	s.carrier = what.carrier
	lines := transitions(what.lines)
	inst := lightSpeed / s.resolution // FWHM, km/s
	const fwhmB = 1.6651092223153954  // FWHM = 2 √(ln 2) b
	k := 1 + rng.IntN(p.most)
	if p.gap[1] <= 1 {
		k = 2 + rng.IntN(min(3, p.most-1)) // a blend has two; of more than four little is known
	}
	v, behind := 0.0, 0.0
	for i := range k {
		g := gas{b: min(max(inst/fwhmB*logUniform(rng, p.b), 0.3), 20)}
		wide := math.Hypot(inst, fwhmB*g.b)
		if i > 0 {
			v += math.Sqrt((wide*wide+behind*behind)/2) * (p.gap[0] + rng.Float64()*(p.gap[1]-p.gap[0]))
		}
		behind = wide
		g.v = v
		g.logN = math.Log10(logUniform(rng, p.tau) * g.b / (tauUnit * lines[0].F * lines[0].Wave))
		s.clouds = append(s.clouds, g)
	}
	shift := v/2 + 10*(rng.Float64()-0.5)
	for i := range s.clouds {
		s.clouds[i].v -= shift
	}
	s.scale = math.Exp(widthErr * rng.NormFloat64())
	if rng.IntN(2) == 0 {
		s.ma = []float64{1}
	} else { // as after linear resampling: neighbours correlated by 0.2 to 0.5, the next by 0 to 0.2
		s.ma = []float64{1, 0.25 + 0.5*rng.Float64(), 0.25 * rng.Float64()}
	}
	norm := 0.0
	for _, c := range s.ma {
		norm += c * c
	}
	for i := range s.ma {
		s.ma[i] /= math.Sqrt(norm)
	}
	degree := 1 + rng.IntN(2)
	perFWHM := 2 + 1.5*rng.Float64()
	for _, l := range lines {
		sc := scene{line: l, zero: zeroErr * rng.NormFloat64()}
		for d := range degree + 1 {
			sc.continuum = append(sc.continuum, 0.04*rng.NormFloat64())
			if d == 0 {
				sc.continuum[0] += 1
			}
		}
		sc.zero *= sc.continuum[0]
		lo, hi := math.Inf(1), math.Inf(-1)
		for _, g := range s.clouds {
			margin := 4*math.Hypot(inst, fwhmB*g.b) + 3*inst
			lo, hi = min(lo, g.v-margin), max(hi, g.v+margin)
		}
		step := l.Wave / s.resolution / perFWHM
		at := l.Wave*(1+lo/lightSpeed) - rng.Float64()*step
		for end := l.Wave * (1 + hi/lightSpeed); at < end; at += step {
			sc.edges = append(sc.edges, at)
		}
		m := make([]bool, len(sc.edges)-1)
		for i := range m {
			m[i] = rng.Float64() < 0.01 // bad pixels
		}
		s.scenes, s.mask = append(s.scenes, sc), append(s.mask, m)
	}
	return s
}

// ends are the velocities between which W is summed.
func (s *sightline) ends() [2]float64 {
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, g := range s.clouds {
		lo, hi = min(lo, g.v-10*g.b), max(hi, g.v+10*g.b)
	}
	return [2]float64{lo, hi}
}

// rho returns the correlation of the noise at lags 1, 2, …
func (s *sightline) rho() []float64 {
	var out []float64
	for lag := 1; lag < len(s.ma); lag++ {
		r := 0.0
		for i := lag; i < len(s.ma); i++ {
			r += s.ma[i] * s.ma[i-lag]
		}
		out = append(out, r)
	}
	return out
}

// noise draws n pixels of noise.
func (s *sightline) noise(n int, rng *rand.Rand) []float64 {
	white := make([]float64, n+len(s.ma)-1)
	for i := range white {
		white[i] = rng.NormFloat64()
	}
	out := make([]float64, n)
	for i := range out {
		for k, c := range s.ma {
			out[i] += s.sigma * c * white[i+k]
		}
	}
	return out
}

// problem makes what a fit is given: noisy fluxes, the stated width of the profile, and
// starts that are off by up to a fifth of a line in v, 20 % in b and 0.15 dex in N.
func (s *sightline) problem(rng *rand.Rand) clouds.Problem {
	var p clouds.Problem
	inst := lightSpeed / s.resolution
	for _, g := range s.clouds {
		off := func() float64 { return 2*rng.Float64() - 1 }
		p.Clouds = append(p.Clouds, clouds.Cloud{
			V: clouds.Start(g.v + 0.2*math.Hypot(inst, g.b)*off()), B: clouds.Start(g.b * (1 + 0.2*off())),
			Species: []clouds.Species{{Carrier: s.carrier, LogN: clouds.Start(g.logN + 0.15*off())}},
		})
	}
	for k, sc := range s.scenes {
		n := len(sc.edges) - 1
		w := clouds.Window{
			Name: fmt.Sprint(sc.line.Name), Lines: []atomic.Line{*sc.line}, Edges: sc.edges, Mask: s.mask[k],
			Profile: lsf.Sum{{Weight: 1, FWHM: lsf.Resolution(s.resolution)}}, WidthErr: widthErr,
			Degree: len(sc.continuum) - 1, ZeroErr: zeroErr, Rho: s.rho(),
		}
		w.Flux = s.noise(n, rng)
		for i := range n {
			w.Wave = append(w.Wave, (sc.edges[i]+sc.edges[i+1])/2)
			w.Flux[i] += s.views[k].flux[i]
			w.Err = append(w.Err, s.sigma)
		}
		p.Windows = append(p.Windows, w)
	}
	return p
}
