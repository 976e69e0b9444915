package clouds

// A Search looks for the number of clouds and for the clouds themselves.
//
// It starts from the clouds that are given, or from none. Again and again a cloud is
// added where the residuals ask for it most (the score test: by how much χ² would
// fall for a weak cloud at v with b, all other parameters following), or one is split
// into two, and everything is fitted anew from several starts; then clouds are left
// out and neighbours merged, each with a new fit. Of the solutions whose clouds the
// data can tell apart, that of the lowest criterion is taken.
type Search struct {
	Windows []Window
	Shared  []Shared
	Begin   []Cloud // to start from; they may be merged or dropped like others
	// Like is what a cloud looks like: its species, ties, priors and bounds. Its starts of
	// v, b and N are not used. Ties by the bare name ("b") mean the cloud's own.
	Like Cloud
	V    [2]float64 // km/s, where clouds may lie

	Max       int          // clouds at most; 0: 12
	Starts    int          // random starts for each number, beside those that the residuals ask for; 0: 2
	Seed      uint64       // of those
	Criterion string       // "BIC" (also "") or "AICc"
	Ranges    [][2]float64 // km/s, for which columns and widths are summed; nil: everything
	Options   Options
}

// A Found is the outcome of a Search.
type Found struct {
	Result         // of the best solution
	Fitter *Fitter `json:"-"` // that made it
	Model  []Cloud `json:"-"` // its clouds as the start of another fit
	// Solutions are all that differ, the best first.
	Solutions []Solution `json:"solutions"`
	Ranges    []Range    `json:"ranges"` // with the structure error
}

// A Solution is one number of clouds that was tried, at one minimum.
type Solution struct {
	Number int       `json:"number"`
	V      []float64 `json:"v"` // km/s, of its clouds
	Chi2   float64   `json:"chi2"`
	BIC    float64   `json:"bic"`
	AICc   float64   `json:"aicc"`
	// Why it may not be the answer, whatever its criterion: two clouds that the data
	// cannot tell apart, a cloud without a detected column. "" if it may.
	Refused string `json:"refused,omitempty"`

	clouds []Cloud
	shared []Shared
	ranges []Range
	result Result
	fitter *Fitter
}

func (s *Search) max() int {
	if s.Max > 0 {
		return s.Max
	}
	return 12
}

// Run carries the search out. It is deterministic. No cloud at all is an answer as
// well: then Result has no clouds.
func (s *Search) Run() (Found, error) {
	if !(s.V[1] > s.V[0]) {
		return Found{}, bad("", "give the smaller velocity first", "clouds are looked for from %g to %g km/s", s.V[0], s.V[1])
	}
	if len(s.Like.Species) == 0 {
		return Found{}, bad("", "list the species that a cloud holds", "a search for clouds without species")
	}
	if s.Criterion != "" && s.Criterion != "BIC" && s.Criterion != "AICc" {
		return Found{}, bad("", `use "BIC" or "AICc"`, "criterion %q", s.Criterion)
	}
	with := *s
	with.Options.cache = new(gridCache)
	s = &with
	h := &hunt{Search: s}
	now, err := h.try(s.Begin, s.Shared)
	if err != nil {
		return Found{}, err
	}
	if len(s.Begin) > 0 {
		none, err := h.try(nil, s.Shared)
		if err != nil {
			return Found{}, err
		}
		if now == nil {
			now = none
		}
	}
	// Upwards, until two more clouds do not lower the criterion.
	for idle := 0; idle < 2 && len(now.clouds) < s.max(); {
		next, err := h.more(now)
		if err != nil {
			return Found{}, err
		}
		if next == nil {
			break
		}
		if h.criterion(next) < h.criterion(now) && next.Refused == "" {
			idle = 0
		} else {
			idle++
		}
		now = next
	}
	// Downwards from the best, and up again where that opened a way.
	for range 4 {
		was := h.best
		if err := h.fewer(was); err != nil {
			return Found{}, err
		}
		if h.best == was {
			break
		}
		if len(h.best.clouds) < s.max() {
			if _, err := h.more(h.best); err != nil {
				return Found{}, err
			}
		}
	}
	return h.found()
}
