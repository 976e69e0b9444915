package config

import "lacuna/spectrum/frame"

var frameByWord = []struct {
	word string
	kind frame.Kind
}{
	{"topocentric", frame.Topocentric}, {"geocentric", frame.Geocentric},
	{"heliocentric", frame.Heliocent}, {"barycentric", frame.Barycentric},
	{"LSRK", frame.LSRK}, {"LSRD", frame.LSRD}, {"source", frame.Source},
}

func frameOf(word string) frame.Kind {
	for _, f := range frameByWord {
		if f.word == word {
			return f.kind
		}
	}
	return frame.Unknown
}

// FrameWord is a frame as survey files and results write it: "heliocentric".
func FrameWord(k frame.Kind) string {
	for _, f := range frameByWord {
		if f.kind == k {
			return f.word
		}
	}
	return "unknown"
}
