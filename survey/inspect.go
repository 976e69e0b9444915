package survey

import (
	"fmt"

	"lacuna/atomic"
	"lacuna/config"
	"lacuna/spectrum"
	"lacuna/spectrum/continuum"
	"lacuna/spectrum/frame"
)

// An Audit is what Inspect finds on one segment.
type Audit struct {
	Noise     continuum.Noise
	Stretches []continuum.Audited
	Why       string   // why there is no audit
	Lines     []string // lines of the table that fall into the segment
}

// Inspect reads a spectrum as it is, audits the noise of each segment, and says
// which transitions fall into it. Where the medium is unknown, so are the lines.
func Inspect(path string, sp config.Spectrum) (*spectrum.Spectrum, []Audit, error) {
	s, err := spectrum.Read(path, readOptions(sp, nil, frame.Heliocent))
	if err != nil {
		return nil, nil, err
	}
	table := atomic.Default()
	audits := make([]Audit, len(s.Segments))
	for i := range s.Segments {
		seg := s.Segments[i]
		a := &audits[i]
		a.Stretches, a.Noise, err = continuum.Audit(seg.Wave, seg.Flux, seg.Err, seg.Mask, nil)
		if err != nil {
			a.Why = err.Error()
		}
		vac := seg
		if err := vac.ToVacuum(frame.Ciddor1996); err != nil {
			continue // the text says that the medium is unknown
		}
		for _, l := range table.Between(vac.Wave[0], vac.Wave[len(vac.Wave)-1]) {
			a.Lines = append(a.Lines, l.Name)
		}
	}
	if len(s.Segments) == 0 {
		return nil, nil, fmt.Errorf("%s: no segment", path)
	}
	return s, audits, nil
}
