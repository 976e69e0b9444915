// Command coverage measures whether the errors of the cloud fit hold. It draws sightlines
// of known clouds, observes them by a forward model of its own (forward.go: direct sums, no
// code of packages voigt and voigt/lsf), fits them with package voigt/clouds, and counts
// how often the intervals hold the truth. It prints Markdown tables; docs/coverage.md
// holds them with what they say.
//
//	go run ./bench/coverage -trials 2200                    # known number of clouds
//	go run ./bench/coverage -method profile -trials 400     # intervals by profile likelihood
//	go run ./bench/coverage -method search -trials 2200     # number of clouds from the data
//
// The same seed gives the same bytes on any number of workers.
package main

import (
	"flag"
	"fmt"
	"io"
	"os"
	"strconv"
	"strings"
	"sync"
)

func main() { os.Exit(run(os.Args[1:], os.Stdout, os.Stderr)) }

// A study is what the flags ask for.
type study struct {
	how     method
	trials  int // sightlines a class whose clouds all have N/σ_N > 5 and b/σ_b > 5
	faint   int // and with a fainter cloud
	most    int // drawn at most, a multiple of trials
	seed    uint64
	snr     []float64
	only    []string
	clouds  int // at most; 0: as the class has them
	workers int
}

func run(args []string, stdout, stderr io.Writer) int {
	fs := flag.NewFlagSet("coverage", flag.ContinueOnError)
	fs.SetOutput(stderr)
	trials := fs.Int("trials", 2200, "sightlines a class whose clouds all have N/σ_N > 5 and b/σ_b > 5")
	dim := fs.Int("faint", 2200, "and at most so many with a fainter cloud")
	most := fs.Int("most", 8, "draw at most this many times as many")
	seed := fs.Uint64("seed", 1, "of the random numbers")
	snr := fs.String("snr", "30,100,500", "signal-to-noise ratios a pixel")
	how := fs.String("method", "covariance", "of the intervals: covariance, profile, sample or search")
	only := fs.String("class", "", "only classes whose name contains one of these words, separated by commas")
	clouds := fs.Int("clouds", 8, "clouds a sightline at most, 2 or more")
	workers := fs.Int("workers", 1, "fits at a time")
	if err := fs.Parse(args); err != nil {
		return 2
	}
	st := study{trials: *trials, faint: *dim, most: *most, seed: *seed, clouds: *clouds, workers: *workers}
	for _, f := range strings.Split(*snr, ",") {
		x, err := strconv.ParseFloat(strings.TrimSpace(f), 64)
		if err != nil || !(x > 0) {
			fmt.Fprintf(stderr, "coverage: -snr %s: give numbers above 0, separated by commas\n", *snr)
			return 2
		}
		st.snr = append(st.snr, x)
	}
	methods := map[string]method{"covariance": linear, "profile": profiled, "sample": sampled, "search": searched}
	m, ok := methods[*how]
	if !ok || st.trials < 2 || st.most < 1 || st.workers < 1 || st.clouds < 2 || fs.NArg() > 0 {
		fmt.Fprintln(stderr, "coverage: -method is covariance, profile, sample or search; -trials is at least 2, -most and -workers at least 1, -clouds at least 2")
		return 2
	}
	st.how = m
	if *only != "" {
		st.only = strings.Split(*only, ",")
	}
	if len(st.chosen()) == 0 {
		fmt.Fprintf(stderr, "coverage: no class is named like %q; the classes are\n", *only)
		for _, p := range populations() {
			fmt.Fprintln(stderr, " ", p)
		}
		return 2
	}
	if err := st.print(stdout, stderr); err != nil {
		fmt.Fprintln(stderr, "coverage:", err)
		return 1
	}
	return 0
}

// chosen returns the classes asked for.
func (st study) chosen() []population {
	var out []population
	for _, p := range populations() {
		take := len(st.only) == 0
		for _, w := range st.only {
			take = take || strings.Contains(p.name, w)
		}
		if take {
			if st.clouds > 0 {
				p.most = min(p.most, st.clouds)
			}
			out = append(out, p)
		}
	}
	return out
}

// trialsOf runs sightlines of one class until there are enough whose clouds all have
// N/σ_N > 5 and b/σ_b > 5; of those with a cloud of N/σ_N < 5, st.faint at most. It
// returns, as well, what was said of fits that could not be made.
func (st study) trialsOf(p population, snr float64) ([]trial, []string) {
	var all []trial
	var refused []string
	all5, both5, dim, drawn := 0, 0, 0, 0
	for (all5 < st.trials || both5 < st.trials) && drawn < st.most*st.trials {
		batch := make([]trial, 100)
		errs := make([]error, len(batch))
		want := func(bin int) bool { return bin != faint || dim < st.faint }
		var wg sync.WaitGroup
		for w := range st.workers {
			wg.Go(func() {
				for i := w; i < len(batch); i += st.workers {
					batch[i], errs[i] = p.run(st.seed, uint64(drawn+i), snr, st.how, want)
				}
			})
		}
		wg.Wait()
		met := 0
		for i, t := range batch {
			switch {
			case errs[i] != nil:
				refused = append(refused, fmt.Sprintf("S/N %g, %s, sightline %d: %v", snr, p, drawn+i, errs[i]))
			case len(t.scores) == 0: // not wanted
			case t.bin != faint:
				all5++
				if t.bin == firm {
					both5++
				}
				all = append(all, t)
			case t.bin == faint && dim+met < st.faint:
				met++
				all = append(all, t)
			}
		}
		dim += met
		drawn += len(batch)
	}
	return all, refused
}
