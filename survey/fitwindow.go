package survey

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"lacuna/atomic"
	"lacuna/config"
	"lacuna/internal/oops"
	"lacuna/spectrum/frame"
	"lacuna/voigt/clouds"
	"lacuna/voigt/lsf"
)

// A patch is one window of a fit before it is fitted: the pieces of one segment whose
// pixels overlap, such as those of the two lines of Na I at 3302 and 3303 Å, joined so
// that no pixel counts twice.
type patch struct {
	light  Light
	jobs   []job
	lines  []atomic.Line // all that may absorb in it
	window map[string][2]float64
	from   int // first pixel of Light.Seg
	clouds.Window
	continuum []float64 // that of the widths, for starts
	telluric  [][2]float64
	others    []string // transitions in the windows that the fit does not have
	masked    int      // pixels in the windows lost to lines of the air
}

// patches gathers the windows of a fit. lineSpread names the file of the line spread
// function of a spectrum, or "".
//
// A window uses the pixels of the lines' velocity windows and those that carried the
// continua of the widths, with the errors and correlations audited there. Where a line
// has a black core, the prior of the zero level is that from before the core measured
// it: the fit sees the core itself.
func (p *Pieces) patches(f config.Fit, lineSpread func(file string) string) ([]*patch, error) {
	var jobs []job
	for _, j := range p.jobs {
		if slices.Contains(f.Lines, j.piece.Line.Name) {
			jobs = append(jobs, j)
		}
	}
	if len(jobs) == 0 {
		return nil, oops.Input("", strings.Join(f.Lines, ", "), "no spectrum holds any of these lines with a continuum about it", "see lacuna inspect for what the files cover")
	}
	slices.SortStableFunc(jobs, func(a, b job) int {
		if a.light != b.light {
			return a.light - b.light
		}
		return cmp.Compare(a.piece.Line.Wave, b.piece.Line.Wave)
	})
	var out []*patch
	last := -1 // light of the open patch
	end := math.Inf(-1)
	for _, j := range jobs {
		used := j.used(f)
		if used == nil {
			continue
		}
		first, to := j.piece.Wave[used[0]], j.piece.Wave[used[len(used)-1]]
		if j.light != last || first > end {
			out = append(out, &patch{light: p.lights[j.light]})
			last, end = j.light, to
		}
		k := out[len(out)-1]
		k.jobs = append(k.jobs, j)
		end = max(end, to)
	}
	for i, k := range out {
		if err := p.join(k, f, lineSpread); err != nil {
			return nil, err
		}
		for _, o := range out[:i] {
			if o.Name == k.Name {
				k.Name += fmt.Sprintf(" (%d)", i+1)
			}
		}
	}
	out = slices.DeleteFunc(out, func(k *patch) bool { return len(k.jobs) == 0 })
	if len(out) == 0 {
		return nil, oops.Input("", strings.Join(f.Lines, ", "), "no good pixel is left in the windows", "widen the window, mask less, or say telluric = \"keep\" where lines of the air were removed")
	}
	return out, nil
}

// range0 is the velocity window of a line in a fit.
func range0(f config.Fit, task [2]float64) [2]float64 {
	if f.Window != [2]float64{} {
		return f.Window
	}
	return task
}

// used lists the pixels of a piece that the fit may use, before lines of the air.
func (j job) used(f config.Fit) []int {
	var out []int
	w := range0(f, j.piece.Window)
	for i, x := range j.piece.Wave {
		v := frame.Velocity(x, j.piece.Line.Wave)
		inside := v >= w[0] && v <= w[1]
		if (inside || j.piece.Continuum.Pixels[i]) && !j.piece.Mask[i].Bad() {
			out = append(out, i)
		}
	}
	return out
}

