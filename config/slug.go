package config

import (
	"crypto/sha256"
	"encoding/hex"
	"strings"
)

// Slug is a name as a file name: letters, digits, + - . and _ for a blank.
// Names that hold anything else, or are too long, get a hash of the name at the
// end, so that different names never share a slug.
func Slug(name string) string {
	const longest = 80
	var b strings.Builder
	plain := name != "" && len(name) <= longest
	for i, r := range name {
		switch {
		case r >= 'a' && r <= 'z', r >= 'A' && r <= 'Z', r >= '0' && r <= '9', r == '+', r == '-', r == '.' && i > 0:
			b.WriteRune(r)
		case r == ' ':
			b.WriteByte('_')
		default:
			plain = false
			b.WriteByte('-')
		}
	}
	s := b.String()
	if plain && !strings.HasSuffix(s, ".") && !reserved(s) {
		return s
	}
	if len(s) > longest {
		s = s[:longest]
	}
	if reserved(s) {
		s = "_" + s
	}
	h := sha256.Sum256([]byte(name))
	return s + "~" + hex.EncodeToString(h[:6])
}

// reserved reports names that some systems keep for devices.
func reserved(s string) bool {
	stem, _, _ := strings.Cut(strings.ToUpper(s), ".")
	switch stem {
	case "CON", "PRN", "AUX", "NUL":
		return true
	}
	return len(stem) == 4 && (strings.HasPrefix(stem, "COM") || strings.HasPrefix(stem, "LPT")) && stem[3] >= '1' && stem[3] <= '9'
}
