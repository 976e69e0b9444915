package budget

import (
	"fmt"
	"math/bits"
	"strings"

	"lacuna/internal/oops"
)

var causeWords = [...]string{
	Photon:       "photon",
	Continuum:    "continuum",
	Placement:    "placement",
	ZeroLevel:    "zero level",
	Fill:         "fill",
	Profile:      "profile",
	Structure:    "structure",
	Telluric:     "telluric",
	FValue:       "f-value",
	Disagreement: "disagreement",
	Excitation:   "excitation",
	Ionization:   "ionization",
	Hydrogen:     "hydrogen",
	Solar:        "solar",
	VelocityZero: "velocity zero",
}

// Causes returns every cause in the order in which tables print them.
func Causes() []Cause {
	out := make([]Cause, 0, len(causeWords)-1)
	for c := Photon; int(c) < len(causeWords); c++ {
		out = append(out, c)
	}
	return out
}

// String returns the word for a cause, as tables and files print it.
func (c Cause) String() string {
	if c >= Photon && int(c) < len(causeWords) {
		return causeWords[c]
	}
	return fmt.Sprintf("cause %d", uint8(c))
}

// MarshalText writes a cause as its word.
func (c Cause) MarshalText() ([]byte, error) {
	if c < Photon || int(c) >= len(causeWords) {
		return nil, fmt.Errorf("budget: %d is no cause of error", uint8(c))
	}
	return []byte(causeWords[c]), nil
}

// UnmarshalText reads the word for a cause.
func (c *Cause) UnmarshalText(b []byte) error {
	for i, w := range causeWords {
		if w != "" && w == string(b) {
			*c = Cause(i)
			return nil
		}
	}
	return unknown("cause of error", string(b), causeWords[Photon:])
}

// flagWords in the order of the bits.
var flagWords = []string{
	"upper", "lower", "saturated", "blended", "in telluric", "in stellar line", "trace",
	"marginal", "at bound", "filled", "structure missing", "interval", "overridden",
}

// Words returns the words for the bits that are set, in the order of the bits;
// a bit without a meaning appears as "bit 20".
func (f Flag) Words() []string {
	out := make([]string, 0, bits.OnesCount32(uint32(f)))
	for i := range 32 {
		switch {
		case f&(1<<i) == 0:
		case i < len(flagWords):
			out = append(out, flagWords[i])
		default:
			out = append(out, fmt.Sprintf("bit %d", i))
		}
	}
	return out
}

// String returns the words, separated by commas.
func (f Flag) String() string { return strings.Join(f.Words(), ", ") }

// ParseFlag returns the bits for a list of words.
func ParseFlag(words []string) (Flag, error) {
	var f Flag
next:
	for _, w := range words {
		for i, known := range flagWords {
			if w == known {
				f |= 1 << i
				continue next
			}
		}
		return 0, unknown("flag", w, flagWords)
	}
	return f, nil
}

func unknown(what, word string, among []string) error {
	if near := oops.Nearest(word, among, 1); len(near) > 0 {
		return fmt.Errorf("budget: %q is no %s; did you mean %q?", word, what, near[0])
	}
	return fmt.Errorf("budget: %q is no %s", word, what)
}