// join makes one clouds.Window of the pieces of a patch.
func (p *Pieces) join(k *patch, f config.Fit, lineSpread func(string) string) error {
	seg := k.light.Seg
	at := func(j job, i int) int { // pixel of the segment
		n, _ := slices.BinarySearch(seg.Wave, j.piece.Wave[0])
		return n + i
	}
	k.dropAir(f)
	if len(k.jobs) == 0 {
		return nil
	}
	from, to := len(seg.Wave), 0
	for _, j := range k.jobs {
		u := j.used(f)
		from, to = min(from, at(j, u[0])), max(to, at(j, u[len(u)-1])+1)
	}
	n := to - from
	k.from = from
	w := clouds.Window{
		Wave: seg.Wave[from:to], Flux: make([]float64, n), Err: make([]float64, n), Mask: make([]bool, n),
		Rho: k.jobs[0].piece.Continuum.Noise.Rho, Instrument: seg.Source.File, WidthErr: k.light.RErr,
		Exposure: seg.Source.File, VelocityErr: f.VelocityZeroErr, Degree: f.Degree,
	}
	k.continuum = make([]float64, n)
	best := make([]float64, n) // distance of the line that a pixel takes its error from
	for i := range best {
		best[i], w.Mask[i] = math.Inf(1), true
	}
	for _, j := range k.jobs {
		cont := make([]float64, len(j.piece.Wave))
		j.piece.Continuum.At(cont, j.piece.Wave)
		given := j.piece.Continuum.Given
		for i, x := range j.piece.Wave {
			q := at(j, i) - from
			if q < 0 || q >= n {
				continue
			}
			if d := math.Abs(x - j.piece.Line.Wave); d < best[q] {
				best[q] = d
				unit := 1.0
				if given != nil {
					unit = given[i]
				}
				w.Flux[q], w.Err[q], k.continuum[q] = j.piece.Flux[i]/unit, j.piece.Continuum.Sigma[i]/unit, cont[i]/unit
			}
		}
		for _, i := range j.used(f) {
			w.Mask[at(j, i)-from] = false
		}
	}
	for i := range w.Mask {
		if bad := !(w.Err[i] > 0) || math.IsInf(w.Err[i], 0) || math.IsNaN(w.Flux[i]) || math.IsInf(w.Flux[i], 0); bad {
			w.Mask[i] = true
		}
		for _, r := range k.telluric {
			if f.Telluric != "keep" && w.Wave[i] >= r[0] && w.Wave[i] <= r[1] && !w.Mask[i] {
				w.Mask[i] = true
				k.masked++
			}
		}
	}
	var names []string
	k.window = map[string][2]float64{}
	for _, name := range f.Lines {
		line, err := p.table.Find(name)
		if err != nil {
			return err
		}
		r := f.Window
		for _, t := range p.tasks {
			if t.Line.Name == line.Name && f.Window == [2]float64{} {
				r = t.Window
			}
		}
		if frame.Wavelength(line.Wave, r[1]) < w.Wave[0] || frame.Wavelength(line.Wave, r[0]) > w.Wave[n-1] {
			continue
		}
		k.lines = append(k.lines, line)
		k.window[line.Name] = r
		names = append(names, line.Name)
	}
	w.Lines = k.lines
	w.Name = strings.Join(names, " + ") + ", " + seg.Source.File + " " + seg.Label
	if w.Degree < 0 {
		for _, j := range k.jobs {
			d := j.piece.Continuum.Degree
			if j.piece.Continuum.Given != nil {
				d = max(d, 1) // its error lies in level and slope
			}
			w.Degree = max(w.Degree, d)
		}
	}
	z := k.jobs[0].piece.Zero
	for _, j := range k.jobs {
		if j.core {
			z = j.prior
		}
	}
	w.Zero, w.ZeroErr = z.Level, z.Err
	var err error
	if w.Profile, err = k.profile(w.Wave, lineSpread(seg.Source.File)); err != nil {
		return err
	}
	k.Window = w
	k.neighbours(f)
	return nil
}

// profile is the line spread function: that of the file, or a Gaussian.
func (k *patch) profile(wave []float64, file string) (lsf.Profile, error) {
	if file != "" {
		pixel := (wave[len(wave)-1] - wave[0]) / float64(max(1, len(wave)-1))
		return lsf.Read(file, pixel)
	}
	if !(k.light.R > 0) {
		return nil, oops.Input(k.light.Seg.Source.File, k.light.Seg.Label, "its resolving power is not known: a fit needs the instrument's profile", "give resolving_power (--resolving-power), or a file with line_spread")
	}
	return lsf.Sum{{Weight: 1, FWHM: lsf.Resolution(k.light.R)}}, nil
}

// dropAir finds the ranges of the air's lines, and drops the lines of which they leave
// no pixel.
func (k *patch) dropAir(f config.Fit) {
	if f.Telluric != "keep" && k.light.Placed {
		for _, j := range k.jobs {
			for _, n := range j.piece.Neighbours {
				if n.Kind == "telluric" && !n.Negligible {
					r := [2]float64{frame.Wavelength(n.Wave, n.Range[0]), frame.Wavelength(n.Wave, n.Range[1])}
					if !slices.Contains(k.telluric, r) {
						k.telluric = append(k.telluric, r)
					}
				}
			}
		}
	}
	k.jobs = slices.DeleteFunc(k.jobs, func(j job) bool {
		w := range0(f, j.piece.Window)
		for _, i := range j.used(f) {
			x := j.piece.Wave[i]
			v := frame.Velocity(x, j.piece.Line.Wave)
			if v >= w[0] && v <= w[1] && !slices.ContainsFunc(k.telluric, func(r [2]float64) bool { return x >= r[0] && x <= r[1] }) {
				return false
			}
		}
		return true
	})
}

