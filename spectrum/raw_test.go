package spectrum

import (
	"encoding/binary"
	"fmt"
	"math"
	"strings"
)

// rawHeader makes one FITS header of cards as they stand.
func rawHeader(cards ...string) []byte {
	var b strings.Builder
	for _, c := range append(cards, "END") {
		b.WriteString((c + strings.Repeat(" ", 80))[:80])
	}
	return rawBlock([]byte(b.String()), ' ')
}

func rawBlock(b []byte, with byte) []byte {
	for len(b)%2880 != 0 {
		b = append(b, with)
	}
	return b
}

// rawImage makes a primary image of doubles with these axes and cards; pixel i
// holds value(i).
func rawImage(axes []int, value func(i int) float64, cards ...string) []byte {
	head := []string{"SIMPLE  =                    T", "BITPIX  =                  -64", fmt.Sprintf("NAXIS   = %20d", len(axes))}
	n := 1
	for i, a := range axes {
		head = append(head, fmt.Sprintf("NAXIS%-3d= %20d", i+1, a))
		n *= a
	}
	b := rawHeader(append(head, cards...)...)
	var data []byte
	for i := range n {
		data = binary.BigEndian.AppendUint64(data, math.Float64bits(value(i)))
	}
	return append(b, rawBlock(data, 0)...)
}

// watCards cuts a text into WAT cards of 68 characters, without the blanks at
// their ends, as FITS files come.
func watCards(axis int, text string) []string {
	var out []string
	for n := 1; text != ""; n++ {
		k := min(68, len(text))
		out = append(out, fmt.Sprintf("WAT%d_%03d= '%s'", axis, n, strings.TrimRight(text[:k], " ")))
		text = text[k:]
	}
	return out
}

// multispecImage is an IRAF multispec image whose line k has the dispersion
// specs[k].
func multispecImage(pixels int, specs []string, cards ...string) []byte {
	text := "wtype=multispec"
	for i, s := range specs {
		text += fmt.Sprintf(` spec%d = "%s"`, i+1, s)
	}
	head := append([]string{"CTYPE1  = 'MULTISPE'", "WAT0_001= 'system=multispec'", "WAT1_001= 'wtype=multispec label=Wavelength units=angstroms'"}, watCards(2, text)...)
	axes := []int{pixels}
	if len(specs) > 1 {
		axes = append(axes, len(specs))
	}
	return rawImage(axes, func(i int) float64 { return float64(i) }, append(head, cards...)...)
}