// neighbours names other transitions that may absorb in the windows.
func (k *patch) neighbours(f config.Fit) {
	for _, j := range k.jobs {
		w := range0(f, j.piece.Window)
		for _, n := range j.piece.Neighbours {
			lo, hi := frame.Velocity(frame.Wavelength(n.Wave, n.Range[0]), j.piece.Line.Wave), frame.Velocity(frame.Wavelength(n.Wave, n.Range[1]), j.piece.Line.Wave)
			if n.Kind != "transition" || n.Negligible || lo > w[1] || hi < w[0] || slices.Contains(f.Lines, n.Name) {
				continue
			}
			if s := n.Name; !slices.Contains(k.others, s) {
				k.others = append(k.others, s)
			}
		}
	}
}

// starts estimates log N of each species in each cloud from the apparent optical
// depths of the widths' continua: each pixel's goes to the nearest cloud, and each
// species takes its weakest line that is clearly there (else its clearest).
func starts(f config.Fit, ks []*patch, species []string) [][]float64 {
	out := make([][]float64, len(f.Clouds))
	for i := range out {
		out[i] = make([]float64, len(species))
	}
	for s, carrier := range species {
		var best []float64
		bestSig, bestF := 0.0, math.Inf(1)
		for _, k := range ks {
			for _, l := range k.lines {
				if l.Carrier() != carrier {
					continue
				}
				n, sig := k.share(l, f.Clouds)
				clear, had := sig > clearly, bestSig > clearly
				if best == nil || clear && (!had || l.F*l.Wave < bestF) || !clear && !had && sig > bestSig {
					best, bestSig, bestF = n, sig, l.F*l.Wave
				}
			}
		}
		total := 0.0
		for _, n := range best {
			total += max(0, n)
		}
		for i := range f.Clouds {
			out[i][s] = 10
			if total > 0 {
				out[i][s] = min(max(math.Log10(max(best[i], total/100)), 8), 20)
			}
		}
	}
	return out
}

// clearly is the significance (σ) from which a line gives starts.
const clearly = 10

// share divides the apparent column of a line between clouds: cm⁻² of each, and the
// significance of the sum.
func (k *patch) share(l atomic.Line, cs []config.FitCloud) (n []float64, sigma float64) {
	n = make([]float64, len(cs))
	sum, variance := 0.0, 0.0
	r := k.window[l.Name]
	for i, x := range k.Wave {
		v := frame.Velocity(x, l.Wave)
		if k.Mask[i] || v < r[0] || v > r[1] || i == 0 || !(k.continuum[i] > 0) {
			continue
		}
		flux := max(k.Flux[i]/k.continuum[i]-k.Zero, 0.03)
		dv := (x - k.Wave[i-1]) / l.Wave * atomic.C
		tau := -math.Log(flux)
		// N_a(v) = τ / (π e²/(mₑ c) f λ): 3.768e14 for Å and km/s (Savage & Sembach 1991, ApJ 379, 245; from memory)
		na := 3.768e14 / (l.F * l.Wave) * tau * dv
		sum += tau * dv
		variance += math.Pow(k.Err[i]/k.continuum[i]/flux*dv, 2)
		near, far := 0, math.Inf(1)
		for c := range cs {
			if d := math.Abs(v - velocityOf(cs, c, len(cs))); d < far {
				near, far = c, d
			}
		}
		n[near] += na
	}
	if variance > 0 {
		sigma = sum / math.Sqrt(variance)
	}
	return n, sigma
}

// velocityOf is where cloud i starts, by its ties where it has no start of its own.
func velocityOf(cs []config.FitCloud, i, steps int) float64 {
	p := cs[i].V
	if p.To == "" || steps == 0 {
		if p.Start == nil {
			return 0 // ties in a circle, which the fit refuses
		}
		return *p.Start
	}
	shift := 0.0
	if p.Shift != nil {
		shift = *p.Shift
	}
	for k := range cs {
		if cs[k].Name == p.To {
			return velocityOf(cs, k, steps-1) + shift
		}
	}
	return shift
}
